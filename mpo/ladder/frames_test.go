package ladder

import (
	"encoding/json"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mps/block"
)

// form writes polynomials by hand, without formulas.
type form struct {
	t *testing.T
	l *Ladder
}

// op is an operator in the notation of formulas: op("b", "+", "a", 3).
func (f form) op(name, super, leg string, rung int) *Polynomial {
	i, ok := f.l.SiteIndex(leg, rung)
	require.True(f.t, ok, "site %s,%d", leg, rung)
	w, ok := f.l.Site(i).Symbol(name, super)
	require.True(f.t, ok, "operator %s^%s", name, super)
	p := Zero(f.l)
	for _, x := range w {
		p = p.Add(Local(f.l, i, x.Op).Scale(x.Coef))
	}
	return p
}

func (f form) mul(ps ...*Polynomial) *Polynomial {
	out := One(f.l)
	for _, p := range ps {
		var err error
		out, err = out.Mul(p)
		require.NoError(f.t, err)
	}
	return out
}

// hermitian adds the Hermitian conjugate.
func hermitian(p *Polynomial) *Polynomial { return p.Add(p.Adjoint()) }

func (f form) hamiltonian(ps ...*Polynomial) *Hamiltonian {
	sum := Zero(f.l)
	for _, p := range ps {
		sum = sum.Add(p)
	}
	ok, bad := sum.Hermitian(1e-12)
	require.True(f.t, ok, bad)
	scope, err := NewScope(f.l, nil)
	require.NoError(f.t, err)
	return &Hamiltonian{Scope: scope, Poly: sum}
}

func newForm(t *testing.T, rungs int, parts ...Part) form {
	l, err := New(rungs, Open, parts...)
	require.NoError(t, err)
	return form{t, l}
}

// userMatrix is the oracle: the operator in the user's product basis (site 0 slowest), odd operators of a site passing the fermions of the sites
// before it. It shares nothing with Strings.
func userMatrix(p *Polynomial) [][]complex128 {
	l := p.Ladder()
	dims := make([]int, l.Sites())
	total := 1
	for i := range dims {
		dims[i] = l.Site(i).Dim()
		total *= dims[i]
	}
	out := make([][]complex128, total)
	for i := range out {
		out[i] = make([]complex128, total)
	}
	for t := range p.NumTerms() {
		coef, factors := p.Term(t)
		for in := range total {
			amp := map[string]complex128{fmt.Sprint(digits(in, dims)): coef}
			states := map[string][]int{fmt.Sprint(digits(in, dims)): digits(in, dims)}
			for k := len(factors) - 1; k >= 0; k-- {
				f := factors[k]
				site := l.Site(int(f.Site))
				m, d := site.Matrix(f.Op), site.Dim()
				next, nextStates := map[string]complex128{}, map[string][]int{}
				for key, a := range amp {
					s := states[key]
					if site.Odd(f.Op) && fermionsBefore(l, s, int(f.Site))%2 == 1 {
						a = -a
					}
					for o := range d {
						if z := m[o*d+s[f.Site]]; z != 0 {
							u := append([]int(nil), s...)
							u[f.Site] = o
							next[fmt.Sprint(u)] += a * z
							nextStates[fmt.Sprint(u)] = u
						}
					}
				}
				amp, states = next, nextStates
			}
			for key, a := range amp {
				out[number(states[key], dims)][in] += a
			}
		}
	}
	return out
}

func fermionsBefore(l *Ladder, s []int, site int) int {
	n := 0
	for i := range site {
		if k := l.Site(i).Kind(); k == KindFermion || k == KindElectron {
			for _, x := range l.Site(i).StateLabels(s[i]) {
				n += x
			}
		}
	}
	return n
}

func digits(n int, dims []int) []int {
	out := make([]int, len(dims))
	for i := len(dims) - 1; i >= 0; i-- {
		out[i] = n % dims[i]
		n /= dims[i]
	}
	return out
}

func number(s, dims []int) int {
	n := 0
	for i, x := range s {
		n = n*dims[i] + x
	}
	return n
}

