package mpo

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// The tests write their own tables of local operators and sum strings as Kronecker products: no code is shared with Build.

// kindTable is a site kind of the tests: states sorted by charge, and operators as dense matrices.
type kindTable struct {
	name string
	axis block.Axis
	*ladder.OpTable
}

func testGroup(modulus int) block.Group {
	g, err := block.NewGroup(block.Rule{Name: "N", Modulus: modulus})
	if err != nil {
		panic(err)
	}
	return g
}

// newKind takes the charge of each state; ops are matrices of definite charge, the identity first.
func newKind(name string, g block.Group, states []int32, filler int32, odd []bool, ops ...[]complex128) kindTable {
	var sectors []block.Sector
	for _, q := range states {
		sectors = append(sectors, block.Sector{Charge: g.Normalize(block.Charge{q}), Dim: 1})
	}
	k := kindTable{name, block.NewAxis(block.In, sectors...), &ladder.OpTable{Matrices: ops, Odd: make([]bool, len(ops)), Filler: filler}}
	copy(k.Odd, odd)
	d := len(states)
	for _, m := range ops {
		var q block.Charge
		for i, x := range m {
			if x != 0 {
				q = g.Sub(block.Charge{states[i/d]}, block.Charge{states[i%d]})
			}
		}
		k.Charges = append(k.Charges, q)
	}
	return k
}

func diagonal(d int, f func(s int) complex128) []complex128 {
	m := make([]complex128, d*d)
	for s := range d {
		m[s*d+s] = f(s)
	}
	return m
}

// raising has f(s) at <s+step|op|s>.
func raising(d, step int, f func(s int) complex128) []complex128 {
	m := make([]complex128, d*d)
	for s := range d {
		if to := s + step; to >= 0 && to < d {
			m[to*d+s] = f(s)
		}
	}
	return m
}

func unity(int) complex128 { return 1 }

// fermionKind has the identity, the sign, c, c^+, n, n^2 (equal to n), sign·c and 1-n.
func fermionKind(g block.Group) kindTable {
	sign := diagonal(2, func(s int) complex128 { return complex(1-2*float64(s), 0) })
	n := diagonal(2, func(s int) complex128 { return complex(float64(s), 0) })
	return newKind("fermion", g, []int32{0, 1}, 1, []bool{false, false, true, true, false, false, true, false},
		diagonal(2, unity), sign, raising(2, -1, unity), raising(2, 1, unity), n, slices.Clone(n),
		raising(2, -1, func(int) complex128 { return -1 }), diagonal(2, func(s int) complex128 { return complex(1-float64(s), 0) }))
}

// bosonKind has the identity, b, b^+, n, n(n-1), n^2 (dependent on those two) and b^2 up to max.
func bosonKind(g block.Group, max int) kindTable {
	d := max + 1
	states := make([]int32, d)
	for s := range states {
		states[s] = int32(s)
	}
	root := func(s int) complex128 { return complex(math.Sqrt(float64(s)), 0) }
	return newKind("boson", g, states, 0, nil, diagonal(d, unity), raising(d, -1, root),
		raising(d, 1, func(s int) complex128 { return root(s + 1) }), diagonal(d, func(s int) complex128 { return complex(float64(s), 0) }),
		diagonal(d, func(s int) complex128 { return complex(float64(s*(s-1)), 0) }),
		diagonal(d, func(s int) complex128 { return complex(float64(s*s), 0) }),
		raising(d, -2, func(s int) complex128 { return root(s) * root(s-1) }))
}

// spinKind has the identity, S^z, S^-, S^+ and (S^z)^2 for spin twoS/2; charges count S^z in halves, shifted to start at 0.
func spinKind(g block.Group, twoS int) kindTable {
	d := twoS + 1
	states := make([]int32, d)
	for k := range states {
		states[k] = int32(2 * k)
	}
	s := float64(twoS) / 2
	up := func(k int) complex128 { m := float64(k) - s; return complex(math.Sqrt(s*(s+1)-m*(m+1)), 0) }
	z := func(k int) complex128 { return complex(float64(k)-s, 0) }
	return newKind(fmt.Sprintf("spin %d/2", twoS), g, states, 0, nil, diagonal(d, unity), diagonal(d, z),
		raising(d, -1, func(k int) complex128 { return up(k - 1) }), raising(d, 1, up),
		diagonal(d, func(k int) complex128 { return z(k) * z(k) }))
}

