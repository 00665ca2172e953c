package calibration

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
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
	Entropy   []Bar // by cut
}

// Record is a model with all its searches.
type Record struct {
	Name, Source string
	Hard, Tunes  bool
	Size         float64 // of the energy
	Cases        []Case
}

// Precisions are the wishes that a model is searched for, as far as its Finest; the caps are met at the last.
var Precisions = []float64{1e-3, 1e-4, 1e-5, 1e-6, 1e-7, 1e-8, 1e-9}

// cappedAt is the wish of the searches that are to end at a cap.
const cappedAt = 1e-9

// Measure searches a model at all its stops, on one thread.
func (m *Model) Measure(ctx context.Context) (Record, error) {
	r := Record{Name: m.Name, Source: m.Source, Hard: m.Hard, Tunes: m.Tunes()}
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
	entropies []float64
}

func (m *Model) look(s *mps.State, sweep int, weight, energy float64) (moment, error) {
	local, err := locals(s, m.Local)
	return moment{sweep, weight, energy, local, entanglement.Cuts(s).Entropy}, err
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
	if n := len(settled); n > 0 {
		c.Earlier = errorbar.Quality{Weight: settled[n-1].weight, Energy: (settled[n-1].energy - r.EnergyLimit + r.EnergyError) / scale}
	}
	c.compare(want, now, settled, c.Quality)
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

// compare quotes the errors of local values and entropies and finds the true ones.
func (c *Case) compare(want Answer, now moment, settled []moment, q errorbar.Quality) {
	entropies := make([]complex128, len(now.entropies))
	for i, s := range now.entropies {
		entropies[i] = complex(s, 0)
	}
	var before *moment
	var earlier []complex128
	if n := len(settled); n > 0 {
		before = &settled[n-1]
		for _, s := range before.entropies {
			earlier = append(earlier, complex(s, 0))
		}
	}
	norms := func(n int) []float64 {
		out := make([]float64, n)
		for i := range out {
			out[i] = 1
		}
		return out
	}
	bars := func(k errorbar.Kind, now, earlier []complex128) []float64 {
		if before == nil {
			return errorbar.Lone(norms(len(now)), q)
		}
		return k.Spread(now, earlier, norms(len(now)), q, before.weight)
	}
	if want.Local != nil {
		var values []complex128
		if before != nil {
			values = before.local
		}
		for i, quoted := range bars(errorbar.Values, now.local, values) {
			b := Bar{Quoted: quoted, True: cmplx.Abs(now.local[i] - want.Local[i])}
			if before != nil {
				b.Moved = cmplx.Abs(now.local[i] - values[i])
			}
			c.Local = append(c.Local, b)
		}
	}
	if want.Entropies != nil {
		for i, quoted := range bars(errorbar.Entropies, entropies, earlier) {
			if math.IsNaN(want.Entropies[i]) {
				continue
			}
			b := Bar{Quoted: quoted, True: math.Abs(now.entropies[i] - want.Entropies[i])}
			if before != nil {
				b.Moved = math.Abs(now.entropies[i] - before.entropies[i])
			}
			c.Entropy = append(c.Entropy, b)
		}
	}
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