// storedMatrix builds the full matrix of Strings from its site matrices and fillers.
func storedMatrix(s *Strings) [][]complex128 {
	total := 1
	for _, a := range s.Axes {
		total *= a.Dim()
	}
	out := make([][]complex128, total)
	for i := range out {
		out[i] = make([]complex128, total)
	}
	for t, coef := range s.Coef {
		factors := s.Factors[s.Start[t]:s.Start[t+1]]
		after := 0
		for _, f := range factors {
			if s.Tables[f.Site].Odd[f.Op] {
				after++
			}
		}
		full := []complex128{coef}
		n := 1
		for i, tab := range s.Tables {
			m := tab.Matrices[0]
			if len(factors) > 0 && factors[0].Site == int32(i) {
				m = tab.Matrices[factors[0].Op]
				if tab.Odd[factors[0].Op] {
					after--
				}
				factors = factors[1:]
			} else if after%2 == 1 {
				m = tab.Matrices[tab.Filler]
			}
			full, n = kron(full, n, m, s.Axes[i].Dim())
		}
		for i := range total {
			for j := range total {
				out[i][j] += full[i*total+j]
			}
		}
	}
	return out
}

func kron(a []complex128, n int, b []complex128, d int) ([]complex128, int) {
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
	return out, n * d
}

// requireFrame checks U A U^+ = strings for the unitary of the frames, and the charges of all elements.
func requireFrame(t *testing.T, f *Frames, p *Polynomial) {
	t.Helper()
	parts, err := f.StringsByCharge(p)
	require.NoError(t, err)
	l := p.Ladder()
	u, n := []complex128{1}, 1
	for i := range l.Sites() {
		u, n = kron(u, n, f.Unitary(l, i), l.Site(i).Dim())
	}
	a := userMatrix(p)
	want := make([]complex128, n*n)
	half := make([]complex128, n*n)
	for i := range n {
		for k := range n {
			if u[i*n+k] != 0 {
				for j := range n {
					half[i*n+j] += u[i*n+k] * a[k][j]
				}
			}
		}
	}
	for i := range n {
		for k := range n {
			if half[i*n+k] != 0 {
				for j := range n {
					want[i*n+j] += half[i*n+k] * cmplx.Conj(u[j*n+k])
				}
			}
		}
	}
	got := make([]complex128, n*n)
	charges := totals(f)
	for _, s := range parts {
		for i, row := range storedMatrix(s) {
			for j, z := range row {
				got[i*n+j] += z
				if cmplx.Abs(z) > 1e-12 {
					require.Equal(t, s.Charge, f.Group.Sub(charges[i], charges[j]), "charge of element %d,%d", i, j)
				}
				if s.Real {
					require.Zero(t, imag(z))
				}
			}
		}
	}
	for i := range want {
		if cmplx.Abs(want[i]-got[i]) > 1e-11 {
			t.Fatalf("element %d,%d: want %v, got %v", i/n, i%n, want[i], got[i])
		}
	}
}

// totals returns the charges of all product states in stored order.
func totals(f *Frames) []block.Charge {
	out := []block.Charge{{}}
	for _, s := range f.Sites {
		var next []block.Charge
		for _, c := range out {
			for _, d := range s.Charges {
				next = append(next, f.Group.Add(c, d))
			}
		}
		out = next
	}
	return out
}

func groupOf(f *Frames) string { return f.Group.String() }

func (f form) isingZ(n int) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		ps = append(ps, f.op("S", "x", "a", j).Scale(-0.7))
		if j > 0 {
			ps = append(ps, f.mul(f.op("S", "z", "a", j-1), f.op("S", "z", "a", j)).Scale(-1))
		}
	}
	return f.hamiltonian(ps...)
}

func (f form) isingX(n int) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		ps = append(ps, f.op("S", "z", "a", j).Scale(-0.7))
		if j > 0 {
			ps = append(ps, f.mul(f.op("S", "x", "a", j-1), f.op("S", "x", "a", j)).Scale(-1))
		}
	}
	return f.hamiltonian(ps...)
}

func (f form) xyz(n int, jx, jy, jz float64, fields ...string) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		for _, a := range fields {
			ps = append(ps, f.op("S", a, "a", j).Scale(0.3))
		}
		if j > 0 {
			for k, a := range []string{"x", "y", "z"} {
				ps = append(ps, f.mul(f.op("S", a, "a", j-1), f.op("S", a, "a", j)).Scale(complex([]float64{jx, jy, jz}[k], 0)))
			}
		}
	}
	return f.hamiltonian(ps...)
}

