package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"
	"time"

	"github.com/stretchr/testify/require"
)

// chainTerms adds like terms along a chain: each is a list of operators "b^+" with rung offsets.
func (f form) chainTerms(leg string, coef complex128, ops ...string) *Polynomial {
	b := Zero(f.l)
	for j := range f.l.Rungs() {
		fs := []*Polynomial{}
		fits := true
		for k, text := range ops {
			at := 0
			name, shift, ok := strings.Cut(text, "@")
			if ok {
				fmt.Sscan(shift, &at)
			} else {
				at = k
			}
			if j+at >= f.l.Rungs() {
				fits = false
				break
			}
			base, super, _ := strings.Cut(name, "^")
			fs = append(fs, f.op(base, super, leg, j+at))
		}
		if fits {
			b = b.Add(hermitian(f.mul(fs...).Scale(coef)))
		}
	}
	return b
}

func TestChargesFound(t *testing.T) {
	tests := []struct {
		name    string
		h       func(t *testing.T) *Hamiltonian
		group   string
		missing bool
		others  []string // conserved names beyond the group
	}{
		{"pairs of bosons from one", func(t *testing.T) *Hamiltonian { // b_0^2 <-> b_1: N_a + 2 N_b
			f := newForm(t, 1, Leg("a", Boson(4)), Leg("b", Boson(2)))
			return f.hamiltonian(hermitian(f.mul(f.op("b", "+", "a", 0), f.op("b", "+", "a", 0), f.op("b", "", "b", 0))))
		}, "charge 1: U(1)", false, []string{"P_a"}},
		{"three bosons at once", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 2, Leg("a", Boson(3)))
			h := f.mul(f.op("b", "+", "a", 0), f.op("b", "+", "a", 0), f.op("b", "+", "a", 0))
			return f.hamiltonian(hermitian(h), hermitian(f.mul(f.op("b", "+", "a", 0), f.op("b", "", "a", 1))))
		}, "charge 1: Z_3", false, nil},
		{"dipole moment", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 6, Leg("a", Boson(2)))
			return f.hamiltonian(f.chainTerms("a", 1, "b^+@0", "b@1", "b@1", "b^+@2"))
		}, "N: U(1) × charge 1: U(1)", false, []string{"N_a", "P", "P_a"}},
		{"pairs hop", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 3, Leg("a", Boson(2)))
			return f.hamiltonian(f.chainTerms("a", 1, "b^+@0", "b^+@0", "b@1", "b@1"))
		}, "N: U(1) × charge 1: Z_2 × charge 2: Z_2", false, []string{"N_a", "P", "P_a"}},
		{"spins and particles", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 3, Leg("a", Spin(1)), Leg("b", Fermion()))
			return f.hamiltonian(f.chainTerms("a", 1, "S^+", "S^-"), f.chainTerms("b", 1, "c^+", "c"))
		}, "N: U(1) × Sz: U(1)", false, []string{"N_b", "Sz_a", "P", "P_a", "P_b"}},
		{"electrons on two uncoupled legs", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 3, Leg("a", Electron()), Leg("b", Electron()))
			var ps []*Polynomial
			for _, l := range []string{"a", "b"} {
				ps = append(ps, f.chainTerms(l, 1, "c_up^+", "c_up"), f.chainTerms(l, 1, "c_down^+", "c_down"))
			}
			return f.hamiltonian(ps...)
		}, "N: U(1) × Sz: U(1) × N_a: U(1) × Sz_a: U(1)", false, []string{"N_b", "Sz_b", "N up", "N down"}},
		{"spin flips only", func(t *testing.T) *Hamiltonian { // up goes to down: N, no Sz
			f := newForm(t, 3, Leg("a", Electron()))
			return f.hamiltonian(f.chainTerms("a", 1, "c_up^+@0", "c_down@0"), f.chainTerms("a", 1, "c_down^+", "c_down"))
		}, "N: U(1)", false, []string{"N_a", "P"}},
		{"mixed clocks", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 2, Leg("a", Clock(4)), Leg("b", Clock(6)))
			return f.hamiltonian(f.chainTerms("a", 1, "X", "X^+"), f.chainTerms("b", 1, "X", "X^+"))
		}, "Q_a: Z_4 × Q_b: Z_6", false, []string{"Q"}},
		{"five uncoupled legs", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 3, Leg("a", Boson(1)), Leg("d", Boson(2)), Leg("e", Boson(3)), Leg("f", Boson(4)), Leg("g", Boson(5)))
			var ps []*Polynomial
			for _, l := range f.l.Legs() {
				ps = append(ps, f.chainTerms(l, 1, "b^+", "b"))
			}
			return f.hamiltonian(ps...)
		}, "N: U(1) × N_e: U(1) × N_f: U(1) × N_g: U(1)", true, []string{"N_a", "N_d"}},
		{"nothing", func(t *testing.T) *Hamiltonian {
			f := newForm(t, 2, Leg("a", Boson(2)))
			return f.hamiltonian(f.chainTerms("a", 1, "b"))
		}, "1", false, nil},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			h := c.h(t)
			f, err := h.Frames(FrameOptions{NoRotation: true})
			require.NoError(t, err)
			require.Equal(t, c.group, f.Group.String())
			require.Equal(t, c.missing, f.Missing)
			for _, n := range c.others {
				require.Contains(t, namesOf(f.others), n)
			}
			requireFrameIfSmall(t, f, h)
		})
	}
}

