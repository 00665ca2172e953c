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
	"rundle/entanglement"
	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/observables"
)

// cell is a random ladder under construction: the same terms as formulas for Rundle and as operator lists for the oracle.
type cell struct {
	rng      *rand.Rand
	rungs    int
	legs     []string
	ring     bool // periodic along the legs
	tube     bool // periodic across
	formulas []ladder.Term
	terms    []exact.Term
	largest  float64
}

func (c *cell) site(leg, rung int) int { return rung*len(c.legs) + leg }

// number draws a coupling of size 0.2..1 with a sign, complex or real, with its spelling in a formula.
func (c *cell) number(complexes bool) (complex128, string) {
	draw := func() float64 {
		x := (0.2 + 0.8*c.rng.Float64()) * float64(1-2*c.rng.IntN(2))
		return math.Round(x*1e4) / 1e4
	}
	if !complexes {
		x := draw()
		c.largest = max(c.largest, math.Abs(x))
		return complex(x, 0), fmt.Sprintf("(%v)", x)
	}
	z := complex(draw(), draw())
	c.largest = max(c.largest, cmplx.Abs(z))
	return z, fmt.Sprintf("(%v + i*(%v))", real(z), imag(z))
}

// link is a pair of sites (leg, shift of the rung) on which a term stands for every rung.
type link struct{ legA, legB, shift int }

// links lists the neighbours: along the legs, across the rungs, and one diagonal.
func (c *cell) links() []link {
	var out []link
	for l := range c.legs {
		out = append(out, link{l, l, 1})
	}
	for l := 0; l+1 < len(c.legs); l++ {
		out = append(out, link{l, l + 1, 0})
	}
	if c.tube && len(c.legs) > 2 {
		out = append(out, link{len(c.legs) - 1, 0, 0})
	}
	if len(c.legs) > 1 {
		out = append(out, link{0, 1, 1})
	}
	return out
}

// places calls do for every rung where the link exists.
func (c *cell) places(k link, do func(a, b int)) {
	for j := 0; j < c.rungs; j++ {
		to := j + k.shift
		if to >= c.rungs {
			if !c.ring {
				continue
			}
			to -= c.rungs
		}
		do(c.site(k.legA, j), c.site(k.legB, to))
	}
}

func (k link) rung() string {
	if k.shift == 0 {
		return "j"
	}
	return fmt.Sprintf("j+%d", k.shift)
}

// onLink adds coef × (product) [+ h.c.] on every place of a link; in the pattern, A and B stand for the two sites, and the oracle
// gets the operators (name, 0 or 1 for the site) in the same order.
func (c *cell) onLink(k link, complexes, conjugate bool, pattern string, ops ...any) {
	z, text := c.number(complexes)
	f := strings.NewReplacer("A", c.legs[k.legA]+",j", "B", c.legs[k.legB]+","+k.rung()).Replace(pattern)
	f = text + " " + f
	if conjugate {
		f += " + h.c."
	}
	c.formulas = append(c.formulas, ladder.Term{Formula: f})
	c.places(k, func(a, b int) {
		args := make([]any, len(ops))
		for i, o := range ops {
			if at, ok := o.(int); ok {
				o = [2]int{a, b}[at]
			}
			args[i] = o
		}
		t := exact.T(z, args...)
		if conjugate {
			c.terms = append(c.terms, exact.WithAdjoints(t)...)
		} else {
			c.terms = append(c.terms, t)
		}
	})
}

// onSite adds a different real number times an operator on every site.
func (c *cell) onSite(op string) {
	for j := 0; j < c.rungs; j++ {
		for l, name := range c.legs {
			z, text := c.number(false)
			c.formulas = append(c.formulas, ladder.Term{Formula: fmt.Sprintf("%s %s[%s,%d]", text, op, name, j)})
			c.terms = append(c.terms, exact.T(z, op, c.site(l, j)))
		}
	}
}

