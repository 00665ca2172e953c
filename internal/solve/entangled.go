package solve

import (
	"slices"

	"rundle/entanglement"
	"rundle/internal/modelfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// spectrumTo is the xi up to which entanglement spectra are written unless the model says otherwise.
const spectrumTo = 40

// entangled returns the entanglement of every cut, the spectra below the limit that the model sets.
func entangled(s *mps.State, list []modelfile.Observation) (*runfolder.Entanglement, error) {
	limit := float64(spectrumTo)
	for _, o := range list {
		if o.Kind == modelfile.Entanglement && o.SpectrumTo > 0 {
			limit = o.SpectrumTo
		}
	}
	t := entanglement.Cuts(s)
	e := &runfolder.Entanglement{Cuts: make([]runfolder.Cut, len(t.AfterSite))}
	for b := range e.Cuts {
		c := runfolder.Cut{AfterSite: t.AfterSite[b], RungEdge: t.RungEdge[b], Entropy: t.Entropy[b], Renyi2: t.Renyi2[b]}
		for _, l := range t.Spectrum[b] {
			if l.Xi < limit {
				c.Spectrum = append(c.Spectrum, runfolder.Level{Xi: l.Xi, Charge: l.Charge})
			}
		}
		e.Cuts[b] = c
	}
	return e, nil
}

func entropiesOf(e *runfolder.Entanglement) []complex128 {
	var out []complex128
	for _, c := range e.Cuts {
		out = append(out, complex(c.Entropy, 0))
	}
	return out
}

// ones are the sizes against which entropies err.
func ones(n int) []float64 { return slices.Repeat([]float64{1}, n) }

// quote puts in the errors of the entropies.
func quote(e *runfolder.Entanglement, bars []float64) {
	for i := range e.Cuts {
		e.Cuts[i].EntropyError = bars[i]
	}
}
