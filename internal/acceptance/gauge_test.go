package acceptance

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/dmrg"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/observables"
)

// gauged is a two-leg ladder whose couplings are real of either sign up to a random phase for every site and species: through
// every plaquette goes a flux of zero or pi, but hardly a coupling is real as written.
type gauged struct {
	*twice
	rng    *rand.Rand
	angles map[string]float64 // by species and site
	bonds  []gaugedBond       // the hoppings
}

// gaugedBond is a hopping z A B + h.c.; a and b are the operators on the sites x and y.
type gaugedBond struct {
	z    complex128
	a, b string
	x, y int
}

func newGauged(seed uint64, rungs int) *gauged {
	return &gauged{newTwice(2, rungs), rand.New(rand.NewPCG(seed, 0x90)), make(map[string]float64), nil}
}

// angle is the phase that an operator carries: that of its species and site, or minus that, or none.
func (g *gauged) angle(op string, site int) float64 {
	if diagonal(op) {
		return 0
	}
	species, raises := strings.CutSuffix(op, "^+")
	species = strings.TrimSuffix(species, "^-")
	key := fmt.Sprint(species, site)
	if _, ok := g.angles[key]; !ok {
		g.angles[key] = 2 * math.Pi * g.rng.Float64()
	}
	if raises {
		return g.angles[key]
	}
	return -g.angles[key]
}

// draw adds a term of about the given size, random sign and the phases of its operators, and returns the coupling.
func (g *gauged) draw(size float64, ops ...any) complex128 {
	x := size * (0.5 + 0.5*g.rng.Float64()) * float64(1-2*g.rng.IntN(2))
	phase := 0.0
	for k := 0; k < len(ops); k += 2 {
		phase += g.angle(ops[k].(string), ops[k+1].(int))
	}
	z := complex(x, 0) * cmplx.Exp(complex(0, phase))
	g.add(z, ops...)
	return z
}

func (g *gauged) hop(size float64, a string, x int, b string, y int) {
	g.bonds = append(g.bonds, gaugedBond{g.draw(size, a, x, b, y), a, b, x, y})
}

// links calls do for the pairs of neighbours of the open ladder, legs, rungs and one diagonal a plaquette.
func (g *gauged) links(do func(x, y int)) {
	for x := range 2 * g.rungs {
		if x%2 == 0 {
			do(x, x+1)
		}
		if x+2 < 2*g.rungs {
			do(x, x+2)
		}
		if x%2 == 0 && x+3 < 2*g.rungs {
			do(x, x+3)
		}
	}
}

// gaugedKind is a kind of site with its terms; the sector is given as Rundle and as the oracle want it.
type gaugedKind struct {
	name   string
	rungs  int
	site   ladder.Site
	exact  exact.Site
	fill   func(g *gauged)
	sector ladder.Sector
	number func(sites []exact.Site) ([]exact.Number, []int)
	pair   [2]string // a two-point function with a phase
}

