package main

import (
	"fmt"

	"rundle/dmrg"
)

// kind is what a row measures.
type kind string

// The kinds, see doc.go.
const (
	sweepKind    kind = "sweep"
	energyKind   kind = "energy"
	memoryKind   kind = "memory"
	exponentKind kind = "exponent"
	threadsKind  kind = "threads"
	shareKind    kind = "gemm share"
	rateKind     kind = "gemm rate"
)

// compares tells whether the baseline runs too.
func (k kind) compares() bool { return k == sweepKind || k == energyKind || k == memoryKind }

// atMost tells whether the target bounds the figure from above.
func (k kind) atMost() bool { return k == memoryKind || k == exponentKind }

// row is one figure to measure.
type row struct {
	kind    kind
	model   string
	bonds   []int // ramp; the last is the one that counts
	threads int
	target  float64
	rungs   int // 0: the model's
}

func (r row) bond() int { return r.bonds[len(r.bonds)-1] }

func (r row) name() string {
	n := fmt.Sprintf("%s %s %d", r.kind, r.model, r.bond())
	if r.kind == exponentKind {
		n = fmt.Sprintf("%s %s %d..%d", r.kind, r.model, r.bonds[0], r.bond())
	}
	if r.kind == energyKind && r.threads > 1 {
		n += fmt.Sprintf(", %d threads", r.threads)
	}
	return n
}

// ramps are the bond dimensions of the baseline's own calls.
var ramps = map[string][]int{
	"ladder":  {50, 100, 200, 400},
	"chain":   {32, 64, 128, 256},
	"hubbard": {64, 128, 256, 512},
	"flux":    {32, 64, 128, 256},
	"boson":   {32, 64, 128},
	"pi-flux": {32, 64, 128, 256},
}

var fiveModels = []string{"ladder", "chain", "hubbard", "flux", "boson"}

// allRows lists all rows with their targets.
func allRows(quick bool) []row {
	var rows []row
	for _, m := range fiveModels {
		rows = append(rows, row{kind: sweepKind, model: m, bonds: ramps[m], threads: 1, target: 1.8})
	}
	for _, m := range fiveModels {
		rows = append(rows, row{kind: energyKind, model: m, bonds: ramps[m], threads: 1, target: 5})
	}
	rows = append(rows, row{kind: energyKind, model: "pi-flux", bonds: ramps["pi-flux"], threads: 1, target: 15})
	for _, m := range fiveModels {
		rows = append(rows, row{kind: energyKind, model: m, bonds: ramps[m], threads: 2, target: 8})
	}
	for _, m := range []string{"ladder", "hubbard", "flux"} {
		rows = append(rows, row{kind: threadsKind, model: m, bonds: []int{64, 128, 256, 512}, threads: 2, target: 1.8})
	}
	for _, m := range []string{"ladder", "hubbard"} {
		bonds := []int{50, 100, 200, 400, 800}
		rows = append(rows, row{kind: shareKind, model: m, bonds: bonds, threads: 1, target: 0.6},
			row{kind: rateKind, model: m, bonds: bonds, threads: 1, target: 0.9})
	}
	rows = append(rows, row{kind: memoryKind, model: "ladder", bonds: []int{50, 100, 200, 400, 800}, threads: 1, target: 0.6},
		row{kind: exponentKind, model: "ladder", bonds: []int{200, 400, 800, 1600}, threads: 1, target: 3})
	if quick {
		for i := range rows {
			rows[i].shrink()
		}
	}
	return rows
}

// shrink makes a row small, to see that everything works.
func (r *row) shrink() {
	for i := range r.bonds {
		if i == 0 {
			r.bonds = append([]int(nil), r.bonds...)
		}
		r.bonds[i] = max(4, r.bonds[i]/8)
	}
	r.rungs = 12
	if r.model == "boson" {
		r.rungs = 6
	}
}

// Passes of a ramp, the baseline's: bench.py documents the perturbation.
const (
	firstPerturbation = 1e-4
	rampPasses        = 2
	cleanPasses       = 3 // the last two count
	counted           = 2
	vectors           = 4
)

// schedule is the baseline's ramp: of each bond dimension two perturbed passes, a tenth of the weight from one to the next, of the last
// one perturbed pass and clean ones.
func (r row) schedule(clean int) []dmrg.Pass {
	var passes []dmrg.Pass
	weight := firstPerturbation
	for i, bond := range r.bonds {
		count := rampPasses
		if i == len(r.bonds)-1 {
			count = 1
		}
		for range count {
			passes = append(passes, dmrg.Pass{Bond: bond, Vectors: vectors, Perturbation: weight})
		}
		weight /= 10
	}
	for range clean {
		passes = append(passes, dmrg.Pass{Bond: r.bond(), Vectors: vectors})
	}
	return passes
}

// staircase opens the smallest bond dimension and climbs by clean passes, two each: the second of each pair counts.
func (r row) staircase() []dmrg.Pass {
	passes := []dmrg.Pass{{Bond: r.bonds[0], Vectors: vectors, Perturbation: firstPerturbation}, {Bond: r.bonds[0], Vectors: vectors, Perturbation: firstPerturbation / 10}}
	for _, bond := range r.bonds {
		passes = append(passes, dmrg.Pass{Bond: bond, Vectors: vectors}, dmrg.Pass{Bond: bond, Vectors: vectors})
	}
	return passes
}