// clockChain is -Z^+Z - g X + h.c., or with Z and X exchanged.
func (f form) clockChain(n int, turned bool) *Hamiltonian {
	z, x := "Z", "X"
	if turned {
		z, x = x, z
	}
	var ps []*Polynomial
	for j := range n {
		ps = append(ps, hermitian(f.op(x, "", "a", j).Scale(-0.8)))
		if j > 0 {
			ps = append(ps, hermitian(f.mul(f.op(z, "+", "a", j-1), f.op(z, "", "a", j)).Scale(-1)))
		}
	}
	return f.hamiltonian(ps...)
}

func (f form) pairing(n int) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		ps = append(ps, f.op("n", "", "a", j).Scale(0.4))
		if j > 0 {
			ps = append(ps, hermitian(f.mul(f.op("c", "+", "a", j-1), f.op("c", "", "a", j)).Scale(-1)))
			ps = append(ps, hermitian(f.mul(f.op("c", "", "a", j-1), f.op("c", "", "a", j)).Scale(cmplx.Rect(0.6, 0.9))))
		}
	}
	return f.hamiltonian(ps...)
}

func (f form) hubbard(n int) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		ps = append(ps, f.mul(f.op("n_up", "", "a", j), f.op("n_down", "", "a", j)).Scale(4))
		for _, s := range []string{"c_up", "c_down"} {
			if j > 0 {
				ps = append(ps, hermitian(f.mul(f.op(s, "+", "a", j-1), f.op(s, "", "a", j)).Scale(cmplx.Rect(-1, 0.3))))
			}
		}
	}
	return f.hamiltonian(ps...)
}

// hopping ladder with flux phi per plaquette and, if rung, coupled legs.
func (f form) fluxLadder(n int, op string, phi float64, rung bool) *Hamiltonian {
	var ps []*Polynomial
	for j := range n {
		if rung {
			ps = append(ps, hermitian(f.mul(f.op(op, "+", "a", j), f.op(op, "", "b", j)).Scale(-1.3)))
		}
		if j > 0 {
			ps = append(ps, hermitian(f.mul(f.op(op, "+", "a", j), f.op(op, "", "a", j-1)).Scale(cmplx.Rect(-1, phi/2))))
			ps = append(ps, hermitian(f.mul(f.op(op, "+", "b", j), f.op(op, "", "b", j-1)).Scale(cmplx.Rect(-1, -phi/2))))
		}
	}
	return f.hamiltonian(ps...)
}