// clockKind has the identity, Z (complex) and X for three states, charge modulo 3.
func clockKind(g block.Group) kindTable {
	z := diagonal(3, func(m int) complex128 {
		a := 2 * math.Pi * float64(m) / 3
		return complex(math.Cos(a), math.Sin(a))
	})
	x := raising(3, 1, unity)
	x[0*3+2] = 1
	return newKind("clock", g, []int32{0, 1, 2}, 0, nil, diagonal(3, unity), z, x)
}

// sum is a list of strings under construction.
type sum struct {
	*ladder.Strings
	kinds []kindTable
}

func newSum(g block.Group, kinds ...kindTable) *sum {
	s := &sum{&ladder.Strings{Group: g, Start: []int32{0}, Real: true}, kinds}
	for _, k := range kinds {
		s.Axes = append(s.Axes, k.axis)
		s.Tables = append(s.Tables, k.OpTable)
		for _, m := range k.Matrices {
			for _, x := range m {
				s.Real = s.Real && imag(x) == 0
			}
		}
	}
	return s
}

// add appends a term; factors are (site, operator) pairs.
func (s *sum) add(coef complex128, factors ...int32) {
	s.Coef = append(s.Coef, coef)
	s.Real = s.Real && imag(coef) == 0
	for i := 0; i < len(factors); i += 2 {
		s.Factors = append(s.Factors, ladder.StringFactor{Site: factors[i], Op: factors[i+1]})
	}
	s.Start = append(s.Start, int32(len(s.Factors)))
}

// addRandom appends terms of one to most factors that all add the sum's charge; each gets a coupling from draw.
func (s *sum) addRandom(rng *rand.Rand, terms, most int, draw func() complex128) {
	for tries := 0; terms > 0; tries++ {
		if tries > 1_000_000 {
			panic("no terms of this charge")
		}
		sites := rng.Perm(len(s.Axes))[:min(1+rng.IntN(most), len(s.Axes))]
		slices.Sort(sites)
		var q block.Charge
		var factors []int32
		for _, i := range sites {
			op := 1 + rng.IntN(len(s.Tables[i].Matrices)-1)
			q = s.Group.Add(q, s.Tables[i].Charges[op])
			factors = append(factors, int32(i), int32(op))
		}
		if q == s.Charge {
			s.add(draw(), factors...)
			terms--
		}
	}
}

// dense sums the Kronecker products.
func (s *sum) dense() []complex128 {
	total := 1
	for _, a := range s.Axes {
		total *= a.Dim()
	}
	h := make([]complex128, total*total)
	for t, c := range s.Coef {
		m, n := []complex128{c}, 1
		for i, local := range s.locals(t) {
			m, n = kron(m, n, local, s.Axes[i].Dim()), n*s.Axes[i].Dim()
		}
		for i, x := range m {
			h[i] += x
		}
	}
	return h
}

// locals returns the matrices of a term on all sites.
func (s *sum) locals(t int) [][]complex128 {
	ops := make([]int32, len(s.Axes))
	odd := false
	f := s.Factors[s.Start[t]:s.Start[t+1]]
	out := make([][]complex128, len(s.Axes))
	for i := len(s.Axes) - 1; i >= 0; i-- {
		table := s.Tables[i]
		if len(f) > 0 && int(f[len(f)-1].Site) == i {
			ops[i] = f[len(f)-1].Op
			odd = odd != table.Odd[ops[i]]
			f = f[:len(f)-1]
		} else if odd {
			ops[i] = table.Filler
		}
		out[i] = table.Matrices[ops[i]]
	}
	return out
}

func kron(a []complex128, n int, b []complex128, d int) []complex128 {
	out := make([]complex128, n*d*n*d)
	for i := range n {
		for j := range n {
			for k := range d {
				for l := range d {
					out[(i*d+k)*n*d+j*d+l] = a[i*n+j] * b[k*d+l]
				}
			}
		}
	}
	return out
}

func biggest(a []complex128) float64 {
	var m float64
	for _, x := range a {
		m = max(m, abs(x))
	}
	return m
}
