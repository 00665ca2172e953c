package ladder

import (
	"fmt"
	"math"
	"math/big"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// drawRelations draws k relations between n variables with small coefficients.
func drawRelations(t *rapid.T, n, k, size int) [][]int64 {
	m := make([][]int64, k)
	for i := range m {
		m[i] = rapid.SliceOfN(rapid.Int64Range(-int64(size), int64(size)), n, n).Draw(t, fmt.Sprint("row", i))
	}
	return m
}

func sparse(m [][]int64, rhs func(i int) phase) []relation {
	out := make([]relation, len(m))
	for i, row := range m {
		out[i].rhs = rhs(i)
		for v, x := range row {
			if x != 0 {
				out[i].terms = append(out[i].terms, entry{int32(v), exactOf(x)})
			}
		}
	}
	return out
}

func noPhase(int) phase { return phase{} }

// Oracle: the characters of the quotient with values in Z_m are counted by trying all of them.
func TestSolutionCountsCharacters(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 3).Draw(t, "n")
		m := drawRelations(t, n, rapid.IntRange(0, 4).Draw(t, "k"), 4)
		s := solveRelations(n, sparse(m, noPhase))
		require.Empty(t, s.bad)
		for q := int64(2); q <= 6; q++ {
			want := map[string]bool{}
			for _, w := range tuples(n, q) {
				ok := true
				for _, row := range m {
					sum := int64(0)
					for v, x := range row {
						sum += x * w[v]
					}
					ok = ok && sum%q == 0
				}
				if ok {
					want[fmt.Sprint(w)] = true
				}
			}
			got := map[string]bool{}
			count := 1
			for range s.moduli {
				count *= int(q)
			}
			for _, y := range tuples(len(s.moduli), q) {
				allowed := true
				for g, d := range s.moduli {
					allowed = allowed && (y[g]*d.small)%q == 0
				}
				if !allowed {
					count--
					continue
				}
				w := make([]int64, n)
				for v := range w {
					for _, e := range s.image[v] {
						w[v] += e.n.small * y[e.at]
					}
					w[v] = ((w[v] % q) + q) % q
				}
				got[fmt.Sprint(w)] = true
			}
			require.Equal(t, want, got, "characters modulo %d", q)
			require.Len(t, got, count, "different coordinates, different characters")
		}
	})
}

// tuples returns all vectors of n numbers 0..q-1.
func tuples(n int, q int64) [][]int64 {
	out := [][]int64{{}}
	for range n {
		var next [][]int64
		for _, t := range out {
			for x := range q {
				next = append(next, append(append([]int64{}, t...), x))
			}
		}
		out = next
	}
	return out
}

func TestSolutionOfAngles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 6).Draw(t, "n")
		m := drawRelations(t, n, rapid.IntRange(0, 8).Draw(t, "k"), 2)
		theta := rapid.SliceOfN(rapid.Float64Range(-3, 3), n, n).Draw(t, "theta")
		at := func(angles []float64, row []int64) float64 {
			sum := 0.0
			for v, x := range row {
				sum += float64(x) * angles[v]
			}
			return sum
		}
		s := solveRelations(n, sparse(m, func(i int) phase { return phaseOf(at(theta, m[i])) }))
		require.Empty(t, s.bad)
		got, err := make([]float64, n), make([]float64, n) // err: what the solution itself says, and the rounding of large multiples
		for v := range got {
			got[v], err[v] = s.shift[v].angle, s.shift[v].err
			for _, e := range s.image[v] { // any choice of the free part solves too
				y := 0.3 * float64(e.at+1)
				if d := s.moduli[e.at]; !d.isZero() {
					y = math.Pi / d.float()
				}
				got[v] += e.n.float() * y
				err[v] += angleTolerance * math.Abs(e.n.float()*y)
			}
		}
		for i, row := range m {
			tolerance := angleTolerance
			for v, x := range row {
				tolerance += math.Abs(float64(x)) * err[v]
			}
			require.InDelta(t, 0, math.Remainder(at(got, row)-at(theta, row), math.Pi), min(tolerance, 1e-6), "relation %d", i)
		}
	})
}

func TestContradictionIsFound(t *testing.T) {
	rows := [][]int64{{1, -1, 0, 0}, {0, 1, -1, 0}, {0, 0, 1, -1}, {1, 0, 0, -1}}
	tests := []struct {
		name string
		flux float64
		bad  []int
	}{
		{"no flux", 0, nil},
		{"half a quantum", math.Pi, nil},
		{"generic", 0.3, []int{3}},
		{"below tolerance", 1e-13, nil},
		{"above tolerance", 1e-11, []int{3}},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			s := solveRelations(4, sparse(rows, func(i int) phase { return phaseOf([]float64{0.1, 0.2, 0.7, 1 + c.flux}[i]) }))
			require.Equal(t, c.bad, s.bad)
		})
	}
	s := solveRelations(2, sparse([][]int64{{2, 4}, {4, 2}, {6, 6}}, func(i int) phase { return phaseOf([]float64{0, 0.1, 0.4}[i]) }))
	require.NotEmpty(t, s.bad, "contradiction among relations without units")
}

// A chain x_{j+1} = 3 x_j reaches 3^99: the integers must not overflow.
func TestSolutionWithLargeIntegers(t *testing.T) {
	const n = 100
	var r []relation
	for v := range n - 1 {
		r = append(r, relation{terms: []entry{{int32(v), exactOf(3)}, {int32(v + 1), exactOf(-1)}}})
	}
	s := solveRelations(n, r)
	require.Len(t, s.moduli, 1)
	ratio := new(big.Int).Exp(big.NewInt(3), big.NewInt(n-1), nil)
	require.Equal(t, ratio.String(), s.image[n-1][0].n.times(s.image[0][0].n).String())
}

func TestSolutionOfManyFreeVariables(t *testing.T) {
	const n = 512
	s := solveRelations(n, nil)
	require.Len(t, s.moduli, n)
	var clock []relation
	for v := range n {
		clock = append(clock, relation{terms: []entry{{int32(v), exactOf(3)}}})
	}
	s = solveRelations(n, clock)
	require.Len(t, s.moduli, n)
	require.Equal(t, "3", s.moduli[n-1].String())
}

func TestWholeAgreesWithBigIntegers(t *testing.T) {
	number := rapid.OneOf(rapid.Int64Range(-10, 10), rapid.Int64Range(math.MinInt64+1, math.MaxInt64),
		rapid.SampledFrom([]int64{math.MaxInt64, math.MinInt64 + 1, 1 << 32, -1 << 31}))
	rapid.Check(t, func(t *rapid.T) {
		x, y := number.Draw(t, "x"), number.Draw(t, "y")
		a, b := exactOf(x), exactOf(y)
		bx, by := big.NewInt(x), big.NewInt(y)
		require.Equal(t, new(big.Int).Add(bx, by).String(), a.plus(b).String())
		require.Equal(t, new(big.Int).Mul(bx, by).String(), a.times(b).String())
		require.Equal(t, new(big.Int).Neg(bx).String(), a.neg().String())
		require.Equal(t, bx.CmpAbs(by), a.cmpAbs(b))
		if y != 0 {
			rest := a.plus(a.nearest(b).times(b).neg())
			require.LessOrEqual(t, rest.plus(rest).cmpAbs(b), 0)
			m := exactFrom(new(big.Int).Abs(by))
			require.Equal(t, new(big.Int).Mod(bx, m.big()).String(), a.residue(m).String())
		}
		square := a.times(a).times(a)
		require.Equal(t, a.String(), square.plus(square.neg()).plus(a).String())
	})
}