func TestFrames(t *testing.T) {
	tests := []struct {
		name  string
		h     func(t *testing.T) *Hamiltonian
		group string
		real  bool
		turn  int // rotation of site 0
	}{
		{"ising, parity diagonal", func(t *testing.T) *Hamiltonian { return newForm(t, 4, Leg("a", Spin(1))).isingX(4) }, "P: Z_2", true, 0},
		{"ising, parity off-diagonal", func(t *testing.T) *Hamiltonian { return newForm(t, 4, Leg("a", Spin(1))).isingZ(4) }, "P: Z_2", true, 1},
		{"ising of spins 1", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Spin(2))).isingZ(3) }, "P: Z_2", true, 1},
		{"heisenberg", func(t *testing.T) *Hamiltonian { return newForm(t, 4, Leg("a", Spin(1))).xyz(4, 1, 1, 1) }, "Sz: U(1)", true, 0},
		{"xxz about x", func(t *testing.T) *Hamiltonian { return newForm(t, 4, Leg("a", Spin(1))).xyz(4, 0.5, 1, 1) }, "Sx: U(1)", true, 1},
		{"xxz about y, spin 3/2", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Spin(3))).xyz(3, 1, 0.5, 1) }, "Sy: U(1)", true, 2},
		{"xyz in a field along y", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Spin(2))).xyz(3, 0.5, 0.8, 1, "y") }, "P: Z_2", true, 2},
		{"xyz in a field in the xy plane", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Spin(1))).xyz(3, 0.5, 0.8, 1, "x", "y") }, "1", true, 1},
		{"clock 3", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Clock(3))).clockChain(3, false) }, "Q: Z_3", true, 1},
		{"clock 3 turned", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Clock(3))).clockChain(3, true) }, "Q: Z_3", true, 0},
		{"clock 4", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Clock(4))).clockChain(3, false) }, "Q: Z_4", true, 1},
		{"clock 2", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Clock(2))).clockChain(3, false) }, "Q: Z_2", true, 1},
		{"pairing chain", func(t *testing.T) *Hamiltonian { return newForm(t, 5, Leg("a", Fermion())).pairing(5) }, "P: Z_2", true, 0},
		{"hubbard", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Electron())).hubbard(3) }, "N: U(1) × Sz: U(1)", true, 0},
		{"no double occupation", func(t *testing.T) *Hamiltonian { return newForm(t, 3, Leg("a", Electron(Double(false)))).hubbard(3) }, "N: U(1) × Sz: U(1)", true, 0},
		{"fermion ladder, pi flux", func(t *testing.T) *Hamiltonian {
			return newForm(t, 3, Leg("a", Fermion()), Leg("b", Fermion())).fluxLadder(3, "c", math.Pi, true)
		}, "N: U(1)", true, 0},
		{"boson ladder, generic flux", func(t *testing.T) *Hamiltonian {
			return newForm(t, 2, Leg("a", Boson(2)), Leg("b", Boson(2))).fluxLadder(2, "b", 0.8*math.Pi, true)
		}, "N: U(1)", false, 0},
		{"one leg turned", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 2, Leg("a", Spin(1)), Leg("b", Spin(1)))
			return f.hamiltonian(f.mul(f.op("S", "z", "a", 0), f.op("S", "z", "a", 1)), f.op("S", "x", "a", 0), f.op("S", "x", "a", 1),
				f.chainTerms("b", 1, "S^+", "S^-"), f.mul(f.op("S", "x", "a", 0), f.op("S", "z", "b", 0)))
		}, "Sz_b: U(1) × P: Z_2", true, 1},
		{"uncoupled legs", func(t *testing.T) *Hamiltonian {
			return newForm(t, 3, Leg("a", Boson(1)), Leg("b", Boson(1))).fluxLadder(3, "b", 0.8, false)
		}, "N: U(1) × N_a: U(1)", true, 0},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			h := c.h(t)
			f, err := h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.Equal(t, c.group, groupOf(f))
			require.Equal(t, c.real, f.Real, f.Loop)
			require.Equal(t, c.turn, f.Sites[0].Rotation)
			require.False(t, f.Missing)
			s, err := f.Strings(h.Poly)
			require.NoError(t, err)
			require.Equal(t, c.real, s.Real)
			require.Equal(t, block.Charge{}, s.Charge)
			requireFrame(t, f, h.Poly)

			data, err := json.Marshal(f)
			require.NoError(t, err)
			var read Frames
			require.NoError(t, json.Unmarshal(data, &read))
			require.Equal(t, f.Sites, read.Sites)
			requireFrame(t, &read, h.Poly)
			require.NoError(t, read.Bind(h))
			_, err = read.Target(nil)
			require.NoError(t, err)

			g, err := h.Frames(FrameOptions{Complex: true})
			require.NoError(t, err)
			require.False(t, g.Real)
			requireFrame(t, g, h.Poly)
		})
	}
}

