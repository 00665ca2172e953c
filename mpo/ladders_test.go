package mpo

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mps/block"
)

// stringRank is the oracle for large systems: the coefficients of the strings that cross a cut as a matrix between distinct
// left and right strings, whose local operators must be independent. present tells of terms yet to begin and done.
func stringRank(s *sum, cut int, tol float64) (rank int, vacant, done bool) {
	rows, cols := map[string]int{}, map[string]int{}
	type entry struct{ i, j int }
	m := map[entry]complex128{}
	place := func(table map[string]int, key string) int {
		if _, ok := table[key]; !ok {
			table[key] = len(table)
		}
		return table[key]
	}
	for t, c := range s.Coef {
		var left, right string
		for _, f := range s.Factors[s.Start[t]:s.Start[t+1]] {
			if int(f.Site) < cut {
				left += fmt.Sprint(f.Site, ":", f.Op, " ")
			} else {
				right += fmt.Sprint(f.Site, ":", f.Op, " ")
			}
		}
		switch {
		case left == "" && right == "":
		case left == "":
			vacant = true
		case right == "":
			done = true
		default:
			m[entry{place(rows, left), place(cols, right)}] += c
		}
	}
	top := 0.0
	parts := map[int][]coefficient{}
	part := make([]int, len(rows)) // rows that share columns, directly or over others
	for i := range part {
		part[i] = i
	}
	owner := make([]int, len(cols))
	for j := range owner {
		owner[j] = none
	}
	root := func(i int) int {
		for part[i] != i {
			i = part[i]
		}
		return i
	}
	for e, c := range m {
		top = max(top, abs(c))
		if owner[e.j] == none {
			owner[e.j] = e.i
		}
		part[root(e.i)] = root(owner[e.j])
	}
	for e, c := range m {
		parts[root(e.i)] = append(parts[root(e.i)], coefficient{e.i, e.j, c})
	}
	for _, list := range parts {
		rank += coefficientRank(list, tol*top)
	}
	return rank, vacant, done
}

type coefficient struct {
	i, j int
	c    complex128
}

// coefficientRank is the number of singular values above floor.
func coefficientRank(list []coefficient, floor float64) int {
	rows, cols := map[int]int{}, map[int]int{}
	for _, e := range list {
		if _, ok := rows[e.i]; !ok {
			rows[e.i] = len(rows)
		}
		if _, ok := cols[e.j]; !ok {
			cols[e.j] = len(cols)
		}
	}
	a := make([]complex128, len(rows)*len(cols))
	for _, e := range list {
		a[rows[e.i]*len(cols)+cols[e.j]] = e.c
	}
	return svdRank(a, len(rows), len(cols), floor)
}

// requireStringRank compares all bonds with stringRank.
func requireStringRank(t *testing.T, s *sum, o *Operator[float64]) {
	t.Helper()
	for b := 1; b < o.Len(); b++ {
		want, vacant, done := stringRank(s, b, 1e-10)
		require.Equal(t, vacant, o.Bonds[b].Vacant >= 0, "bond %d", b)
		require.Equal(t, done, o.Bonds[b].Done >= 0, "bond %d", b)
		if vacant {
			want++
		}
		if done {
			want++
		}
		require.Equal(t, want, o.Bonds[b].Dim(), "bond %d of %v", b, o.BondDims())
	}
}

func chainOf(k func(block.Group) kindTable, n int) *sum {
	g := testGroup(0)
	return newSum(g, slices.Repeat([]kindTable{k(g)}, n)...)
}

// twoLegs couples sites (rung j: 2j and 2j+1) by hopping along legs and rungs with a density-density term on each bond; around
// closes the ladder to a ring.
func twoLegs(rungs int, around bool, rng *rand.Rand) *sum {
	s := chainOf(fermionKind, 2*rungs)
	draw := coupling(rng, false)
	bond := func(i, j int32) {
		if i > j {
			i, j = j, i
		}
		c := draw()
		s.add(c, i, 3, j, 6)
		s.add(-c, i, 2, j, 3)
		s.add(draw(), i, 4, j, 4)
	}
	for j := range int32(rungs) {
		bond(2*j, 2*j+1)
		s.add(draw(), 2*j, 4)
		s.add(draw(), 2*j+1, 4)
		if next := j + 1; next < int32(rungs) || around {
			next %= int32(rungs)
			bond(2*j, 2*next)
			bond(2*j+1, 2*next+1)
		}
	}
	return s
}