func requireFrameIfSmall(t *testing.T, f *Frames, h *Hamiltonian) {
	n := 1
	for i := range h.Poly.Ladder().Sites() {
		if n *= h.Poly.Ladder().Site(i).Dim(); n > 300 {
			return
		}
	}
	requireFrame(t, f, h.Poly)
}

func TestDipoleIsNamedByItsWeights(t *testing.T) {
	f := newForm(t, 5, Leg("a", Boson(2)))
	h := f.hamiltonian(f.chainTerms("a", 1, "b^+@0", "b@1", "b@1", "b^+@2"))
	fr, err := h.Frames(FrameOptions{})
	require.NoError(t, err)
	c := fr.charges[1]
	for v := 2; v < 5; v++ {
		require.Equal(t, c.weight[1]-c.weight[0], c.weight[v]-c.weight[v-1], "weights are linear in the rung")
	}
	require.Contains(t, fr.Charges[1].Description, "n[a,")
}

func TestChargesAsked(t *testing.T) {
	f := newForm(t, 3, Leg("a", Boson(2)), Leg("b", Boson(2)))
	h := f.fluxLadder(3, "b", 0.4, false)
	h.Terms = []Term{{Name: "all", Formula: "x"}}
	tests := []struct {
		name, group, err string
		ask              []string
	}{
		{"per leg", "N_a: U(1) × N_b: U(1)", "", []string{"N_a", "N_b"}},
		{"one", "N_b: U(1)", "", []string{"N_b"}},
		{"parity", "P: Z_2", "", []string{"P"}},
		{"none", "1", "", []string{}},
		{"unknown", "", `charge "Sz" cannot be used: this ladder has no charge "Sz" (conserved: N, N_a`, []string{"Sz"}},
		{"follows", "", "it follows from the charges named before it", []string{"N_a", "N_b", "N"}},
		{"twice", "", "named twice", []string{"N", "N"}},
		{"five", "", "at most 4", []string{"N", "N_a", "N_b", "P", "P_a"}},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			fr, err := h.Frames(FrameOptions{Charges: c.ask})
			if c.err != "" {
				require.ErrorContains(t, err, c.err)
				return
			}
			require.NoError(t, err)
			require.Equal(t, c.group, fr.Group.String())
			require.Equal(t, c.name == "one" || c.name == "parity" || c.name == "none", fr.Missing)
		})
	}
}

// Terms that move nothing leave 512 conserved occupations: four are chosen, quickly.
func TestChargesOfADiagonalHamiltonian(t *testing.T) {
	for _, site := range []Site{Boson(3), Spin(1), Clock(3), Electron()} {
		t.Run(site.String(), func(t *testing.T) {
			f := newForm(t, 256, Leg("a", site), Leg("b", site))
			b := NewBuilder(f.l)
			n := f.op(map[Kind]string{KindBoson: "n", KindSpin: "S", KindClock: "Z", KindElectron: "n_up"}[site.Kind()], map[Kind]string{KindSpin: "z"}[site.Kind()], "a", 0)
			_, factor := n.Term(0)
			for i := range f.l.Sites() {
				p := Local(f.l, i, factor[0].Op)
				b.AddPolynomial(1, hermitian(p))
			}
			start := time.Now()
			fr, err := f.hamiltonian(b.Polynomial()).Frames(FrameOptions{})
			require.NoError(t, err)
			require.LessOrEqual(t, fr.Group.Len(), 4)
			require.GreaterOrEqual(t, fr.Group.Len(), 3)
			require.True(t, fr.Missing)
			require.Less(t, time.Since(start), 5*time.Second, "expected well below a second")
			t.Log(fr.Group, time.Since(start))
		})
	}
}

