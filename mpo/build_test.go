package mpo

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"

	"rundle/internal/dense"
	"rundle/mps/block"
)

func coupling(rng *rand.Rand, complexes bool) func() complex128 {
	return func() complex128 {
		re := (0.1 + 0.9*rng.Float64()) * float64(1-2*rng.IntN(2))
		if complexes {
			return complex(re, 0.1+0.9*rng.Float64())
		}
		return complex(re, 0)
	}
}

// requireValid checks what Operator promises about its entries and bonds.
func requireValid[T dense.Scalar](t *testing.T, o *Operator[T]) {
	t.Helper()
	n := o.Len()
	require.Len(t, o.Bonds, n+1)
	require.Equal(t, Bond{Charges: []block.Charge{{}}, Vacant: 0, Done: none}, o.Bonds[0])
	require.Equal(t, 1, o.Bonds[n].Dim())
	require.Equal(t, 0, o.Bonds[n].Done)
	for b, bond := range o.Bonds {
		require.Equal(t, bond.Dim(), bond.Axis(block.In).Dim())
		for i := 1; i < bond.Dim(); i++ {
			require.LessOrEqual(t, bond.Charges[i-1].Compare(bond.Charges[i]), 0, "bond %d", b)
		}
	}
	for i, entries := range o.Sites {
		var q []block.Charge
		for _, s := range o.Phys[i].Sectors {
			for range s.Dim {
				q = append(q, s.Charge)
			}
		}
		for k, e := range entries {
			require.NotZero(t, e.Value)
			sum := o.Group.Add(o.Bonds[i].Charges[e.Left], o.Group.Sub(q[e.Out], q[e.In]))
			require.Equal(t, o.Bonds[i+1].Charges[e.Right], sum, "site %d entry %+v", i, e)
			if int(e.Right) == o.Bonds[i+1].Vacant {
				require.Equal(t, o.Bonds[i].Vacant, int(e.Left))
				require.Equal(t, Entry[T]{e.Left, e.Right, e.Out, e.Out, dense.FromFloat[T](1)}, e, "vacant strings are the identity")
			}
			if int(e.Left) == o.Bonds[i].Done {
				require.Equal(t, o.Bonds[i+1].Done, int(e.Right))
				require.Equal(t, Entry[T]{e.Left, e.Right, e.Out, e.Out, dense.FromFloat[T](1)}, e, "done strings are the identity")
			}
			if k > 0 {
				p := entries[k-1]
				require.Less(t, fmt.Sprintf("%6d%6d%6d%6d", p.Left, p.Right, p.Out, p.In), fmt.Sprintf("%6d%6d%6d%6d", e.Left, e.Right, e.Out, e.In))
			}
		}
	}
}

func toComplex[T dense.Scalar](a []T) []complex128 {
	out := make([]complex128, len(a))
	for i, x := range a {
		out[i] = dense.ToComplex(x)
	}
	return out
}

// requireClose compares matrices to tol of the largest element.
func requireClose(t *testing.T, want, got []complex128, tol float64) {
	t.Helper()
	require.Len(t, got, len(want))
	top := biggest(want)
	for i := range want {
		if abs(want[i]-got[i]) > tol*top {
			require.InDelta(t, 0, abs(want[i]-got[i]), tol*top, "element %d: want %v, got %v", i, want[i], got[i])
		}
	}
}

// crossingRank is the oracle for small systems: the rank of the operator, reshaped into left times right operators, after
// the identity is projected out on the sides where a vacant or done index stands for it.
func crossingRank(h []complex128, dims []int, cut int, noLeft, noRight bool) int {
	l, r := 1, 1
	for i, d := range dims {
		if i < cut {
			l *= d
		} else {
			r *= d
		}
	}
	n := l * r
	m := make([]complex128, l*l*r*r)
	for i := range n {
		for j := range n {
			m[((i/r)*l+j/r)*r*r+(i%r)*r+j%r] = h[i*n+j]
		}
	}
	if noLeft {
		for c := range r * r {
			var s complex128
			for a := range l {
				s += m[(a*l+a)*r*r+c] / complex(float64(l), 0)
			}
			for a := range l {
				m[(a*l+a)*r*r+c] -= s
			}
		}
	}
	if noRight {
		for a := range l * l {
			var s complex128
			for c := range r {
				s += m[a*r*r+c*r+c] / complex(float64(r), 0)
			}
			for c := range r {
				m[a*r*r+c*r+c] -= s
			}
		}
	}
	return svdRank(m, l*l, r*r, 1e-10*biggest(h))
}

