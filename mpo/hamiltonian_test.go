package mpo_test

import (
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/exact"
	"rundle/mpo"
	"rundle/mpo/ladder"
)

// hamiltonian is a model written twice: as formulas, and as terms of the exact diagonalization.
type hamiltonian struct {
	name  string
	rungs int
	edge  ladder.Boundary
	parts []ladder.Part
	sites []exact.Site // of one rung
	terms []ladder.Term
	exact func(add func(coef complex128, namesAndSites ...any)) // without Hermitian conjugates
	real  bool
}

func hamiltonians() []hamiltonian {
	w := cmplx.Exp(0.35i)
	return []hamiltonian{
		{"fermion ladder with flux and pair hopping", 3, ladder.Open,
			[]ladder.Part{ladder.Leg("a", ladder.Fermion()), ladder.Leg("b", ladder.Fermion())},
			[]exact.Site{exact.Fermion(), exact.Fermion()},
			[]ladder.Term{{Formula: "-exp(0.35*i) c^+[a,j+1] c[a,j] + h.c."}, {Formula: "-0.6 c^+[b,j+1] c[b,j] + h.c."},
				{Formula: "0.7 c^+[a,j] c[b,j] + h.c."}, {Formula: "0.4*i c^+[a,j+1] c^+[b,j+1] c[b,j] c[a,j] + h.c."},
				{Formula: "1.3 n[a,j] n[b,j]"}},
			func(add func(complex128, ...any)) {
				for j := range 3 {
					a, b := 2*j, 2*j+1
					add(0.7, "c^+", a, "c", b)
					add(0.65, "n", a, "n", b)
					if j < 2 {
						add(-w, "c^+", a+2, "c", a)
						add(-0.6, "c^+", b+2, "c", b)
						add(0.4i, "c^+", a+2, "c^+", b+2, "c", b, "c", a)
					}
				}
			}, false},
		{"electron ring with pi flux", 3, ladder.Periodic,
			[]ladder.Part{ladder.Leg("a", ladder.Electron())}, []exact.Site{exact.Electron(true)},
			[]ladder.Term{{Formula: "-1.1 c_up^+[a,j+1] c_up[a,j] + h.c."}, {Formula: "0.8 c_down^+[a,j+1] c_down[a,j] + h.c."},
				{Formula: "3 n_up[a,j] n_down[a,j]"}, {Formula: "0.2 S^+[a,j] S^-[a,j+1] + h.c."}},
			func(add func(complex128, ...any)) {
				for j := range 3 {
					k := (j + 1) % 3
					add(-1.1, "c_up^+", k, "c_up", j)
					add(0.8, "c_down^+", k, "c_down", j)
					add(1.5, "n_up", j, "n_down", j)
					add(0.2, "S^+", j, "S^-", k)
				}
			}, true},
		{"pairing chain", 4, ladder.Open, []ladder.Part{ladder.Leg("a", ladder.Fermion())}, []exact.Site{exact.Fermion()},
			[]ladder.Term{{Formula: "-c^+[a,j+1] c[a,j] + 0.7*i c[a,j+1] c[a,j] + h.c."}, {Formula: "0.3 n[a,j]"}},
			func(add func(complex128, ...any)) {
				for j := range 4 {
					add(0.15, "n", j)
					if j < 3 {
						add(-1, "c^+", j+1, "c", j)
						add(0.7i, "c", j+1, "c", j)
					}
				}
			}, true},
		{"bosons", 4, ladder.Open, []ladder.Part{ladder.Leg("a", ladder.Boson(2))}, []exact.Site{exact.Boson(2)},
			[]ladder.Term{{Formula: "-b^+[a,j+1] n[a,j] b[a,j] + h.c."}, {Formula: "0.5 b^+[a,j]^2 b[a,j+1]^2 + h.c."}, {Formula: "2 n[a,j] (n[a,j] - 1)"}},
			func(add func(complex128, ...any)) {
				for j := range 4 {
					add(1, "n", j, "n", j)
					add(-1, "n", j)
					if j < 3 {
						add(-1, "b^+", j+1, "n", j, "b", j)
						add(0.5, "b^+", j, "b^+", j, "b", j+1, "b", j+1)
					}
				}
			}, true},
		{"transverse field", 5, ladder.Open, []ladder.Part{ladder.Leg("s", ladder.Spin(1))}, []exact.Site{exact.Spin(1)},
			[]ladder.Term{{Formula: "-4 S^x[s,j] S^x[s,j+1]"}, {Formula: "-2 S^z[s,j]"}},
			func(add func(complex128, ...any)) {
				for j := range 5 {
					add(-1, "S^z", j)
					if j < 4 {
						add(-2, "S^x", j, "S^x", j+1)
					}
				}
			}, true},
		{"spins one", 3, ladder.Periodic, []ladder.Part{ladder.Leg("s", ladder.Spin(2))}, []exact.Site{exact.Spin(2)},
			[]ladder.Term{{Formula: "S[s,j].S[s,j+1]"}, {Formula: "0.4 S^z[s,j]^2"}},
			func(add func(complex128, ...any)) {
				for j := range 3 {
					k := (j + 1) % 3
					add(0.5, "S^z", j, "S^z", k)
					add(0.5, "S^+", j, "S^-", k)
					add(0.2, "S^z", j, "S^z", j)
				}
			}, true},
		{"clock", 4, ladder.Open, []ladder.Part{ladder.Leg("k", ladder.Clock(3))}, []exact.Site{exact.Clock(3)},
			[]ladder.Term{{Formula: "-Z^+[k,j+1] Z[k,j] - 0.8 X[k,j] + h.c."}, {Formula: "-0.8 X[k,3] + h.c."}},
			func(add func(complex128, ...any)) {
				for j := range 3 {
					add(-1, "Z^+", j+1, "Z", j)
					add(-0.8, "X", j)
				}
				add(-0.8, "X", 3)
			}, true},
		{"fermions, bosons and spins", 2, ladder.Open,
			[]ladder.Part{ladder.Leg("a", ladder.Fermion()), ladder.Leg("b", ladder.Boson(1)), ladder.Leg("s", ladder.Spin(1))},
			[]exact.Site{exact.Fermion(), exact.Boson(1), exact.Spin(1)},
			[]ladder.Term{{Formula: "-c^+[a,j+1] c[a,j] (b[b,j] + b^+[b,j]) + h.c."}, {Formula: "0.9 S^+[s,j] S^-[s,j+1] n[b,j] + h.c."}},
			func(add func(complex128, ...any)) {
				add(-1, "c^+", 3, "c", 0, "b", 1)
				add(-1, "c^+", 3, "c", 0, "b^+", 1)
				add(0.9, "S^+", 2, "S^-", 5, "n", 1)
			}, true},
	}
}

