package observables_test

import (
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// The oracle: a random state contracted to its full vector, turned back site by site to the user's basis, and operators
// applied by package exact.

// sample is a state with its full vector in the user's basis.
type sample struct {
	state  *mps.State
	lad    *ladder.Ladder
	basis  *exact.Basis
	vector []complex128 // of norm one
}

// world is a Hamiltonian whose frames the state takes, with the same sites for the oracle.
type world struct {
	name    string
	rungs   int
	parts   []ladder.Part
	sites   func(leg int) exact.Site
	legs    int
	terms   []string
	sector  ladder.Sector
	complex bool // the frames must be complex
	turned  bool // the frames must turn the sites
}

func (w world) sample(t testing.TB, seed uint64) sample {
	t.Helper()
	lad, err := ladder.New(w.rungs, ladder.Open, w.parts...)
	require.NoError(t, err)
	var terms []ladder.Term
	for _, f := range w.terms {
		terms = append(terms, ladder.Term{Formula: f})
	}
	h, err := lad.Hamiltonian(ladder.Constants{"g": 0.25}, terms...)
	require.NoError(t, err)
	f, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	require.Equal(t, w.complex, !f.Real, f.Loop)
	require.Equal(t, w.turned, f.Sites[0].Rotation != 0)
	target, err := f.Target(w.sector)
	require.NoError(t, err)
	totals, _ := f.Totals(target, 1)
	s, err := mps.RandomState(f, h.Scope, totals[0], 7, seed)
	require.NoError(t, err)

	var sites []exact.Site
	for i := range lad.Sites() {
		sites = append(sites, w.sites(i%w.legs))
	}
	basis, err := exact.NewBasis(sites, nil, nil)
	require.NoError(t, err)
	full := userVector(t, s)
	v := make([]complex128, basis.Dim())
	for i := range v {
		at := 0
		for site, k := range basis.State(i) {
			at = at*lad.Site(site).Dim() + k
		}
		v[i] = full[at]
	}
	return sample{s, lad, basis, v}
}

// userVector contracts the state, first site slowest, and applies the conjugate transpose of the frame's unitary on every site.
func userVector(t testing.TB, s *mps.State) []complex128 {
	var v []complex128
	if c, ok := s.Real(); ok {
		v = contracted(c)
	} else {
		c, _ := s.Complex()
		v = contracted(c)
	}
	lad := s.Scope().Ladder()
	inner := len(v)
	for i := range lad.Sites() {
		u, d := s.Frames().Unitary(lad, i), lad.Site(i).Dim() // <stored|user>
		inner /= d
		w := make([]complex128, len(v))
		for at := range v {
			stored, rest := at/inner%d, at-at/inner%d*inner
			for k := range d {
				w[rest+k*inner] += cmplx.Conj(u[stored*d+k]) * v[at]
			}
		}
		v = w
	}
	norm := dense.Norm(v)
	require.Positive(t, norm)
	dense.Scale(complex(1/norm, 0), v)
	return v
}

func contracted[T dense.Scalar](c *mps.Chain[T]) []complex128 {
	t := c.Sites[0]
	for _, a := range c.Sites[1:] {
		t = block.Contract(t, a, []int{len(t.Axes) - 1}, []int{0})
	}
	v := make([]complex128, 0, t.Size)
	for _, x := range t.Dense() {
		v = append(v, dense.ToComplex(x))
	}
	return v
}

func (s sample) expect(terms ...exact.Term) complex128 { return s.basis.Expect(s.vector, terms...) }

func legs(names string, site ladder.Site) []ladder.Part {
	var parts []ladder.Part
	for _, n := range names {
		parts = append(parts, ladder.Leg(string(n), site))
	}
	return parts
}

func always(s exact.Site) func(int) exact.Site { return func(int) exact.Site { return s } }

var (
	// A pi flux a plaquette, written with imaginary hopping: real after a change of phases.
	fermions = world{name: "fermions in a real gauge", rungs: 3, parts: legs("ab", ladder.Fermion()), legs: 2, sites: always(exact.Fermion()),
		terms: []string{"-i c^+[a,j+1] c[a,j] + h.c.", "-i c^+[b,j+1] c[b,j] + h.c.", "-i*(-1)^j c^+[a,j] c[b,j] + h.c."}, sector: ladder.Sector{"N": 3}}
	flux = world{name: "bosons with a flux", rungs: 3, parts: legs("ab", ladder.Boson(2)), legs: 2, sites: always(exact.Boson(2)), complex: true,
		terms: []string{"-exp(0.3*i) b^+[a,j+1] b[a,j] + h.c.", "-exp(-0.3*i) b^+[b,j+1] b[b,j] + h.c.", "-b^+[a,j] b[b,j] + h.c."}, sector: ladder.Sector{"N": 4}}
	paired = world{name: "fermions with pairing", rungs: 5, parts: legs("a", ladder.Fermion()), legs: 1, sites: always(exact.Fermion()),
		terms: []string{"-c^+[a,j+1] c[a,j] + h.c.", "i c^+[a,j+1] c^+[a,j] + h.c."}, sector: ladder.Sector{"P": 1}}
	turned = world{name: "spins along another axis", rungs: 6, parts: legs("a", ladder.Spin(1)), legs: 1, sites: always(exact.Spin(1)), turned: true,
		terms: []string{"-S^z[a,j] S^z[a,j+1]", "-0.7 S^x[a,j]", "0.2 S^x[a,j] S^z[a,j+1] S^z[a,j+2]"}, sector: ladder.Sector{"P": 0}}
	spinsOne = world{name: "spins one", rungs: 5, parts: legs("a", ladder.Spin(2)), legs: 1, sites: always(exact.Spin(2)),
		terms: []string{"S[a,j].S[a,j+1]", "0.3 S^z[a,j]^2"}, sector: ladder.Sector{"Sz": 1}}
	electrons = world{name: "electrons", rungs: 4, parts: legs("a", ladder.Electron()), legs: 1, sites: always(exact.Electron(true)),
		terms: []string{"-c_up^+[a,j+1] c_up[a,j] + h.c.", "-c_down^+[a,j+1] c_down[a,j] + h.c.", "n_up[a,j] n_down[a,j]"}, sector: ladder.Sector{"N": 4, "Sz": 0}}
	clocks = world{name: "clocks", rungs: 5, parts: legs("a", ladder.Clock(3)), legs: 1, sites: always(exact.Clock(3)),
		terms: []string{"-X^+[a,j+1] X[a,j] + h.c.", "-Z[a,j] + h.c."}, sector: ladder.Sector{"Q": 1}}
	mixed = world{name: "fermions beside bosons", rungs: 3, parts: []ladder.Part{ladder.Leg("a", ladder.Fermion()), ladder.Leg("b", ladder.Boson(2))}, legs: 2,
		sites: func(leg int) exact.Site { return []exact.Site{exact.Fermion(), exact.Boson(2)}[leg] },
		terms: []string{"-c^+[a,j+1] c[a,j] + h.c.", "-b^+[b,j+1] b[b,j] + h.c.", "n[a,j] n[b,j]"}, sector: ladder.Sector{"N_a": 2, "N_b": 3}}
)

var worlds = []world{fermions, flux, paired, turned, spinsOne, electrons, clocks, mixed}