// kind is a kind of site with its terms, its sector and what is measured.
type kind struct {
	name   string
	leg    func(name string) ladder.Part
	site   exact.Site
	fill   func(c *cell)
	sector func(c *cell, sites []exact.Site) (ladder.Sector, []exact.Number, []int)
	local  []string    // one-site operators
	pairs  [][2]string // two-point functions
	sizes  [][2]int    // legs, rungs
}

func kinds() []kind {
	number := func(fill func(sites int) int) func(*cell, []exact.Site) (ladder.Sector, []exact.Number, []int) {
		return func(c *cell, sites []exact.Site) (ladder.Sector, []exact.Number, []int) {
			n := fill(len(sites))
			return ladder.Sector{"N": n}, []exact.Number{exact.Particles(sites)}, []int{n}
		}
	}
	spin := func(c *cell, sites []exact.Site) (ladder.Sector, []exact.Number, []int) {
		return ladder.Sector{"Sz": 0}, []exact.Number{exact.TwiceSz(sites)}, []int{0}
	}
	spins := func(c *cell) {
		for _, k := range c.links() {
			c.onLink(k, true, true, "S^+[A] S^-[B]", "S^+", 0, "S^-", 1)
			c.onLink(k, false, false, "S^z[A] S^z[B]", "S^z", 0, "S^z", 1)
		}
		c.onSite("S^z")
	}
	return []kind{
		{
			name: "fermion", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Fermion()) }, site: exact.Fermion(),
			fill: func(c *cell) {
				for _, k := range c.links() {
					c.onLink(k, true, true, "c^+[A] c[B]", "c^+", 0, "c", 1)
					c.onLink(k, false, false, "n[A] n[B]", "n", 0, "n", 1)
				}
				c.pairHopping("c")
				c.onSite("n")
			},
			sector: number(func(s int) int { return s / 2 }),
			local:  []string{"n"}, pairs: [][2]string{{"c^+", "c"}, {"n", "n"}},
			sizes: [][2]int{{2, 5}, {3, 4}, {2, 6}},
		},
		{
			name: "electron", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Electron()) }, site: exact.Electron(true),
			fill: func(c *cell) {
				for _, k := range c.links() {
					c.onLink(k, true, true, "c_up^+[A] c_up[B]", "c_up^+", 0, "c_up", 1)
					c.onLink(k, true, true, "c_down^+[A] c_down[B]", "c_down^+", 0, "c_down", 1)
					c.onLink(k, false, false, "n_up[A] n_down[B]", "n_up", 0, "n_down", 1)
				}
				c.onSite("n_up")
				c.onSite("n_down")
			},
			sector: func(c *cell, sites []exact.Site) (ladder.Sector, []exact.Number, []int) {
				up, down := len(sites)/2, len(sites)/2-1
				return ladder.Sector{"N": up + down, "Sz": "1/2"}, []exact.Number{exact.UpParticles(sites), exact.DownParticles(sites)}, []int{up, down}
			},
			local: []string{"n_up", "n_down"}, pairs: [][2]string{{"c_up^+", "c_up"}, {"n_up", "n_down"}},
			sizes: [][2]int{{2, 3}, {3, 2}},
		},
		{
			name: "boson", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Boson(2)) }, site: exact.Boson(2),
			fill: func(c *cell) {
				for _, k := range c.links() {
					c.onLink(k, true, true, "b^+[A] b[B]", "b^+", 0, "b", 1)
					c.onLink(k, false, false, "n[A] n[B]", "n", 0, "n", 1)
				}
				c.onLink(c.links()[0], true, true, "b^+[A]^2 b[B]^2", "b^+", 0, "b^+", 0, "b", 1, "b", 1)
				c.pairHopping("b")
				c.onSite("n")
			},
			sector: number(func(s int) int { return s - 1 }),
			local:  []string{"n"}, pairs: [][2]string{{"b^+", "b"}, {"n", "n"}, {"b", "b^+"}},
			sizes: [][2]int{{2, 3}, {3, 3}, {2, 4}},
		},
		{
			name: "spin one-half", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Spin(1)) }, site: exact.Spin(1),
			fill: spins, sector: spin, local: []string{"S^z"}, pairs: [][2]string{{"S^+", "S^-"}, {"S^z", "S^z"}},
			sizes: [][2]int{{2, 6}, {3, 4}},
		},
		{
			name: "spin one", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Spin(2)) }, site: exact.Spin(2),
			fill: spins, sector: spin, local: []string{"S^z"}, pairs: [][2]string{{"S^+", "S^-"}, {"S^z", "S^z"}},
			sizes: [][2]int{{2, 4}, {3, 2}},
		},
		{
			name: "clock", leg: func(n string) ladder.Part { return ladder.Leg(n, ladder.Clock(3)) }, site: exact.Clock(3),
			fill: func(c *cell) {
				for _, k := range c.links() {
					c.onLink(k, true, true, "X^+[A] X[B]", "X^+", 0, "X", 1)
					c.onLink(k, true, true, "Z^+[A] Z[B]", "Z^+", 0, "Z", 1)
				}
				for j := 0; j < c.rungs; j++ {
					for l, name := range c.legs {
						z, text := c.number(true)
						c.formulas = append(c.formulas, ladder.Term{Formula: fmt.Sprintf("%s Z[%s,%d] + h.c.", text, name, j)})
						c.terms = append(c.terms, exact.WithAdjoints(exact.T(z, "Z", c.site(l, j)))...)
					}
				}
			},
			sector: func(c *cell, sites []exact.Site) (ladder.Sector, []exact.Number, []int) {
				return ladder.Sector{"Q": 1}, []exact.Number{exact.ClockCharge(sites, 3)}, []int{1}
			},
			local: []string{"Z"}, pairs: [][2]string{{"X^+", "X"}, {"Z^+", "Z"}},
			sizes: [][2]int{{2, 3}, {3, 2}, {2, 4}},
		},
	}
}

