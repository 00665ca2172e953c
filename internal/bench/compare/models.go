package main

import (
	"fmt"
	"math"

	"rundle/mpo/ladder"
)

// A model is one of the baseline's, with its size and the bond dimensions of its runs.
type model struct {
	name   string // the baseline's
	rungs  int
	flux   float64 // phi; 0: the baseline's own
	system func(rungs int, flux float64) (*ladder.Hamiltonian, ladder.Sector, error)
}

// defaultFlux is the phi of the baseline's models.
var defaultFlux = map[string]float64{"flux": 2, "boson": math.Pi / 2}

// models holds the five and the pi-flux version of one.
var models = map[string]model{
	"ladder":  {name: "ladder", rungs: 32, system: spinLadder},
	"chain":   {name: "chain", rungs: 64, system: spinChain},
	"hubbard": {name: "hubbard", rungs: 32, system: hubbardChain},
	"flux":    {name: "flux", rungs: 32, system: fluxLadder},
	"boson":   {name: "boson", rungs: 16, system: bosonLadder},
	"pi-flux": {name: "flux", rungs: 32, flux: math.Pi, system: fluxLadder},
}

// build makes the Hamiltonian and the sector.
func (m model) build() (*ladder.Hamiltonian, ladder.Sector, error) {
	flux := m.flux
	if flux == 0 {
		flux = defaultFlux[m.name]
	}
	return m.system(m.rungs, flux)
}

// on writes formulas on equal open legs.
func on(rungs int, site ladder.Site, legs []string, c ladder.Constants, terms ...ladder.Term) (*ladder.Hamiltonian, error) {
	var parts []ladder.Part
	for _, name := range legs {
		parts = append(parts, ladder.Leg(name, site))
	}
	lad, err := ladder.New(rungs, ladder.Open, parts...)
	if err != nil {
		return nil, err
	}
	return lad.Hamiltonian(c, terms...)
}

var (
	oneLeg    = []string{"a"}
	twoLegs   = []string{"a", "b"}
	everyLeg  = ladder.Each{"l": "legs"}
	balanced  = ladder.Sector{"Sz": 0}
	spinHalf  = ladder.Spin(1)
	perRung   = func(rungs int) ladder.Sector { return ladder.Sector{"N": rungs} }
	ofFormula = func(f string) ladder.Term { return ladder.Term{Formula: f} }
	ofEachLeg = func(f string) ladder.Term { return ladder.Term{Formula: f, Each: everyLeg} }
)

// spinLadder is the antiferromagnetic Heisenberg ladder of spins 1/2, equal on legs and rungs.
func spinLadder(rungs int, _ float64) (*ladder.Hamiltonian, ladder.Sector, error) {
	h, err := on(rungs, spinHalf, twoLegs, nil, ofEachLeg("S[l,j].S[l,j+1]"), ofFormula("S[a,j].S[b,j]"))
	return h, balanced, err
}

// spinChain is the antiferromagnetic Heisenberg chain of spins 1/2.
func spinChain(rungs int, _ float64) (*ladder.Hamiltonian, ladder.Sector, error) {
	h, err := on(rungs, spinHalf, oneLeg, nil, ofFormula("S[a,j].S[a,j+1]"))
	return h, balanced, err
}

// hubbardChain is the half-filled Hubbard chain at U = 4 t.
func hubbardChain(rungs int, _ float64) (*ladder.Hamiltonian, ladder.Sector, error) {
	h, err := on(rungs, ladder.Electron(), oneLeg, ladder.Constants{"U": 4},
		ofFormula("-(c_up^+[a,j] c_up[a,j+1] + c_down^+[a,j] c_down[a,j+1]) + h.c."), ofFormula("U n_up[a,j] n_down[a,j]"))
	return h, ladder.Sector{"N": rungs, "Sz": 0}, err
}

// fluxLadder is half-filled spinless fermions with flux phi a plaquette, a repulsion along the legs and a tilt of the rungs.
func fluxLadder(rungs int, flux float64) (*ladder.Hamiltonian, ladder.Sector, error) {
	h, err := on(rungs, ladder.Fermion(), twoLegs, ladder.Constants{"t": 1, "K": 0.7, "phi": flux, "V": 3, "h": 0.5},
		ofFormula("-t exp(i*phi/2) c^+[a,j] c[a,j+1] + h.c."), ofFormula("-t exp(-i*phi/2) c^+[b,j] c[b,j+1] + h.c."),
		ofFormula("-K c^+[a,j] c[b,j] + h.c."), ofFormula("h/2 (n[a,j] - n[b,j])"), ofEachLeg("V n[l,j] n[l,j+1]"))
	return h, perRung(rungs), err
}

// bosonLadder is bosons, one a rung and at most three a site, with flux phi a plaquette.
func bosonLadder(rungs int, flux float64) (*ladder.Hamiltonian, ladder.Sector, error) {
	h, err := on(rungs, ladder.Boson(3), twoLegs, ladder.Constants{"J": 1, "K": 1, "U": 2, "phi": flux},
		ofFormula("-J exp(i*phi/2) b^+[a,j] b[a,j+1] + h.c."), ofFormula("-J exp(-i*phi/2) b^+[b,j] b[b,j+1] + h.c."),
		ofFormula("-K b^+[a,j] b[b,j] + h.c."), ofEachLeg("U/2 n[l,j] (n[l,j] - 1)"))
	return h, perRung(rungs), err
}

// find returns a model by the name that rows use.
func find(name string) (model, error) {
	m, ok := models[name]
	if !ok {
		return m, fmt.Errorf("unknown model %q", name)
	}
	return m, nil
}
