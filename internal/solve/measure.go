package solve

import (
	"context"
	"fmt"

	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// series is an observation at all its places.
type series struct {
	name      string
	hermitian bool
	at        []runfolder.At
	values    []complex128
	norms     []float64 // bounds on the norms of the operators
	far       []bool    // whether they reach further than the next rung
}

// measure takes all observations of a state but the entanglement, in their order.
func measure(ctx context.Context, s *mps.State, list []modelfile.Observation) ([]series, error) {
	var all []series
	for _, o := range list {
		var one series
		var err error
		switch o.Kind {
		case modelfile.Values:
			one, err = measureValues(ctx, s, o)
		case modelfile.Correlations:
			one, err = measureCorrelations(ctx, s, o)
		default:
			continue
		}
		if err != nil {
			return nil, fmt.Errorf("observation %q: %w", o.Name, err)
		}
		all = append(all, one)
	}
	return all, nil
}

func measureValues(ctx context.Context, s *mps.State, o modelfile.Observation) (series, error) {
	f, err := observables.Observe(ctx, s, o.Term)
	if err != nil {
		return series{}, err
	}
	one := series{name: o.Name, hermitian: f.Imag == nil, values: make([]complex128, len(f.Values))}
	places, err := placesOf(s, o.Term)
	if err != nil {
		return one, err
	}
	for _, p := range places {
		one.norms, one.far = append(one.norms, p.norm), append(one.far, p.far())
	}
	for i, v := range f.Values {
		one.at = append(one.at, placeOf(f.At[i], ""))
		if f.Imag == nil {
			one.values[i] = complex(v, 0)
		} else {
			one.values[i] = complex(v, f.Imag[i])
		}
	}
	return one, nil
}

// measureCorrelations lists the pairs row by row; the indices of the second operator bear a prime.
func measureCorrelations(ctx context.Context, s *mps.State, o modelfile.Observation) (series, error) {
	p, err := observables.AllPairs(ctx, s, o.Term, o.Second)
	if err != nil {
		return series{}, err
	}
	values := p.Values
	if o.Connected {
		values = p.Connected()
	}
	one := series{name: o.Name, hermitian: p.Hermitian}
	first, err := placesOf(s, o.Term)
	if err != nil {
		return one, err
	}
	second, err := placesOf(s, o.Second)
	if err != nil {
		return one, err
	}
	for x, row := range values {
		for y, v := range row {
			at := placeOf(p.AtFirst[x], "")
			for name, value := range placeOf(p.AtSecond[y], "'") {
				at[name] = value
			}
			both := first[x].with(second[y])
			one.at, one.values, one.norms, one.far = append(one.at, at), append(one.values, v), append(one.norms, both.norm), append(one.far, both.far())
		}
	}
	return one, nil
}

// place is an operator at one of its places: a bound on its norm, and the rungs that it reaches over.
type place struct {
	norm        float64
	first, last int
}

// far is whether it reaches further than the next rung.
func (p place) far() bool { return p.last > p.first+1 }

// with is the product of two operators.
func (p place) with(q place) place {
	return place{p.norm * q.norm, min(p.first, q.first), max(p.last, q.last)}
}

// placesOf describes a formula at each of its places.
func placesOf(s *mps.State, t ladder.Term) ([]place, error) {
	all, err := s.Scope().Places(t)
	if err != nil {
		return nil, err
	}
	places := make([]place, len(all))
	for i, p := range all {
		norm, err := normBound(p.Poly, s.Frames())
		if err != nil {
			return nil, err
		}
		places[i] = place{norm: norm, first: p.Poly.Ladder().Rungs(), last: -1}
		for t := range p.Poly.NumTerms() {
			_, factors := p.Poly.Term(t)
			for _, f := range factors {
				_, rung, _ := p.Poly.Ladder().SiteAt(int(f.Site))
				places[i].first, places[i].last = min(places[i].first, rung), max(places[i].last, rung)
			}
		}
	}
	return places, nil
}

// placeOf turns the indices of a place into those of a result.
func placeOf(at []ladder.IndexValue, mark string) runfolder.At {
	out := runfolder.At{}
	for _, v := range at {
		switch x := v.Value().(type) {
		case int, string:
			out[v.Name+mark] = x
		default:
			out[v.Name+mark] = fmt.Sprint(x)
		}
	}
	return out
}

// observations joins values and errors for the result.
func observations(all []series, bars [][]float64) map[string][]runfolder.Observation {
	out := make(map[string][]runfolder.Observation, len(all))
	for k, s := range all {
		list := make([]runfolder.Observation, len(s.values))
		for i, v := range s.values {
			value := runfolder.Pair(v)
			if s.hermitian {
				value = runfolder.Number(real(v))
			}
			list[i] = runfolder.Observation{At: s.at[i], Value: value, Error: bars[k][i]}
		}
		out[s.name] = list
	}
	return out
}