// pairHopping moves two particles from one rung to the next.
func (c *cell) pairHopping(op string) {
	if len(c.legs) < 2 {
		return
	}
	z, text := c.number(true)
	a, b := c.legs[0], c.legs[1]
	f := fmt.Sprintf("%s %s^+[%s,j+1] %s^+[%s,j+1] %s[%s,j] %s[%s,j] + h.c.", text, op, a, op, b, op, b, op, a)
	c.formulas = append(c.formulas, ladder.Term{Formula: f})
	c.places(link{0, 0, 1}, func(from, to int) {
		t := exact.T(z, op+"^+", to, op+"^+", to+1, op, from+1, op, from)
		c.terms = append(c.terms, exact.WithAdjoints(t)...)
	})
}

// TestRandomLadders compares random interacting ladders of every kind of site with exact diagonalization: energy to 1e-10 of
// max(|E|, largest coupling), all local values, all two-point functions and the entropies of all cuts to 1e-8.
func TestRandomLadders(t *testing.T) {
	cases, redrawn := 0, 0
	for _, k := range kinds() {
		for i, size := range k.sizes {
			for b, boundary := range []string{"open", "ring", "tube"} {
				if size[1] < 3 && boundary != "open" {
					continue // two rungs have no ring of their own
				}
				name := fmt.Sprintf("%s/%dx%d/%s", k.name, size[0], size[1], boundary)
				cases++
				t.Run(name, func(t *testing.T) {
					for seed := uint64(0); ; seed++ {
						c := &cell{rng: rand.New(rand.NewPCG(seed, uint64(100*i+b))), rungs: size[1], legs: []string{"a", "b", "d"}[:size[0]],
							ring: boundary != "open", tube: boundary == "tube"}
						if compare(t, k, c) {
							return
						}
						redrawn++
						require.Less(t, seed, uint64(20), "no seed with a gap")
					}
				})
			}
		}
	}
	require.GreaterOrEqual(t, cases, 30)
	t.Logf("%d cases, %d seeds redrawn for a gap below 1e-3", cases, redrawn)
}

