// Command screening-current follows hard-core bosons on a two-leg flux ladder into the Meissner state: as the rungs grow stronger,
// the vortices leave, and then a current around the edge screens the field. It shows how a program uses Rundle as a
// library: one ladder, a Hamiltonian for each coupling, each search begun from the state before.
//
//	go run ./examples/screening-current
package main

import (
	"context"
	"fmt"
	"io"
	"log"
	"math"
	"os"
	"os/signal"

	"rundle/dmrg"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	err := shownModel.follow(ctx, os.Stdout, []float64{0.25, 0.5, 0.75, 1, 1.25, 1.5, 2, 3})
	if err != nil {
		log.Fatal(err)
	}
}

const precision = 1e-5 // wanted error of the energy

// model is the ladder; energies are in units of the hopping along the legs.
type model struct {
	rungs, bosons int
	flux          float64 // a plaquette
}

// shownModel is small enough for seconds.
var shownModel = model{rungs: 10, bosons: 5, flux: math.Pi / 2}

// point is what is read out at one rung coupling.
type point struct {
	energy, energyError float64
	verdict             dmrg.Verdict
	edge                float64 // current up leg b and down leg a, mean over the plaquettes
	reversed            int     // plaquettes around which it flows the other way: vortices
}

// follow prints a line for each rung coupling.
func (m model) follow(ctx context.Context, out io.Writer, couplings []float64) error {
	fmt.Fprintln(out, "  K/J    energy/J         edge current  reversed  verdict")
	var last *mps.State
	for _, k := range couplings {
		p, state, err := m.solve(ctx, k, last)
		if err != nil {
			return fmt.Errorf("at K = %v: %w", k, err)
		}
		last = state
		fmt.Fprintf(out, "%5.2f  %11.5f ± %.0e  %12.5f  %8d  %s\n", k, p.energy, p.energyError, p.edge, p.reversed, p.verdict)
	}
	return nil
}

// solve finds the ground state at rung coupling k. start may be nil.
func (m model) solve(ctx context.Context, k float64, start *mps.State) (point, *mps.State, error) {
	lad, err := ladder.New(m.rungs, ladder.Open, ladder.Leg("a", ladder.Boson(1)), ladder.Leg("b", ladder.Boson(1)))
	if err != nil {
		return point{}, nil, err
	}
	h, err := lad.Hamiltonian(ladder.Constants{"K": k, "phi": m.flux},
		ladder.Term{Formula: "-exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."},
		ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."})
	if err != nil {
		return point{}, nil, err
	}
	found, err := dmrg.Ground(ctx, h, ladder.Sector{"N": m.bosons}, dmrg.Options{Precision: precision, Start: start})
	if err != nil {
		return point{}, nil, err
	}
	p := point{energy: found.EnergyLimit, energyError: found.EnergyError, verdict: found.Verdict}
	// Currents by continuity, from rung j to rung j+1. Formulas may use the constants of the Hamiltonian.
	a, err := observables.Everywhere(ctx, found.State, "i*(exp(i*phi/2) b^+[a,j+1] b[a,j] - h.c.)", nil)
	if err != nil {
		return point{}, nil, err
	}
	b, err := observables.Everywhere(ctx, found.State, "i*(exp(-i*phi/2) b^+[b,j+1] b[b,j] - h.c.)", nil)
	if err != nil {
		return point{}, nil, err
	}
	for j := range a.Values {
		around := (b.Values[j] - a.Values[j]) / 2
		p.edge += around / float64(len(a.Values))
		if around < 0 {
			p.reversed++
		}
	}
	return p, found.State, nil
}
