package mpo

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
)

// planted returns a sparse m × n matrix of a rank of at most r, as dense rows and as an elimination.
func planted(rng *rand.Rand, m, n, r int, fill float64) ([]complex128, *elimination[float64]) {
	left, right := make([]float64, m*r), make([]float64, r*n)
	for _, part := range [][]float64{left, right} {
		for i := range part {
			if rng.Float64() < fill {
				part[i] = (0.1 + 0.9*rng.Float64()) * float64(1-2*rng.IntN(2))
			}
		}
	}
	product := make([]float64, m*n)
	dense.Gemm(dense.NoTrans, dense.NoTrans, m, n, r, 1, left, r, right, n, 0, product, n)
	e := &elimination[float64]{columns: make([][]rowValue[float64], n)}
	for i := range m {
		e.rows = append(e.rows, [2]int32{int32(i), 0})
	}
	full := make([]complex128, m*n)
	for i, x := range product {
		full[i] = complex(x, 0)
		if x != 0 {
			e.columns[i%n] = append(e.columns[i%n], rowValue[float64]{int32(i / n), x})
		}
	}
	return full, e
}

func TestElimination(t *testing.T) {
	opt := Options{}.settle()
	rapid.Check(t, func(t *rapid.T) {
		m, n := rapid.IntRange(1, 24).Draw(t, "rows"), rapid.IntRange(1, 24).Draw(t, "columns")
		r := rapid.IntRange(1, 24).Draw(t, "rank")
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 0))
		full, e := planted(rng, m, n, r, rapid.Float64Range(0.1, 1).Draw(t, "fill"))
		for _, col := range e.columns {
			if len(col) == 0 {
				t.Skip("an empty column, which never comes here")
			}
		}
		rank := svdRank(full, m, n, 1e-10*biggest(full))
		if e.independent(opt) {
			require.Equal(t, n, rank)
		} else if rank == n {
			// Not beyond doubt: the full search has to find it.
			require.Less(t, svdRank(full, m, n, 1e-4*biggest(full)), n)
		}
		rest := e.reduce(opt.Tolerance)
		require.Less(t, rest, 1e-11)
		require.Len(t, e.pivots, rank)
		got := make([]complex128, m*n)
		for j, p := range e.pivots {
			for _, x := range e.result[j] {
				for i, q := range e.pivots {
					if q == x.row {
						require.Equal(t, j, i, "only the own pivot row")
						require.Equal(t, 1.0, x.v)
					}
				}
				for c := range n {
					got[int(x.row)*n+c] += complex(x.v, 0) * full[int(p)*n+c]
				}
			}
		}
		for i := range full {
			require.InDelta(t, 0, abs(full[i]-got[i]), 1e-11)
		}
	})
}

// Sizes around the panel, square and tall, of full and of almost full rank.
func TestSmallestPivot(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	for _, n := range []int{1, 2, panel - 1, panel, panel + 1, 2*panel + 5} {
		for _, extra := range []int{0, 7} {
			m := n + extra
			random := func() ([]float64, []complex128) {
				a, z := make([]float64, m*n), make([]complex128, m*n)
				dense.Random(rng, a)
				for i, x := range a {
					z[i] = complex(x, rng.NormFloat64())
				}
				return a, z
			}
			a, z := random()
			require.Greater(t, smallestPivot(a, m, n), wellPosed)
			require.Greater(t, smallestPivot(z, m, n), wellPosed)
			if n == 1 {
				continue
			}
			a, z = random()
			for i := range m { // the last column is the sum of two others
				a[i*n+n-1] = a[i*n] - 0.3*a[i*n+n/2]
				z[i*n+n-1] = z[i*n] - 0.3i*z[i*n+n/2]
			}
			if n == 2 {
				for i := range m {
					a[i*n+1], z[i*n+1] = 0.7*a[i*n], 0.7i*z[i*n]
				}
			}
			require.Zero(t, smallestPivot(a, m, n))
			require.Zero(t, smallestPivot(z, m, n))
		}
	}
}

// Raw leaves the vertex covers, which are right but larger; a small bound of work does not change what is right either.
func TestBuildOptions(t *testing.T) {
	s := densities(12, func(r float64) float64 { return 1 - 0.05*r })
	full, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	require.Equal(t, 4, full.Bonds[6].Dim(), "rank two")
	for _, opt := range []Options{{Raw: true}, {Work: 1}} {
		o, err := Build[float64](s.Strings, opt)
		require.NoError(t, err)
		requireValid(t, o)
		require.Equal(t, 8, o.Bonds[6].Dim(), "six strings on each side")
		require.InDelta(t, 0.75, pairCoupling(o, 2, 7), 1e-15)
	}
	coarse, err := Build[float64](s.Strings, Options{Tolerance: 0.9})
	require.NoError(t, err)
	require.Equal(t, 3, coarse.Bonds[6].Dim(), "what varies is below such a tolerance")
}
