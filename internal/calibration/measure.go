package calibration

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"rundle/dmrg"
	"rundle/entanglement"
	"rundle/internal/errorbar"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// Bar is an error as quoted, and as it is. Moved is by how much the value changed since the bond dimension settled before.
type Bar struct{ Quoted, True, Moved float64 }

// Case is one search of a model.
type Case struct {
	Precision float64 // wanted
	Bond      int     // cap; 0: none
	Reached   int     // bond dimension
	Verdict   dmrg.Verdict
	Flops     float64
	Quality   errorbar.Quality
	Earlier   errorbar.Quality // at the settled bond dimension before, as far as it counts
	Energy    Bar
	Local     []Bar // by site
	Far       []Bar // by distance
	Entropy   []Bar // by cut
}

// Record is a model with all its searches.
type Record struct {
	Name, Source, Half string
	Hard               bool
	Size               float64 // of the energy
	Cases              []Case
}

// Precisions are the wishes that a model is searched for, as far as its Finest; the caps are met at the last.
var Precisions = []float64{1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9}

// cappedAt is the wish of the searches that are to end at a cap.
const cappedAt = 1e-9

// Measure searches a model at all its stops, on one thread.
func (m *Model) Measure(ctx context.Context) (Record, error) {
	r := Record{Name: m.Name, Source: m.Source, Half: m.Half(), Hard: m.Hard}
	want, err := m.Answer()
	if err != nil {
		return r, err
	}
	h, err := m.Hamiltonian()
	if err != nil {
		return r, err
	}
	r.Size = math.Abs(want.Energy)
	stop := func(precision float64, bond int) error {
		c, err := m.search(ctx, h, want, precision, bond)
		r.Cases = append(r.Cases, c)
		return err
	}
	for _, bond := range m.Caps {
		if err := stop(cappedAt, bond); err != nil {
			return r, err
		}
	}
	for _, p := range Precisions {
		if p < m.Finest*0.99 {
			break
		}
		if err := stop(p, 0); err != nil {
			return r, err
		}
	}
	return r, nil
}

// moment is what is measured at a settled bond dimension.
type moment struct {
	sweep     int
	weight    float64
	energy    float64
	local     []complex128
	far       []complex128
	entropies []complex128
}

func (m *Model) look(s *mps.State, sweep int, weight, energy float64) (moment, error) {
	now := moment{sweep: sweep, weight: weight, energy: energy}
	for _, e := range entanglement.Cuts(s).Entropy {
		now.entropies = append(now.entropies, complex(e, 0))
	}
	var err error
	if now.local, err = locals(s, m.Local); err == nil && len(m.Local) > 0 {
		now.far, err = correlations(s, m.lattice)
	}
	return now, err
}

// search runs one case.
func (m *Model) search(ctx context.Context, h *ladder.Hamiltonian, want Answer, precision float64, bond int) (Case, error) {
	c := Case{Precision: precision, Bond: bond}
	var settled []moment
	var failed error
	sweeps := 0
	r, err := dmrg.Ground(ctx, h, m.Sector, dmrg.Options{Precision: precision, Bond: bond, Threads: 1,
		OnSweep: func(dmrg.Sweep) { sweeps++ },
		OnStage: func(s dmrg.Stage) {
			now, err := m.look(s.State, sweeps, s.Discarded, s.Energy)
			if settled = append(settled, now); err != nil {
				failed = err
			}
		}})
	if err == nil {
		err = failed
	}
	if err != nil {
		return c, fmt.Errorf("%s, precision %.0e, bond %d: %w", m.Name, precision, bond, err)
	}
	c.Reached, c.Verdict, c.Flops = r.LargestBond, r.Verdict, r.Flops
	c.Energy = Bar{Quoted: r.EnergyError, True: max(0, math.Abs(r.EnergyLimit-want.Energy)-want.Loose)}
	now, err := m.look(r.State, sweeps, r.DiscardedWeight, r.Energy)
	if err != nil {
		return c, err
	}
	if n := len(settled); n > 0 && settled[n-1].sweep == sweeps {
		settled = settled[:n-1] // the state found
	}
	scale := m.largest()
	c.Quality = qualityOf(r, scale)
	c.Quality.Sites = m.lattice.sites()
	if n := len(settled); n > 0 {
		c.Earlier = errorbar.Quality{Weight: settled[n-1].weight, Energy: (settled[n-1].energy - r.EnergyLimit + r.EnergyError) / scale}
	}
	c.compare(m, want, now, settled, c.Quality)
	return c, nil
}

