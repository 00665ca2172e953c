package dmrg

import (
	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// footprint is the bytes that a search at some bond dimension needs.
type footprint struct {
	sites        float64 // site tensors
	environments float64 // one a site
	largest      float64 // environment
	work         float64 // Krylov vectors and the slabs of a perturbation, at the widest bond
}

// whole is what is held where memory has no cap; least what must be in memory: of the environments those of an update, the one that it
// makes, and the one that is read for the next.
func (f footprint) whole() float64 { return f.sites + f.environments + f.work }
func (f footprint) least() float64 {
	return f.sites + min(f.environments, heldEnvironments*f.largest) + f.work
}

const heldEnvironments = 4

func footprintOf[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis) (f footprint) {
	size := float64(elementSize[T]())
	for i, phys := range op.Phys {
		l, r := bonds[i], bonds[i+1]
		f.sites += size * float64(block.NewStructure(op.Group, []block.Axis{l, phys, r.Reversed()}, block.Charge{}).Size)
		environment := size * float64(block.NewStructure(op.Group, []block.Axis{op.Bonds[i+1].Axis(block.In), r, r.Reversed()}, block.Charge{}).Size)
		f.environments += environment
		f.largest = max(f.largest, environment)
		if i+1 == len(op.Phys) {
			break
		}
		theta := block.NewStructure(op.Group, []block.Axis{l, phys, op.Phys[i+1], bonds[i+2].Reversed()}, block.Charge{}).Size
		f.work = max(f.work, size*float64(theta*workspaces(op, i)))
	}
	return f
}

// workspaces is what the update of bond i holds, in two-site tensors; a perturbed one, at most. Others hold mixtures of
// environment matrices instead, which are less.
func workspaces[T dense.Scalar](op *mpo.Operator[T], i int) int {
	return vectorsWhole + thetas + op.Bonds[i].Dim() + op.Bonds[i+2].Dim()
}

func elementSize[T dense.Scalar]() int {
	if dense.IsComplex[T]() {
		return 16
	}
	return 8
}

// beside runs an update, or the growing of an environment, and keeps the cap on memory. cap bounds the bond dimension that it makes.
func (e *engine[T]) beside(bond int, right bool, cap int, update func() error) error {
	if e.envs.depot == nil {
		return update()
	}
	a, b := e.psi.Sites[bond], e.psi.Sites[bond+1]
	theta := block.NewStructure(e.op.Group, []block.Axis{a.Axes[0], a.Axes[1], b.Axes[1], b.Axes[2]}, block.Charge{}).Size
	held := theta * workspaces(e.op, bond)
	for _, t := range e.psi.Sites {
		held += len(t.Data)
	}
	// The environment to come has the bond in the middle, wider perhaps.
	middle := a.Axes[2]
	more := block.NewStructure(e.op.Group, []block.Axis{e.op.Bonds[bond+1].Axis(block.In), middle.Reversed(), middle}, block.Charge{}).Size
	if wider := float64(cap) / float64(middle.Dim()); wider > 1 {
		widest := min(wider, mostWidening)
		more = int(float64(more) * widest * widest)
	}
	return e.envs.during(bond, right, more, int(e.memory)/elementSize[T]()-held, update)
}

// mostWidening bounds what a bond dimension is expected to grow by in one update.
const mostWidening = 2

// thetas are the two-site tensors beside the Krylov vectors: theta itself, a copy, and its halves.
const thetas = 4

// expected forecasts the footprint of a bond dimension, its states shared among the charges as the configurations are, or where charges are too many to
// tell, as the present ones are.
func (s *search[T]) expected(bond int) footprint {
	psi := s.engine.psi
	bonds, err := mps.ExpectedBonds(psi.Group, psi.Axes(), psi.Charge(), bond)
	if err != nil {
		ratio := float64(bond) / float64(psi.MaxBond())
		f := s.present()
		return footprint{f.sites * ratio * ratio, f.environments * ratio * ratio, f.largest * ratio * ratio, f.work * ratio * ratio}
	}
	return footprintOf(s.engine.op, bonds)
}

// present is the footprint of the bonds that the state has.
func (s *search[T]) present() footprint {
	psi := s.engine.psi
	bonds := make([]block.Axis, psi.Len()+1)
	for i, a := range psi.Sites {
		bonds[i] = a.Axes[0]
	}
	bonds[psi.Len()] = psi.Bond(psi.Len() - 1).Reversed()
	return footprintOf(s.engine.op, bonds)
}

// affordable returns the largest bond dimension from least to most whose forecast keeps the cap on memory, or least: environments may go to disk. The forecast is corrected by what
// the present state takes beyond its own.
func (s *search[T]) affordable(least, most int) int {
	if s.opt.Memory == 0 || most <= least {
		return most
	}
	excess := 1.0
	if d := s.engine.psi.MaxBond(); d > 1 {
		excess = s.present().least() / s.expected(d).least()
	}
	fits := func(bond int) bool { return excess*s.expected(bond).least() <= float64(s.opt.Memory) }
	if fits(most) {
		return most
	}
	for most-least > 1 {
		if mid := (least + most) / 2; fits(mid) {
			least = mid
		} else {
			most = mid
		}
	}
	return least
}
