package ladder

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/mps/block"
)

func TestTarget(t *testing.T) {
	ladder := newForm(t, 4, Leg("a", Boson(2)), Leg("b", Boson(2)))
	coupled := ladder.fluxLadder(4, "b", 0, true)
	coupled.Terms = []Term{{Name: "rung hopping", Formula: "-K b^+[a,j] b[b,j] + h.c."}}
	apart := ladder.fluxLadder(4, "b", 0, false)
	electrons := newForm(t, 3, Leg("a", Electron())).hubbard(3)
	single := newForm(t, 3, Leg("a", Electron(Double(false)))).hubbard(3)
	spins := newForm(t, 3, Leg("a", Spin(1))).xyz(3, 1, 1, 1)
	ising := newForm(t, 3, Leg("a", Spin(1))).isingZ(3)
	clock := newForm(t, 3, Leg("a", Clock(3))).clockChain(3, false)
	tests := []struct {
		name   string
		h      *Hamiltonian
		sector Sector
		charge block.Charge
		free   []bool
		err    string
	}{
		{"N", coupled, Sector{"N": 5}, block.Charge{5}, []bool{false}, ""},
		{"as a float", coupled, Sector{"N": 5.0}, block.Charge{5}, []bool{false}, ""},
		{"free", coupled, nil, block.Charge{}, []bool{true}, ""},
		{"too many", coupled, Sector{"N": 17}, block.Charge{}, nil, "sector N = 17 cannot be reached on this ladder (nearest: N = 16; or N = 15; or N = 14)"},
		{"negative", coupled, Sector{"N": -1}, block.Charge{}, nil, "nearest: N = 0"},
		{"fraction", coupled, Sector{"N": 1.5}, block.Charge{}, nil, "sector N = 1.5: expected a whole number"},
		{"wrong type", coupled, Sector{"N": true}, block.Charge{}, nil, "sector N = true: a bool; expected a number or a formula"},
		{"unknown", coupled, Sector{"M": 1}, block.Charge{}, nil, `this ladder has no charge "M" (conserved: N, P)`},
		{"parity from N", coupled, Sector{"N": 5, "P": 1}, block.Charge{5}, []bool{false}, ""},
		{"parity against N", coupled, Sector{"N": 5, "P": 0}, block.Charge{}, nil, "nearest: N = 4, P = 0; or N = 5, P = 1; or N = 6, P = 0"},
		{"parity alone", coupled, Sector{"P": 1}, block.Charge{}, []bool{true}, ""},
		{"derived leg number", apart, Sector{"N_a": 3, "N_b": 4}, block.Charge{7, 3}, []bool{false, false}, ""},
		{"other leg alone", apart, Sector{"N_b": 4}, block.Charge{}, []bool{true, true}, ""},
		{"full leg", apart, Sector{"N_b": 8, "N": 8}, block.Charge{8, 0}, []bool{false, false}, ""},
		{"electrons", electrons, Sector{"N": 3, "Sz": 0.5}, block.Charge{3, 1}, []bool{false, false}, ""},
		{"electrons, mismatch", electrons, Sector{"N": 3, "Sz": 0}, block.Charge{}, nil,
			"sector N = 3, Sz = 0 cannot be reached on this ladder (nearest: N = 3, Sz = -1/2; or N = 3, Sz = 1/2; or N = 2, Sz = 0)"},
		{"electrons, components", electrons, Sector{"N up": 2, "N down": 1}, block.Charge{3, 1}, []bool{false, false}, ""},
		{"no double occupation", single, Sector{"N": 4}, block.Charge{}, nil, "nearest: N = 3; or N = 2"},
		{"polarized", single, Sector{"N": 3, "Sz": 1.5}, block.Charge{3, 3}, []bool{false, false}, ""},
		{"spins", spins, Sector{"Sz": -0.5}, block.Charge{-1}, []bool{false}, ""},
		{"spins, whole", spins, Sector{"Sz": 0}, block.Charge{}, nil, "nearest: Sz = -1/2; or Sz = 1/2"},
		{"spins, third", spins, Sector{"Sz": 0.3}, block.Charge{}, nil, "expected a multiple of 1/2"},
		{"ising", ising, Sector{"P": 1}, block.Charge{1}, []bool{false}, ""},
		{"ising, out of range", ising, Sector{"P": 2}, block.Charge{}, nil, "expected a whole number from 0 to 1"},
		{"clock", clock, Sector{"Q": 2}, block.Charge{2}, []bool{false}, ""},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			f, err := c.h.Frames(FrameOptions{})
			require.NoError(t, err)
			target, err := f.Target(c.sector)
			if c.err != "" {
				require.ErrorContains(t, err, c.err)
				return
			}
			require.NoError(t, err)
			require.Equal(t, c.charge, target.Charge)
			require.Equal(t, c.free, target.Free)
		})
	}
}