// matrix is factor times the dense sum in the user's basis, plus its Hermitian conjugate; site 0 runs slowest.
func (h hamiltonian) matrix(t *testing.T, factor complex128) []complex128 {
	t.Helper()
	var sites []exact.Site
	for range h.rungs {
		sites = append(sites, h.sites...)
	}
	b, err := exact.NewBasis(sites, nil, nil)
	require.NoError(t, err)
	var terms []exact.Term
	h.exact(func(coef complex128, namesAndSites ...any) {
		terms = append(terms, exact.T(factor*coef, namesAndSites...))
	})
	m, err := b.Matrix(exact.WithAdjoints(terms...)...)
	require.NoError(t, err)
	out := make([]complex128, b.Dim()*b.Dim())
	for i := range b.Dim() {
		for j := range b.Dim() {
			out[i*b.Dim()+j] = m.At(i, j)
		}
	}
	return out
}

// stored brings a matrix in the user's basis into the frames.
func stored(l *ladder.Ladder, f *ladder.Frames, a []complex128) []complex128 {
	u, n := []complex128{1}, 1
	for i := range l.Sites() {
		v, d := f.Unitary(l, i), l.Site(i).Dim()
		w := make([]complex128, n*d*n*d)
		for x := range w {
			r, c := x/(n*d), x%(n*d)
			w[x] = u[r/d*n+c/d] * v[r%d*d+c%d]
		}
		u, n = w, n*d
	}
	left := make([]complex128, n*n)
	dense.Gemm(dense.NoTrans, dense.NoTrans, n, n, n, 1, u, n, a, n, 0, left, n)
	out := make([]complex128, n*n)
	dense.Gemm(dense.NoTrans, dense.ConjTrans, n, n, n, 1, left, n, u, n, 0, out, n)
	return out
}