func TestLaddersAtOperatorRank(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 3))
	cases := []struct {
		name    string
		sum     *sum
		largest int // counted by hand
	}{
		{"open two legs", twoLegs(12, false, rng), 8},    // 2 links × (c, c^+, n) + 2
		{"closed two legs", twoLegs(12, true, rng), 14},  // 4 links × 3 + 2
		{"single rung", twoLegs(1, false, rng), 5},       // one link and both ends
		{"pair terms", pairTerms(24, 400, 7), 0},         // not counted
		{"fourfold terms", fourfoldTerms(12, 300, 7), 0}, // not counted
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			o, err := Build[float64](c.sum.Strings, Options{})
			require.NoError(t, err)
			requireValid(t, o)
			requireStringRank(t, c.sum, o)
			if c.largest > 0 {
				require.Equal(t, c.largest, slices.Max(o.BondDims()))
			}
		})
	}
}

// densities couples n_i n_j by f(j - i) on a chain.
func densities(n int, f func(r float64) float64) *sum {
	s := chainOf(fermionKind, n)
	for i := range int32(n) {
		for j := i + 1; j < int32(n); j++ {
			s.add(complex(f(float64(j-i)), 0), i, 4, j, 4)
		}
	}
	return s
}

// pairCoupling reads the coefficient of n_i n_j: the elements with no particle, with one and with both.
func pairCoupling(o *Operator[float64], i, j int) float64 {
	at := func(occupied ...int) float64 {
		v := []float64{1}
		for k, entries := range o.Sites {
			next := make([]float64, o.Bonds[k+1].Dim())
			state := int32(0)
			if slices.Contains(occupied, k) {
				state = 1
			}
			for _, e := range entries {
				if e.Out == state && e.In == state {
					next[e.Right] += v[e.Left] * e.Value
				}
			}
			v = next
		}
		return v[0]
	}
	return at(i, j) - at(i) - at(j) + at()
}

func TestLongRange(t *testing.T) {
	cases := []struct {
		name string
		f    func(float64) float64
		rank int // exact, or 0: by singular values
	}{
		{"exponential", func(r float64) float64 { return math.Exp(-r / 5) }, 1},
		{"three exponentials", func(r float64) float64 { return math.Pow(0.9, r) - math.Pow(-0.5, r) + 0.3*math.Pow(0.7, r) }, 3},
		{"quadratic", func(r float64) float64 { return 1 + 0.1*r + 0.01*r*r }, 3},
		{"dipoles", func(r float64) float64 { return 1 / (r * r * r) }, 0},
	}
	const n = 64
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			s := densities(n, c.f)
			o, err := Build[float64](s.Strings, Options{})
			require.NoError(t, err)
			requireValid(t, o)
			for b := 2; b < n-1; b++ {
				if c.rank > 0 {
					require.Equal(t, min(c.rank, b, n-b)+2, o.Bonds[b].Dim(), "bond %d", b)
					continue
				}
				// The singular values fall without a gap: the rank lies between those at two thresholds.
				low, _, _ := stringRank(s, b, 1e-12)
				high, _, _ := stringRank(s, b, 1e-15)
				require.GreaterOrEqual(t, o.Bonds[b].Dim(), low+2, "bond %d", b)
				require.LessOrEqual(t, o.Bonds[b].Dim(), high+2, "bond %d", b)
			}
			top := math.Abs(c.f(1))
			for _, p := range [][2]int{{0, 1}, {0, 63}, {20, 45}, {31, 32}, {30, 63}, {5, 6}, {0, 32}} {
				require.InDelta(t, c.f(float64(p[1]-p[0])), pairCoupling(o, p[0], p[1]), 1e-12*max(top, c.f(63)), "pair %v", p)
			}
		})
	}
}

// A weak link is not lost beside strong terms: not beside energies on the sites, nor beside couplings over the same cut.
func TestWeakLinkSurvives(t *testing.T) {
	const rungs = 128 // 256 sites
	for _, link := range []float64{1e-6, 1e-9} {
		t.Run(fmt.Sprint(link), func(t *testing.T) {
			s := chainOf(fermionKind, 2*rungs)
			for j := range int32(rungs) {
				s.add(1e3, 2*j, 4, 2*j+1, 4)
				s.add(1e3, 2*j, 4)
				if j+1 < rungs {
					s.add(1e3, 2*j, 4, 2*j+2, 4)
					hop := complex(1, 0)
					if j == rungs/2 {
						hop = complex(link, 0)
					}
					s.add(hop, 2*j+1, 3, 2*j+3, 6)
					s.add(-hop, 2*j+1, 2, 2*j+3, 3)
				}
			}
			o, err := Build[float64](s.Strings, Options{})
			require.NoError(t, err)
			requireValid(t, o)
			i := rungs + 1
			require.Equal(t, -link, hopCoupling(o, i, i+2)) // the second factor is sign·c, on a full site -c
			require.Equal(t, -1.0, hopCoupling(o, i+2, i+4))
			require.Equal(t, 5, o.Bonds[2*(rungs/2+1)].Dim(), "n, c, c^+, vacant, done")
		})
	}
}