func TestValues(t *testing.T) {
	f, err := newForm(t, 3, Leg("a", Electron())).hubbard(3).Frames(FrameOptions{})
	require.NoError(t, err)
	require.Equal(t, map[string]float64{"N": 3, "Sz": -0.5}, f.Values(block.Charge{3, -1}))
}

// The totals found agree with those of all product states, whatever the kinds of sites, and the search in depth agrees with the bits.
func TestReachAgreesWithEnumeration(t *testing.T) {
	sites := []Site{Fermion(), Electron(), Electron(Double(false)), Boson(2), Spin(1), Spin(2), Clock(3)}
	rapid.Check(t, func(rt *rapid.T) {
		var parts []Part
		for k := range rapid.IntRange(1, 3).Draw(rt, "legs") {
			parts = append(parts, Leg(fmt.Sprint("l", k), rapid.SampledFrom(sites).Draw(rt, "site")))
		}
		l, err := New(rapid.IntRange(1, 2).Draw(rt, "rungs"), Open, parts...)
		require.NoError(rt, err)
		lb := newLabelling(l)
		named := lb.namedCharges(make(rotations, len(lb.classes)))
		charges := rapid.SliceOfNDistinct(rapid.SampledFrom(named), 1, min(3, len(named)), func(c *charge) string { return c.name }).Draw(rt, "charges")

		want := map[string]bool{}
		points := [][]int64{make([]int64, len(charges))}
		for i := range l.Sites() {
			var next [][]int64
			for _, p := range points {
				for s := range l.Site(i).Dim() {
					q := append([]int64(nil), p...)
					for k, c := range charges {
						q[k] += int64(c.ofState(lb, i, s))
					}
					next = append(next, q)
				}
			}
			points = next
		}
		r := newReach(lb, charges)
		for _, p := range points {
			r.reduce(p)
			want[fmt.Sprint(p)] = true
			require.True(rt, r.holds(p))
		}
		for _, deep := range []bool{false, true} {
			if deep {
				r.set = nil
			}
			got := map[string]bool{}
			require.True(rt, r.visit(make([]*int64, len(charges)), func(p []int64) bool {
				got[fmt.Sprint(p)] = true
				return true
			}))
			require.Equal(rt, want, got)
			for range 5 {
				p := make([]int64, len(charges))
				for k, c := range charges {
					p[k] = rapid.Int64Range(-4, 8).Draw(rt, "value")
					if c.modulus != 0 {
						p[k] = (p[k] + 4*int64(c.modulus)) % int64(c.modulus)
					}
				}
				require.Equal(rt, want[fmt.Sprint(p)], r.holds(p), "%v", p)
			}
		}
	})
}

// Large ladders: the exact answer stays quick, also where four charges are conserved.
func TestReachOfLargeLadders(t *testing.T) {
	l, err := New(256, Open, Leg("a", Electron()), Leg("b", Electron(Double(false))))
	require.NoError(t, err)
	lb := newLabelling(l)
	by := map[string]*charge{}
	for _, c := range lb.namedCharges(make(rotations, 2)) {
		by[c.name] = c
	}
	full := []*charge{by["N"], by["Sz"], by["N_a"], by["Sz_a"]}
	tests := []struct {
		name    string
		charges []*charge
		point   []int64
		want    bool
	}{
		{"two charges", full[:2], []int64{300, 4}, true},
		{"two charges, mismatch", full[:2], []int64{300, 5}, false},
		{"four charges", full, []int64{300, 4, 200, 2}, true},
		{"four charges, leg b too full", full, []int64{500, 4, 200, 2}, false},
		{"four charges, leg b too polarized", full, []int64{300, 104, 200, 2}, false},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			require.Equal(t, c.want, newReach(lb, c.charges).holds(c.point))
		})
	}
}