// largest is the largest coupling.
func (m *Model) largest() float64 {
	var x float64
	for _, t := range m.terms {
		x = max(x, cmplx.Abs(t.Coef))
	}
	return x
}

func qualityOf(r *dmrg.Result, scale float64) errorbar.Quality {
	return errorbar.Quality{Weight: r.DiscardedWeight, Energy: (r.EnergyError + r.Energy - r.EnergyLimit) / scale, Residual: r.Sweeps[len(r.Sweeps)-1].Residual / scale, Gap: r.Gap / scale}
}

// compare quotes the errors of values, correlations and entropies, and finds the true ones.
func (c *Case) compare(m *Model, want Answer, now moment, settled []moment, q errorbar.Quality) {
	var before moment
	if n := len(settled); n > 0 {
		before = settled[n-1]
	}
	bars := func(k errorbar.Kind, norm float64, want, now, earlier []complex128) []Bar {
		if want == nil {
			return nil
		}
		norms := slices.Repeat([]float64{norm}, len(now))
		quoted := errorbar.Lone(norms, q)
		if len(settled) > 0 {
			quoted = k.Spread(now, earlier, norms, q, before.weight)
		}
		var out []Bar
		for i := range want {
			if cmplx.IsNaN(want[i]) {
				continue
			}
			b := Bar{Quoted: quoted[i], True: cmplx.Abs(now[i] - want[i])}
			if len(settled) > 0 {
				b.Moved = cmplx.Abs(now[i] - earlier[i])
			}
			out = append(out, b)
		}
		return out
	}
	var entropies []complex128
	for _, e := range want.Entropies {
		entropies = append(entropies, complex(e, 0))
	}
	_, _, norm := m.lattice.far()
	c.Local = bars(errorbar.Values, 1, want.Local, now.local, before.local)
	c.Far = bars(errorbar.Correlations, norm, want.Far, now.far, before.far)
	c.Entropy = bars(errorbar.Entropies, 1, entropies, now.entropies, before.entropies)
}

// correlations measures those of lattice.far; none gives nil.
func correlations(s *mps.State, l lattice) ([]complex128, error) {
	first, second, norm := l.far()
	if norm == 0 {
		return nil, nil
	}
	leg := legNames[:1]
	p, err := observables.AllPairs(context.Background(), s, ladder.Term{Formula: fmt.Sprintf("%s[%s,%d]", first, leg, l.origin())},
		ladder.Term{Formula: fmt.Sprintf("%s[%s,j]", second, leg)})
	if err != nil {
		return nil, err
	}
	return p.Values[0][l.origin()+2:], nil
}

// locals measures a product of operators on every site, or on every pair of neighbours along a leg by the first of them; none gives nil.
func locals(s *mps.State, ops []string) ([]complex128, error) {
	var formula strings.Builder
	for k, op := range ops {
		fmt.Fprintf(&formula, " %s[l,j+%d]", op, k)
	}
	if len(ops) == 0 {
		return nil, nil
	}
	f, err := observables.Everywhere(context.Background(), s, formula.String(), ladder.Each{"l": "legs"})
	if err != nil {
		return nil, err
	}
	lad := s.Scope().Ladder()
	out := make([]complex128, len(f.Values))
	for i, place := range f.At {
		var leg string
		var rung int
		for _, v := range place {
			if v.Name == "l" {
				leg = v.Leg
			} else {
				rung = int(v.Number)
			}
		}
		at, ok := lad.SiteIndex(leg, rung)
		if !ok || at >= len(out) {
			return nil, fmt.Errorf("no value at leg %q, rung %d", leg, rung)
		}
		out[at] = complex(f.Values[i], 0)
		if f.Imag != nil {
			out[at] = complex(f.Values[i], f.Imag[i])
		}
	}
	return out, nil
}