// hopCoupling reads the element <i|o|j> between states with one particle, at j and at i < j.
func hopCoupling(o *Operator[float64], i, j int) float64 {
	v := []float64{1}
	for k, entries := range o.Sites {
		next := make([]float64, o.Bonds[k+1].Dim())
		var out, in int32
		if k == i {
			out = 1
		}
		if k == j {
			in = 1
		}
		for _, e := range entries {
			if e.Out == out && e.In == in {
				next[e.Right] += v[e.Left] * e.Value
			}
		}
		v = next
	}
	return v[0]
}

func TestSpecialSums(t *testing.T) {
	g := testGroup(0)
	spin := spinKind(g, 1)
	cases := []struct {
		name  string
		kinds []kindTable
		fill  func(s *sum)
		bonds []int
	}{
		{"empty", []kindTable{spin, spin, spin}, func(*sum) {}, []int{1, 1, 1, 1}},
		{"empty on one site", []kindTable{spin}, func(*sum) {}, []int{1, 1}},
		{"cancelling", []kindTable{spin, spin}, func(s *sum) { s.add(1, 0, 1, 1, 1); s.add(-1, 0, 1, 1, 1) }, []int{1, 1, 1}},
		{"zero coupling", []kindTable{spin, spin}, func(s *sum) { s.add(0, 0, 1, 1, 1); s.add(1, 1, 1) }, []int{1, 1, 1}},
		{"constant", []kindTable{spin, spin, spin}, func(s *sum) { s.add(2.5) }, []int{1, 1, 1, 1}},
		{"constant beside a bond", []kindTable{spin, spin}, func(s *sum) { s.add(2.5); s.add(1, 0, 1, 1, 1) }, []int{1, 2, 1}},
		{"constants that cancel", []kindTable{spin, spin}, func(s *sum) { s.add(2.5); s.add(-2.5) }, []int{1, 1, 1}},
		{"one site", []kindTable{spin}, func(s *sum) { s.add(0.3, 0, 1); s.add(1) }, []int{1, 1}},
		{"one string", []kindTable{spin, spin, spin, spin}, func(s *sum) { s.add(1, 0, 1, 1, 1, 2, 1, 3, 1) }, []int{1, 1, 1, 1, 1}},
		{"product of sums", []kindTable{spin, spin, spin}, func(s *sum) {
			for i, x := range []complex128{1, 2, 3} { // (S^z + 2 (S^z)^2) ⊗ (S^z + ...) would be one; here a star
				s.add(x, 0, 1, int32(1+i%2), 1)
			}
		}, []int{1, 1, 2, 1}},
		{"operator that vanishes", []kindTable{bosonKind(g, 1), bosonKind(g, 1)}, func(s *sum) {
			s.Charge = block.Charge{-2}
			s.Tables[0].Charges[6] = block.Charge{-2} // b^2 at one particle at most: the zero matrix
			s.add(1, 0, 6)
		}, []int{1, 1, 1}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			s := newSum(g, c.kinds...)
			c.fill(s)
			o, err := Build[float64](s.Strings, Options{})
			require.NoError(t, err)
			requireOperator(t, s.dense(), o)
			require.Equal(t, c.bonds, o.BondDims())
		})
	}
}

func TestBuildErrors(t *testing.T) {
	g := testGroup(0)
	spin := spinKind(g, 1)
	s := newSum(g, spin, spin)
	s.add(1, 0, 1)
	s.add(1, 0, 2)
	_, err := Build[float64](s.Strings, Options{})
	require.EqualError(t, err, "term 1 of 2 changes the charge by [-2 0 0 0], the sum by [0 0 0 0]; split it by charge")

	s = newSum(g, spin, spin)
	s.add(complex(0, 1), 0, 1)
	_, err = Build[float64](s.Strings, Options{})
	require.EqualError(t, err, "operator with complex matrix elements asked for in real arithmetic; use complex128")
	s.Real = true
	_, err = Build[float64](s.Strings, Options{})
	require.EqualError(t, err, "term 0 of 1 has the complex coupling (0+1i) in real arithmetic; use complex128")

	for _, x := range []float64{math.NaN(), math.Inf(1)} {
		s = newSum(g, spin)
		s.add(complex(x, 0), 0, 1)
		_, err = Build[float64](s.Strings, Options{})
		require.ErrorContains(t, err, "expected a finite number")
	}

	_, err = Build[float64](newSum(g).Strings, Options{})
	require.EqualError(t, err, "operator on no sites; a ladder has at least one")

	s = newSum(g, spin, spin)
	s.add(1, 1, 1, 0, 1) // not sorted
	require.Panics(t, func() { _, _ = Build[float64](s.Strings, Options{}) })
}

// Building is deterministic to the last bit.
func TestBuildRepeats(t *testing.T) {
	s := fourfoldTerms(8, 40, 3)
	a, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	for range 5 {
		b, err := Build[float64](s.Strings, Options{})
		require.NoError(t, err)
		require.Equal(t, a, b)
		require.Equal(t, Product(a, Adjoint(a)), Product(b, Adjoint(b)))
	}
}