func TestTotalsStartInTheMiddle(t *testing.T) {
	h := newForm(t, 6, Leg("a", Boson(2)), Leg("b", Boson(2))).fluxLadder(6, "b", 0, false)
	f, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	target, err := f.Target(Sector{"N": 4})
	require.NoError(t, err)
	require.Equal(t, []bool{false, true}, target.Free)
	all, complete := f.Totals(target, 100)
	require.True(t, complete)
	require.Equal(t, []block.Charge{{4, 2}, {4, 1}, {4, 3}, {4, 0}, {4, 4}}, all)
	some, complete := f.Totals(target, 2)
	require.False(t, complete)
	require.Equal(t, all[:2], some)

	odd, err := f.Target(Sector{"P": 1, "N_a": 3})
	require.NoError(t, err)
	all, _ = f.Totals(odd, 100)
	require.Len(t, all, 7, "N_b = 0, 2, ..., 12")
	for _, c := range all {
		require.Equal(t, int32(1), c[0]%2)
		require.Equal(t, int32(3), c[1])
	}
}

// The user's words: formulas as values, and the term that breaks a charge by its name.
func TestSectorInWords(t *testing.T) {
	l, err := New(4, Open, Leg("a", Boson(2)), Leg("b", Boson(2)), Leg("s", Spin(1)))
	require.NoError(t, err)
	h, err := l.Hamiltonian(Constants{"K": 1},
		Term{Name: "leg hopping", Formula: "b^+[l,j+1] b[l,j] + h.c.", Each: Each{"l": []string{"a", "b"}}},
		Term{Name: "rung hopping", Formula: "-K b^+[a,j] b[b,j] + h.c."},
		Term{Formula: "S^z[s,j] S^z[s,j+1]"}, Term{Formula: "S^x[s,j]"})
	require.NoError(t, err)
	f, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	require.Equal(t, "N: U(1) × P: Z_2", f.Group.String())
	require.Equal(t, "parity: 0 where the product of exp(i pi n) and exp(i pi (s - S^x)) is +1", f.Charges[1].Description)
	target, err := f.Target(Sector{"N": "rungs/2 + 1"})
	require.NoError(t, err)
	require.Equal(t, block.Charge{3}, target.Charge)
	require.Equal(t, []bool{false, true}, target.Free)
	_, err = f.Target(Sector{"N_a": 1})
	require.ErrorContains(t, err, `N_a is not conserved: term "rung hopping" changes it (conserved: N, P`)
	_, err = f.Target(Sector{"Sx": 1})
	require.ErrorContains(t, err, `Sx is not conserved: term "S^z[s,j] S^z[s,j+1]" changes it`)
	_, err = f.Target(Sector{"N": "rungs/8"})
	require.ErrorContains(t, err, "sector N = rungs/8: expected a whole number")
	_, err = f.Target(Sector{"N": "rungs +"})
	require.ErrorContains(t, err, "sector N = rungs +")

	g, err := h.Frames(FrameOptions{Charges: []string{"P"}})
	require.NoError(t, err)
	require.True(t, g.Missing)
	_, err = g.Target(Sector{"N": 1})
	require.ErrorContains(t, err, "N is conserved, but it is not among the charges in use and does not follow from them (in use: P")
}

func TestBindRefusesForeignFrames(t *testing.T) {
	coupled := newForm(t, 3, Leg("a", Boson(2)), Leg("b", Boson(2)))
	apart, err := coupled.fluxLadder(3, "b", 0, false).Frames(FrameOptions{})
	require.NoError(t, err)
	require.ErrorContains(t, apart.Bind(coupled.fluxLadder(3, "b", 0, true)), `charge "N_a" cannot be used`)
	require.ErrorContains(t, apart.Bind(newForm(t, 2, Leg("a", Boson(2))).hamiltonian()), "do not fit a ladder")
	var unbound Frames
	_, err = unbound.Target(nil)
	require.ErrorContains(t, err, "must be bound")
}