func gaugedKinds() []gaugedKind {
	parity := func(sites []exact.Site) exact.Number { return exact.Particles(sites).Modulo(2) }
	turned := func(sites []exact.Site) exact.Number { // spins below the top
		return exact.NewNumber("P", 2, sites, func(_ int, _ exact.Site, state int) int { return state })
	}
	fermions := func(pairing bool) func(g *gauged) {
		return func(g *gauged) {
			g.links(func(x, y int) {
				g.hop(1, "c^+", x, "c", y)
				g.draw(0.7, "n", x, "n", y)
				if pairing && y == x+2 {
					g.draw(0.6, "c^+", x, "c^+", y)
				}
			})
			for x := range 2 * g.rungs {
				g.draw(0.5, "n", x)
			}
		}
	}
	spins := func(pairing bool) func(g *gauged) {
		return func(g *gauged) {
			g.links(func(x, y int) {
				g.hop(1, "S^+", x, "S^-", y)
				g.draw(0.7, "S^z", x, "S^z", y)
				if pairing {
					g.draw(0.4, "S^+", x, "S^+", y)
				}
			})
			for x := range 2 * g.rungs {
				g.draw(0.5, "S^z", x)
			}
		}
	}
	return []gaugedKind{
		{"fermions", 5, ladder.Fermion(), exact.Fermion(), fermions(false), ladder.Sector{"N": 4}, oneNumber(particles, 4), [2]string{"c^+", "c"}},
		{"paired fermions", 4, ladder.Fermion(), exact.Fermion(), fermions(true), ladder.Sector{"P": 1}, oneNumber(parity, 1), [2]string{"c^+", "c"}},
		{"paired electrons", 2, ladder.Electron(), exact.Electron(true), func(g *gauged) {
			g.links(func(x, y int) {
				g.hop(1, "c_up^+", x, "c_up", y)
				g.hop(0.8, "c_down^+", x, "c_down", y)
				g.draw(0.5, "c_up^+", x, "c_down^+", y)
				g.draw(0.5, "n_up", x, "n_down", y)
			})
			for x := range 2 * g.rungs {
				g.draw(0.6, "c_up^+", x, "c_down^+", x)
				g.draw(1, "n_up", x, "n_down", x)
			}
		}, ladder.Sector{"Sz": "1/2"}, oneNumber(exact.TwiceSz, 1), [2]string{"c_up^+", "c_up"}},
		{"bosons with pair hopping", 3, ladder.Boson(2), exact.Boson(2), func(g *gauged) {
			g.links(func(x, y int) {
				g.hop(1, "b^+", x, "b", y)
				g.draw(0.5, "b^+", x, "b^+", x, "b", y, "b", y)
				g.draw(0.7, "n", x, "n", y)
			})
			for x := range 2 * g.rungs {
				g.draw(0.8, "n", x, "n", x)
			}
			g.draw(0.6, "b^+", 0, "b^+", 1, "b", 3, "b", 2)
		}, ladder.Sector{"N": 5}, oneNumber(particles, 5), [2]string{"b^+", "b"}},
		{"spins one-half", 5, ladder.Spin(1), exact.Spin(1), spins(false), ladder.Sector{"Sz": 1}, oneNumber(exact.TwiceSz, 2), [2]string{"S^+", "S^-"}},
		{"spins one-half with pair terms", 4, ladder.Spin(1), exact.Spin(1), spins(true), ladder.Sector{"P": 0}, oneNumber(turned, 0), [2]string{"S^+", "S^-"}},
		{"spins one", 3, ladder.Spin(2), exact.Spin(2), spins(false), ladder.Sector{"Sz": 0}, oneNumber(exact.TwiceSz, 0), [2]string{"S^+", "S^-"}},
	}
}

// TestRealGauge: ladders of zero and pi flux run in real arithmetic whatever the phases of their couplings, and give what complex
// arithmetic and exact diagonalization give, in the user's own gauge.
func TestRealGauge(t *testing.T) {
	for _, k := range gaugedKinds() {
		for seed := range uint64(2) {
			t.Run(fmt.Sprintf("%s/seed=%d", k.name, seed), func(t *testing.T) {
				for try := seed; ; try += 2 {
					require.Less(t, try, uint64(20), "no seed with a gap")
					g := newGauged(try, k.rungs)
					k.fill(g)
					if b, ground, gap := g.ground(t, k.exact, k.number); gap > 1e-3 {
						k.compare(t, g, b, ground)
						return
					}
				}
			})
		}
	}
}

func (k gaugedKind) compare(t *testing.T, g *gauged, b *exact.Basis, ground exact.Level) {
	h := g.hamiltonian(t, k.site)
	w := wish{relative: 1e-10, want: ground.Energy, largest: g.top, observables: observableWish}
	fast := requireGround(t, h, k.sector, w)
	require.True(t, fast.State.Frames().Real)
	_, ok := fast.State.Real()
	require.True(t, ok, "runs in real arithmetic")
	w.options.Complex = true
	slow := requireGround(t, h, k.sector, w)
	_, ok = slow.State.Complex()
	require.True(t, ok)
	require.InDelta(t, slow.Energy, fast.Energy, 1e-10*max(g.top, math.Abs(ground.Energy)))

	g.requireCurrents(t, b, ground.Vector, fast)
	g.requireCurrents(t, b, ground.Vector, slow)
	k.requirePhases(t, b, ground.Vector, fast)
	k.requirePhases(t, b, ground.Vector, slow)
}