func checkHamiltonian[T dense.Scalar](t *testing.T, want []complex128, s *ladder.Strings) {
	t.Helper()
	o, err := mpo.Build[T](s, mpo.Options{})
	require.NoError(t, err)
	got := o.Dense()
	require.Len(t, got, len(want))
	for i, x := range want {
		require.InDelta(t, 0, cmplx.Abs(x-dense.ToComplex(got[i])), 1e-13, "element %d", i)
	}
}

// Formula, algebra, frames, signs and operator together give the matrix of the exact diagonalization, which shares no code.
func TestHamiltonians(t *testing.T) {
	for _, h := range hamiltonians() {
		t.Run(h.name, func(t *testing.T) {
			l, err := ladder.New(h.rungs, h.edge, h.parts...)
			require.NoError(t, err)
			model, err := l.Hamiltonian(nil, h.terms...)
			require.NoError(t, err)
			a := h.matrix(t, 1)
			for _, opt := range []ladder.FrameOptions{{}, {Complex: true}, {NoRotation: true}, {Charges: []string{}}} {
				f, err := model.Frames(opt)
				require.NoError(t, err)
				s, err := f.Strings(model.Poly)
				require.NoError(t, err)
				want := stored(l, f, a)
				if opt.Charges == nil && !opt.Complex && !opt.NoRotation {
					require.Equal(t, h.real, s.Real)
				}
				if s.Real {
					checkHamiltonian[float64](t, want, s)
				}
				checkHamiltonian[complex128](t, want, s)
			}
		})
	}
}

// Operators that move charge, odd ones with their signs to the left end among them.
func TestChargedOperators(t *testing.T) {
	cases := []struct {
		model, formula, name string
		site                 int
	}{
		{"fermion ladder with flux and pair hopping", "c[b,1]", "c", 3},
		{"fermion ladder with flux and pair hopping", "c^+[a,0]", "c^+", 0},
		{"electron ring with pi flux", "c_down[a,2]", "c_down", 2},
		{"electron ring with pi flux", "S^-[a,1]", "S^-", 1},
		{"pairing chain", "c[a,2]", "c", 2},
		{"bosons", "b^+[a,3]", "b^+", 3},
		{"spins one", "S^+[s,1]", "S^+", 1},
		{"fermions, bosons and spins", "c[a,1]", "c", 3},
		{"fermions, bosons and spins", "S^-[s,1]", "S^-", 5},
	}
	for _, c := range cases {
		t.Run(c.model+"/"+c.formula, func(t *testing.T) {
			for _, h := range hamiltonians() {
				if h.name != c.model {
					continue
				}
				l, err := ladder.New(h.rungs, h.edge, h.parts...)
				require.NoError(t, err)
				model, err := l.Hamiltonian(nil, h.terms...)
				require.NoError(t, err)
				f, err := model.Frames(ladder.FrameOptions{})
				require.NoError(t, err)
				p, err := model.Scope.Polynomial(ladder.Term{Formula: c.formula})
				require.NoError(t, err)
				s, err := f.Strings(p)
				require.NoError(t, err)
				h.exact = func(add func(complex128, ...any)) { add(1, c.name, c.site) }
				a, b := h.matrix(t, 0.5), h.matrix(t, -0.5i) // the Hermitian parts: operator = a + i b
				for i := range a {
					a[i] += 1i * b[i]
				}
				checkHamiltonian[complex128](t, stored(l, f, a), s)
			}
		})
	}
}
