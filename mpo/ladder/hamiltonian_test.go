package ladder

import (
	"testing"

	"github.com/stretchr/testify/require"
)

func TestHamiltonianOfAFluxLadder(t *testing.T) {
	l := twoLegs(t, 3, Open)
	h, err := l.Hamiltonian(Constants{"J": 1, "K": 1.3, "U": 4, "phi": 0.8},
		Term{Formula: "-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c."},
		Term{Formula: "-J*exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."},
		Term{Formula: "-K b^+[a,j] b[b,j] + h.c."},
		Term{Formula: "U/2 n[l,j] (n[l,j]-1)", Each: Each{"l": "legs"}})
	require.NoError(t, err)
	require.Equal(t, 2*2*2+3*2+6, h.Poly.NumTerms())
	require.Empty(t, h.Warnings())
	require.Same(t, l, h.Ladder())
	ok, _ := h.Poly.Hermitian(0)
	require.True(t, ok)
}

func TestHermitianByTwoTerms(t *testing.T) {
	l := twoLegs(t, 3, Open)
	_, err := l.Hamiltonian(nil, Term{Formula: "i*b^+[a,j+1] b[a,j]"}, Term{Formula: "-i*b^+[a,j] b[a,j+1]"})
	require.NoError(t, err)
	_, err = l.Hamiltonian(nil, Term{Formula: "i*b^+[a,j+1] b[a,j]"}, Term{Name: "back", Formula: "-2*i*b^+[a,j] b[a,j+1]"})
	require.EqualError(t, err, `"i*b^+[a,j+1] b[a,j]": column 1: not Hermitian: 1*i b[a,0] b^+[a,1] has no conjugate (add "+ h.c.", or the conjugate as a term of its own)`)
}

func TestRoundingIsNotACoupling(t *testing.T) {
	l := must(t, 3, Open, Leg("s", Spin(1)))
	h, err := l.Hamiltonian(Constants{"J": 1e3, "weak": 1e-6}, Term{Formula: "J*S[s,j].S[s,j+1]"}, Term{Formula: "weak*S^z[s,0]"},
		Term{Formula: "(0.1+0.2-0.3)*S^x[s,0]"})
	require.NoError(t, err)
	require.Equal(t, 7, h.Poly.NumTerms(), "%v", h.Poly)
}

func TestEmptyHamiltonian(t *testing.T) {
	l := must(t, 2, Open, Leg("s", Spin(1)))
	_, err := l.Hamiltonian(nil)
	require.EqualError(t, err, "a Hamiltonian without terms (give at least one)")
	_, err = l.Hamiltonian(nil, Term{Formula: "S^z[s,j] S^z[s,j+2]"})
	require.EqualError(t, err, "the Hamiltonian is zero: its terms cancel or have no place on the ladder")
}

func TestWarnings(t *testing.T) {
	ring := must(t, 6, Periodic, Leg("a", Fermion()))
	tube := must(t, 1, Open, Leg("a", Fermion()), Leg("b", Fermion()), Leg("c", Fermion()), Across(Periodic))
	const advice = `; end a long range r at rungs/2, on an even ring with where = "2*r < rungs or j < r"`
	for _, c := range []struct {
		name   string
		ladder *Ladder
		term   Term
		want   []string
	}{
		{"neighbours on a ring", ring, Term{Formula: "n[a,j] n[a,j+1]"}, nil},
		{"long range to the end", ring, Term{Name: "V", Formula: "n[a,j] n[a,j+r]", Each: Each{"r": "1..rungs-1"}},
			[]string{`term "V" counts 15 sets of sites twice on the ring, first at (j = 0, r = 1) and (j = 1, r = 5)` + advice}},
		{"the opposite site", ring, Term{Name: "V", Formula: "n[a,j] n[a,j+r]", Each: Each{"r": "1..rungs/2"}},
			[]string{`term "V" counts 3 sets of sites twice on the ring, first at (j = 0, r = 3) and (j = 3, r = 3)` + advice}},
		{"halved by where", ring, Term{Formula: "n[a,j] n[a,j+r]", Each: Each{"r": "1..rungs/2"}, Where: "2*r < rungs or j < r"}, nil},
		{"hopping both ways without h.c.", ring, Term{Formula: "c^+[a,j+s] c[a,j]", Each: Each{"s": []int{1, -1}}}, nil},
		{"a ring of two", must(t, 2, Periodic, Leg("a", Fermion())), Term{Name: "hop", Formula: "c^+[a,j+1] c[a,j] + h.c."},
			[]string{`a ring of 2 rungs: each pair of neighbours counts twice; use boundary = "open" if that is not meant`,
				`term "hop" counts 1 set of sites twice on the ring, first at (j = 0) and (j = 1)` + advice}},
		{"around a tube", tube, Term{Formula: "n[l,j] n[l+1,j]", Each: Each{"l": "legs"}}, nil},
		{"twice around a tube", tube, Term{Name: "V", Formula: "n[l,j] n[l+d,j]", Each: Each{"l": "legs", "d": "1..2"}},
			[]string{`term "V" counts 3 sets of sites twice on the ring, first at (j = 0, d = 1, l = c) and (j = 0, d = 2, l = a)` + advice}},
		{"half a place", must(t, 4, Open, Leg("a", Fermion()), Leg("b", Fermion())),
			Term{Name: "all", Formula: "-c^+[a,j+1] c[a,j] - (c^+[a,j] c[b,j] + h.c.) + h.c."},
			[]string{`term "all" leaves out 1 place where only some of its summands have all their sites, first j = 3; if those are meant, write the summands as terms of their own`}},
		{"a number besides", must(t, 4, Open, Leg("a", Fermion())), Term{Formula: "n[a,j+1] n[a,j] - 0.25"}, nil},
		{"nowhere", ring, Term{Name: "gone", Formula: "n[a,j]", Where: "j > rungs"}, []string{`term "gone" has no place on this ladder`}},
	} {
		t.Run(c.name, func(t *testing.T) {
			h, err := c.ladder.Hamiltonian(nil, c.term, Term{Name: "chemical potential", Formula: "n[a,j]"})
			require.NoError(t, err)
			require.ElementsMatch(t, c.want, h.Warnings())
		})
	}
}