// requireCurrents compares the current of every hopping, which vanishes without a flux other than zero and pi, and that of the
// hopping turned by an eighth of a circle, which does not.
func (g *gauged) requireCurrents(t *testing.T, b *exact.Basis, psi []complex128, res *dmrg.Result) {
	t.Helper()
	largest := 0.0
	for _, bond := range g.bonds {
		for _, turn := range []float64{0, math.Pi / 4} {
			z := bond.z * cmplx.Exp(complex(0, turn))
			v := values(t, res, fmt.Sprintf("i*(%s %s%s %s%s - h.c.)", formulaOf(z), bond.a, g.at(bond.x), bond.b, g.at(bond.y)), nil)
			require.Len(t, v, 1)
			require.Zero(t, imag(v[0]))
			half := exact.T(1i*z, bond.a, bond.x, bond.b, bond.y)
			want := real(b.Expect(psi, exact.WithAdjoints(half)...))
			require.InDelta(t, want, real(v[0]), everythingElse, "current from %s to %s", g.at(bond.y), g.at(bond.x))
			if turn == 0 {
				require.InDelta(t, 0, real(v[0]), everythingElse)
			}
			largest = max(largest, math.Abs(real(v[0])))
		}
	}
	require.Greater(t, largest, 0.05, "currents that tell something")
}

// requirePhases compares a complex two-point function, modulus and phase.
func (k gaugedKind) requirePhases(t *testing.T, b *exact.Basis, psi []complex128, res *dmrg.Result) {
	t.Helper()
	want := b.TwoPoint(psi, k.pair[0], k.pair[1])
	each := ladder.Each{"l": "legs"}
	p, err := observables.AllPairs(context.Background(), res.State,
		ladder.Term{Formula: k.pair[0] + "[l,j]", Each: each}, ladder.Term{Formula: k.pair[1] + "[l,j]", Each: each})
	require.NoError(t, err)
	lad := res.State.Scope().Ladder()
	largest := 0.0
	for x, row := range p.Values {
		for y, got := range row {
			i, j := siteOf(t, lad, p.AtFirst[x]), siteOf(t, lad, p.AtSecond[y])
			require.InDelta(t, 0, cmplx.Abs(got-want[i][j]), everythingElse, "<%s_%d %s_%d>", k.pair[0], i, k.pair[1], j)
			largest = max(largest, math.Abs(imag(got)))
		}
	}
	require.Greater(t, largest, 0.05, "phases that tell something")
}

// TestFluxNamesItsLoop: one plaquette with a flux of its own keeps the ladder complex, and is named.
func TestFluxNamesItsLoop(t *testing.T) {
	for _, k := range gaugedKinds() {
		if k.rungs < 3 {
			continue
		}
		t.Run(k.name, func(t *testing.T) {
			g := newGauged(7, k.rungs)
			k.fill(g)
			frames, err := g.hamiltonian(t, k.site).Frames(ladder.FrameOptions{})
			require.NoError(t, err)
			require.True(t, frames.Real, frames.Loop)
			require.Empty(t, frames.Loop)

			// The first rung closes a loop with the diagonal beside it and no other rung. Its hopping stands first of all.
			phase := cmplx.Exp(0.7i)
			first := g.bonds[0]
			g.terms[0].Formula = fmt.Sprintf("%s %s%s %s%s + h.c.", formulaOf(first.z*phase), first.a, g.at(first.x), first.b, g.at(first.y))
			h := g.hamiltonian(t, k.site)
			frames, err = h.Frames(ladder.FrameOptions{})
			require.NoError(t, err)
			require.False(t, frames.Real)
			t.Log(frames.Loop)
			require.Contains(t, frames.Loop, "[a,0]")
			require.Contains(t, frames.Loop, "[b,0]")
			// Up to multiples of pi and the direction.
			require.Regexp(t, fmt.Sprintf("encloses a phase of (%.6g|%.6g) pi", 0.7/math.Pi, 1-0.7/math.Pi), frames.Loop)

			g.exact[0].Coef *= phase
			g.exact[1].Coef *= cmplx.Conj(phase)
			_, ground, _ := g.ground(t, k.exact, k.number)
			res := requireGround(t, h, k.sector, wish{relative: 1e-10, want: ground.Energy, largest: g.top})
			_, ok := res.State.Complex()
			require.True(t, ok, "runs in complex arithmetic")
		})
	}
}