func TestObstructionsAreNamed(t *testing.T) {
	ring := newForm(t, 3, Leg("a", Fermion()))
	chain := newForm(t, 4, Leg("a", Boson(2)))
	tests := []struct {
		name string
		h    *Hamiltonian
		want []string
	}{
		{"ring of three", ring.hamiltonian(
			hermitian(ring.mul(ring.op("c", "+", "a", 0), ring.op("c", "", "a", 1)).Scale(cmplx.Rect(1, 0.1*math.Pi))),
			hermitian(ring.mul(ring.op("c", "+", "a", 1), ring.op("c", "", "a", 2)).Scale(cmplx.Rect(1, 0.1*math.Pi))),
			hermitian(ring.mul(ring.op("c", "+", "a", 2), ring.op("c", "", "a", 0)).Scale(cmplx.Rect(1, 0.1*math.Pi)))),
			[]string{"the loop of 3 terms between rungs 0 and 2", "a phase of 0.3 pi", "c[a,0] c^+[a,1] (phase 0.9 pi)"}},
		{"hopping and pairing", ring.hamiltonian(
			hermitian(ring.mul(ring.op("c", "+", "a", 0), ring.op("c", "", "a", 1)).Scale(cmplx.Rect(1, 0.1*math.Pi))),
			hermitian(ring.mul(ring.op("c", "+", "a", 1), ring.op("c", "", "a", 2))),
			hermitian(ring.mul(ring.op("c", "+", "a", 0), ring.op("c", "+", "a", 1))),
			hermitian(ring.mul(ring.op("c", "+", "a", 1), ring.op("c", "+", "a", 2)))),
			[]string{"the loop of 4 terms", "rung"}},
		{"two ways of one move", chain.hamiltonian(
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1))),
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1), chain.op("n", "", "a", 2)).Scale(cmplx.Rect(1, 0.2*math.Pi)))),
			[]string{"move the same charges with phases that differ by 0.2 pi"}},
		{"pair hopping against hopping", chain.hamiltonian(
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1))),
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1), chain.op("b", "", "a", 1)).Scale(cmplx.Rect(1, 0.2*math.Pi)))),
			[]string{"the loop of 2 terms between rungs 0 and 1", "0.2 pi"}},
		{"ring exchange", chain.hamiltonian(
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1), chain.op("b", "+", "a", 2), chain.op("b", "", "a", 3)).Scale(cmplx.Rect(1, 0.2*math.Pi))),
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1))),
			hermitian(chain.mul(chain.op("b", "+", "a", 2), chain.op("b", "", "a", 3)))),
			[]string{"the loop of 3 terms between rungs 0 and 3", "0.2 pi"}},
		{"single bosons", chain.hamiltonian(hermitian(chain.op("b", "+", "a", 0)), hermitian(chain.op("b", "+", "a", 1).Scale(1i)),
			hermitian(chain.mul(chain.op("b", "+", "a", 0), chain.op("b", "", "a", 1)))),
			[]string{"the loop of 3 terms", "0.5 pi"}},
	}
	for _, c := range tests {
		t.Run(c.name, func(t *testing.T) {
			f, err := c.h.Frames(FrameOptions{})
			require.NoError(t, err)
			require.False(t, f.Real)
			for _, w := range c.want {
				require.Contains(t, f.Loop, w)
			}
		})
	}
}

// Clocks turn by multiples of 2 pi/q only.
func TestGaugeOfClocks(t *testing.T) {
	for _, q := range []int{2, 3, 4, 5, 6} {
		f := newForm(t, 3, Leg("a", Clock(q)))
		for k := range 2 * q {
			phi := math.Pi * float64(k) / float64(q)
			h := f.hamiltonian(hermitian(f.mul(f.op("X", "", "a", 0), f.op("X", "+", "a", 1)).Scale(cmplx.Rect(1, phi))),
				hermitian(f.mul(f.op("X", "", "a", 1), f.op("X", "+", "a", 2))), hermitian(f.mul(f.op("Z", "", "a", 0), f.op("Z", "+", "a", 2)).Scale(1)))
			fr, err := h.Frames(FrameOptions{NoRotation: true})
			require.NoError(t, err)
			want := q%2 == 1 || k%2 == 0 || q == 2 // q = 2: an imaginary X X^+ cancels with its conjugate
			require.Equal(t, want, fr.Real, "q=%d phase %d pi/q: %s", q, k, fr.Loop)
			requireFrame(t, fr, h.Poly)
		}
	}
}