// Observables pass through the same frames, split by charge, odd ones included.
func TestStringsOfObservables(t *testing.T) {
	spins := newForm(t, 3, Leg("a", Spin(2)))
	fermions := newForm(t, 2, Leg("a", Fermion()), Leg("b", Electron()))
	clocks := newForm(t, 3, Leg("a", Clock(5)))
	bosons := newForm(t, 2, Leg("a", Boson(3)), Leg("b", Fermion()))
	large := newForm(t, 2, Leg("a", Spin(7)))
	mixed := bosons.hamiltonian(hermitian(bosons.mul(bosons.op("b", "+", "a", 0), bosons.op("b", "", "a", 1)).Scale(cmplx.Rect(1, 0.3))),
		hermitian(bosons.mul(bosons.op("c", "+", "b", 0), bosons.op("c", "", "b", 1)).Scale(1i)))
	two := fermions.hamiltonian(hermitian(fermions.mul(fermions.op("c", "+", "a", 0), fermions.op("c", "", "a", 1)).Scale(1i)),
		hermitian(fermions.mul(fermions.op("c_up", "+", "b", 0), fermions.op("c_up", "", "b", 1))))
	tests := []struct {
		name string
		h    *Hamiltonian
		p    *Polynomial
	}{
		{"spin x", spins.isingZ(3), spins.op("S", "x", "a", 1)},
		{"spin y z", spins.isingZ(3), spins.mul(spins.op("S", "y", "a", 0), spins.op("S", "z", "a", 2))},
		{"spin power", spins.isingZ(3), spins.mul(spins.op("S", "+", "a", 0), spins.op("S", "+", "a", 0), spins.op("S", "z", "a", 0), spins.op("S", "z", "a", 1))},
		{"large spin", large.xyz(2, 0.5, 0.8, 1, "x"), large.mul(large.op("S", "+", "a", 0), large.op("S", "z", "a", 0), large.op("S", "x", "a", 0), large.op("S", "z", "a", 1), large.op("S", "-", "a", 1))},
		{"odd fermion", two, fermions.op("c_down", "+", "b", 1)},
		{"fermion pair", two, fermions.mul(fermions.op("c", "", "a", 0), fermions.op("n_up", "", "b", 0), fermions.op("c_up", "+", "b", 1))},
		{"three odd", two, fermions.mul(fermions.op("c", "", "a", 0), fermions.op("c_up", "", "b", 0), fermions.op("c_down", "+", "b", 1))},
		{"current", two, hermitian(fermions.mul(fermions.op("c", "+", "a", 0), fermions.op("c", "", "a", 1)).Scale(1i)).Scale(1i)},
		{"clock", clocks.clockChain(3, false), clocks.mul(clocks.op("Z", "", "a", 0), clocks.op("X", "", "a", 0), clocks.op("Z", "+", "a", 2))},
		{"clock unturned", clocks.clockChain(3, true), clocks.mul(clocks.op("Z", "", "a", 0), clocks.op("X", "", "a", 0), clocks.op("Z", "+", "a", 2))},
		{"boson and odd fermion", mixed, bosons.mul(bosons.op("b", "+", "a", 1), bosons.op("c", "", "b", 1), bosons.op("n", "", "a", 0))},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			f, err := c.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.True(t, f.Real, f.Loop)
			requireFrame(t, f, c.p)
			parts, err := f.StringsByCharge(c.p)
			require.NoError(t, err)
			for _, s := range parts {
				a, b := s.Split()
				require.True(t, a.Real && b.Real)
				ma, mb, m := storedMatrix(a), storedMatrix(b), storedMatrix(s)
				for i := range m {
					for j := range m[i] {
						require.InDelta(t, 0, cmplx.Abs(m[i][j]-ma[i][j]-1i*mb[i][j]), 1e-12)
					}
				}
			}
		})
	}
}