// svdRank counts the singular values above floor; those of a complex matrix come twice in its real form.
func svdRank(a []complex128, m, n int, floor float64) int {
	if !slices.ContainsFunc(a, func(x complex128) bool { return imag(x) != 0 }) {
		small := mat.NewDense(m, n, nil)
		for i, x := range a {
			small.Set(i/n, i%n, real(x))
		}
		return countAbove(small, floor)
	}
	big := mat.NewDense(2*m, 2*n, nil)
	for i := range m {
		for j := range n {
			x := a[i*n+j]
			big.Set(i, j, real(x))
			big.Set(m+i, n+j, real(x))
			big.Set(i, n+j, -imag(x))
			big.Set(m+i, j, imag(x))
		}
	}
	return countAbove(big, floor) / 2
}

func countAbove(a *mat.Dense, floor float64) (count int) {
	var f mat.SVD
	if !f.Factorize(a, mat.SVDNone) {
		panic("no convergence")
	}
	for _, x := range f.Values(nil) {
		if x > floor {
			count++
		}
	}
	return count
}

// families are the mixes of sites on which random sums are drawn.
func families() map[string]func() (block.Group, []kindTable) {
	repeat := func(k kindTable, n int) []kindTable {
		var out []kindTable
		for range n {
			out = append(out, k)
		}
		return out
	}
	u1, z3, z2 := testGroup(0), testGroup(3), testGroup(2)
	return map[string]func() (block.Group, []kindTable){
		"fermions":        func() (block.Group, []kindTable) { return u1, repeat(fermionKind(u1), 6) },
		"paired fermions": func() (block.Group, []kindTable) { return z2, repeat(fermionKind(z2), 6) },
		"bosons":          func() (block.Group, []kindTable) { return u1, repeat(bosonKind(u1, 2), 4) },
		"spins":           func() (block.Group, []kindTable) { return u1, repeat(spinKind(u1, 1), 6) },
		"spins one":       func() (block.Group, []kindTable) { return u1, repeat(spinKind(u1, 2), 4) },
		"clocks":          func() (block.Group, []kindTable) { return z3, repeat(clockKind(z3), 4) },
		"fermions and bosons": func() (block.Group, []kindTable) {
			f, b := fermionKind(u1), bosonKind(u1, 2)
			return u1, []kindTable{f, b, f, f, b}
		},
	}
}

func TestBuildRandom(t *testing.T) {
	for name, family := range families() {
		for _, size := range []struct{ terms, most int }{{1, 1}, {3, 2}, {12, 2}, {40, 3}, {60, 4}} {
			t.Run(fmt.Sprintf("%s/terms=%d", name, size.terms), func(t *testing.T) {
				for seed := range uint64(seeds) {
					rng := rand.New(rand.NewPCG(seed, 17))
					g, kinds := family()
					s := newSum(g, kinds...)
					s.addRandom(rng, size.terms, size.most, coupling(rng, seed == 2))
					if seed == 1 {
						s.add(0.7) // a constant
					}
					if s.Real {
						checkBuild[float64](t, s)
					}
					checkBuild[complex128](t, s)
				}
			})
		}
	}
}

// checkBuild compares an operator with the sum of Kronecker products, and its bonds with the operator rank.
func checkBuild[T dense.Scalar](t *testing.T, s *sum) *Operator[T] {
	t.Helper()
	o, err := Build[T](s.Strings, Options{})
	require.NoError(t, err)
	requireOperator(t, s.dense(), o)
	return o
}

// requireOperator compares an operator with its matrix: the elements, and the bonds with the operator rank.
func requireOperator[T dense.Scalar](t *testing.T, h []complex128, o *Operator[T]) {
	t.Helper()
	requireValid(t, o)
	requireClose(t, h, toComplex(o.Dense()), 1e-13)
	if biggest(h) == 0 {
		return
	}
	for b := 1; b < o.Len(); b++ {
		bond := o.Bonds[b]
		want := crossingRank(h, o.dims(), b, bond.Vacant >= 0, bond.Done >= 0)
		if bond.Vacant >= 0 {
			want++
		}
		if bond.Done >= 0 {
			want++
		}
		require.Equal(t, want, bond.Dim(), "bond %d of %v", b, o.BondDims())
	}
}