// compare runs one case; false asks for another seed.
func compare(t *testing.T, k kind, c *cell) bool {
	k.fill(c)
	var sites []exact.Site
	for range c.rungs * len(c.legs) {
		sites = append(sites, k.site)
	}
	sector, numbers, values := k.sector(c, sites)
	basis, err := exact.NewBasis(sites, numbers, values)
	require.NoError(t, err)
	require.LessOrEqual(t, basis.Dim(), 5000)
	m, err := basis.Matrix(c.terms...)
	require.NoError(t, err)
	ground, gap, err := m.Ground()
	require.NoError(t, err)
	if gap < 1e-3 {
		return false
	}
	lad, h := c.hamiltonian(t, k)
	res, err := dmrg.Ground(context.Background(), h, sector, dmrg.Options{Precision: 1e-11, ObservablePrecision: 1e-9})
	require.NoError(t, err)
	require.Equal(t, dmrg.Converged, res.Verdict, res.Reason)

	scale := max(math.Abs(ground.Energy), c.largest)
	require.InDelta(t, ground.Energy, res.Energy, 1e-10*scale)
	require.LessOrEqual(t, math.Abs(res.EnergyLimit-ground.Energy), res.EnergyError+1e-13*scale)
	compareState(t, k, lad, basis, ground.Vector, res)
	return true
}

// hamiltonian builds the ladder and its Hamiltonian from the formulas.
func (c *cell) hamiltonian(t *testing.T, k kind) (*ladder.Ladder, *ladder.Hamiltonian) {
	t.Helper()
	along, across := ladder.Open, ladder.Open
	if c.ring {
		along = ladder.Periodic
	}
	if c.tube {
		across = ladder.Periodic
	}
	parts := []ladder.Part{ladder.Across(across)}
	for _, l := range c.legs {
		parts = append(parts, k.leg(l))
	}
	lad, err := ladder.New(c.rungs, along, parts...)
	require.NoError(t, err)
	h, err := lad.Hamiltonian(nil, c.formulas...)
	require.NoError(t, err)
	return lad, h
}

const everythingElse = 1e-8

func compareState(t *testing.T, k kind, lad *ladder.Ladder, basis *exact.Basis, psi []complex128, res *dmrg.Result) {
	ctx := context.Background()
	at := func(place []ladder.IndexValue) int {
		var leg string
		var rung int
		for _, v := range place {
			if v.Name == "l" {
				leg = v.Leg
			} else {
				rung = int(v.Number)
			}
		}
		i, ok := lad.SiteIndex(leg, rung)
		require.True(t, ok)
		return i
	}
	each := ladder.Each{"l": "legs"}
	for _, name := range k.local {
		want := basis.Local(psi, name)
		f, err := observables.Everywhere(ctx, res.State, name+"[l,j]", each)
		require.NoError(t, err)
		require.Len(t, f.Values, lad.Sites())
		for i, place := range f.At {
			got := complex(f.Values[i], 0)
			if f.Imag != nil {
				got = complex(f.Values[i], f.Imag[i])
			}
			require.InDelta(t, 0, cmplx.Abs(got-want[at(place)]), everythingElse, "%s at %v", name, place)
		}
	}
	for _, p := range k.pairs {
		want := basis.TwoPoint(psi, p[0], p[1])
		f, err := observables.AllPairs(ctx, res.State, ladder.Term{Formula: p[0] + "[l,j]", Each: each}, ladder.Term{Formula: p[1] + "[l,j]", Each: each})
		require.NoError(t, err)
		for x := range f.Values {
			for y, got := range f.Values[x] {
				w := want[at(f.AtFirst[x])][at(f.AtSecond[y])]
				require.InDelta(t, 0, cmplx.Abs(got-w), everythingElse, "<%s %s> at %v, %v", p[0], p[1], f.AtFirst[x], f.AtSecond[y])
			}
		}
	}
	entropies, err := basis.Entropies(psi)
	require.NoError(t, err)
	renyi, err := basis.Renyi2(psi)
	require.NoError(t, err)
	cuts := entanglement.Cuts(res.State)
	for b := range cuts.Entropy {
		require.InDelta(t, entropies[b], cuts.Entropy[b], everythingElse, "entropy of cut %d", b)
		require.InDelta(t, renyi[b], cuts.Renyi2[b], everythingElse, "Renyi-2 entropy of cut %d", b)
	}
}