// Random flux ladders with a random gauge: real for zero and pi flux, with the obstruction named otherwise.
func TestGaugeOfRandomLadders(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 1))
	kinds := []struct {
		name        string
		site        Site
		up, down    [2]string
		pair        bool
		twice       bool
		legs, rungs int
	}{
		{"fermions", Fermion(), [2]string{"c", "+"}, [2]string{"c", ""}, true, false, 2, 6},
		{"bosons", Boson(3), [2]string{"b", "+"}, [2]string{"b", ""}, true, true, 3, 5},
		{"spins", Spin(2), [2]string{"S", "+"}, [2]string{"S", "-"}, true, true, 2, 8},
	}
	names := []string{"a", "b", "d"}
	for _, k := range kinds {
		for _, flux := range []string{"zero", "pi", "generic"} {
			t.Run(k.name+", "+flux, func(t *testing.T) {
				var parts []Part
				for _, n := range names[:k.legs] {
					parts = append(parts, Leg(n, k.site))
				}
				f := newForm(t, k.rungs, parts...)
				theta := make([]float64, f.l.Sites())
				for i := range theta {
					theta[i] = rng.Float64() * 2 * math.Pi
				}
				phase := func(leg string, rung int) float64 {
					i, _ := f.l.SiteIndex(leg, rung)
					return theta[i]
				}
				var ps []*Polynomial
				hop := func(la string, ja int, lb string, jb int, phi float64, power int) {
					var fs []*Polynomial
					for range power {
						fs = append(fs, f.op(k.up[0], k.up[1], la, ja))
					}
					for range power {
						fs = append(fs, f.op(k.down[0], k.down[1], lb, jb))
					}
					arg := float64(power)*(phase(la, ja)-phase(lb, jb)) + phi
					ps = append(ps, hermitian(f.mul(fs...).Scale(cmplx.Rect(0.5+rng.Float64(), arg))))
				}
				for l := range k.legs {
					for j := range k.rungs {
						phi := map[string]float64{"zero": 0, "pi": math.Pi * float64(rng.IntN(2)), "generic": 0}[flux]
						if flux == "generic" && l == 0 && j == 3 {
							phi = 0.7
						}
						if j > 0 {
							hop(names[l], j, names[l], j-1, phi, 1)
						}
						if l > 0 {
							hop(names[l], j, names[l-1], j, 0, 1)
						}
						if k.twice && j > 0 {
							hop(names[l], j, names[l], j-1, 0, 2) // pair hopping
						}
						if k.pair && j > 0 && flux != "generic" {
							p := f.mul(f.op(k.up[0], k.up[1], names[l], j-1), f.op(k.up[0], k.up[1], names[l], j))
							ps = append(ps, hermitian(p.Scale(cmplx.Rect(0.3, phase(names[l], j-1)+phase(names[l], j)))))
						}
					}
				}
				h := f.hamiltonian(ps...)
				fr, err := h.Frames(FrameOptions{NoRotation: true})
				require.NoError(t, err)
				if flux == "generic" {
					require.False(t, fr.Real)
					require.Contains(t, fr.Loop, "the loop of 4 terms between rungs 2 and 3")
					require.Contains(t, fr.Loop, "encloses a phase of 0.222817 pi")
					return
				}
				require.True(t, fr.Real, fr.Loop)
				s, err := fr.Strings(h.Poly)
				require.NoError(t, err)
				require.True(t, s.Real)
				require.Len(t, s.Coef, h.Poly.NumTerms())
			})
		}
	}
}

// Random Hamiltonians on mixed ladders, and random observables: the stored form is the user's, seen through the unitary.
func TestFramesOfRandomHamiltonians(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 5))
	sites := []Site{Fermion(), Electron(), Electron(Double(false)), Boson(2), Spin(1), Spin(2), Clock(3), Clock(4)}
	words := map[Kind][][2]string{
		KindFermion: {{"c", ""}, {"c", "+"}, {"n", ""}}, KindElectron: {{"c_up", ""}, {"c_down", "+"}, {"n_up", ""}, {"S", "+"}},
		KindBoson: {{"b", ""}, {"b", "+"}, {"n", ""}}, KindSpin: {{"S", "z"}, {"S", "+"}, {"S", "x"}, {"S", "y"}}, KindClock: {{"Z", ""}, {"X", ""}, {"X", "+"}},
	}
	counts := map[bool]int{}
	for range 60 {
		f := newForm(t, 1+rng.IntN(2), Leg("a", sites[rng.IntN(len(sites))]), Leg("b", sites[rng.IntN(len(sites))]))
		if f.l.Rungs() == 2 && f.l.Site(0).Dim()*f.l.Site(1).Dim() > 9 {
			continue
		}
		draw := func() *Polynomial {
			for {
				p := One(f.l)
				for range 1 + rng.IntN(3) {
					leg := []string{"a", "b"}[rng.IntN(2)]
					site, _ := f.l.LegSite(leg)
					w := words[site.Kind()][rng.IntN(len(words[site.Kind()]))]
					p = f.mul(p, f.op(w[0], w[1], leg, rng.IntN(f.l.Rungs())))
				}
				if _, odd := p.Odd(); !odd && p.NumTerms() > 0 {
					return p
				}
			}
		}
		var ps []*Polynomial
		for range 1 + rng.IntN(4) {
			ps = append(ps, hermitian(draw().Scale(cmplx.Rect(1, rng.Float64()*7))))
		}
		h := f.hamiltonian(ps...)
		fr, err := h.Frames(FrameOptions{})
		require.NoError(t, err)
		counts[fr.Real]++
		s, err := fr.Strings(h.Poly)
		require.NoError(t, err)
		require.Equal(t, fr.Real, s.Real || len(s.Coef) == 0)
		requireFrame(t, fr, h.Poly)
		requireFrame(t, fr, draw())
	}
	require.Greater(t, counts[true], 5)
	require.Greater(t, counts[false], 5)
}
