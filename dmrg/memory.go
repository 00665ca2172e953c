package dmrg

import (
	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// footprint is the bytes that a search at some bond dimension holds: site tensors, environments, and at the widest bond the Krylov vectors and
// the slabs of the projected Hamiltonian.
func footprint[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis) float64 {
	var elements, work int
	for i, phys := range op.Phys {
		l, r := bonds[i], bonds[i+1]
		elements += block.NewStructure(op.Group, []block.Axis{l, phys, r.Reversed()}, block.Charge{}).Size
		environment := block.NewStructure(op.Group, []block.Axis{op.Bonds[i+1].Axis(block.In), r, r.Reversed()}, block.Charge{}).Size
		elements += environment
		if i+1 == len(op.Phys) {
			break
		}
		theta := block.NewStructure(op.Group, []block.Axis{l, phys, op.Phys[i+1], bonds[i+2].Reversed()}, block.Charge{}).Size
		work = max(work, theta*(vectorsWhole+thetas+op.Bonds[i].Dim()+op.Bonds[i+2].Dim()))
	}
	size := 8
	if dense.IsComplex[T]() {
		size = 16
	}
	return float64(size) * (float64(elements) + float64(work))
}

// thetas are the two-site tensors beside the Krylov vectors: theta itself, a copy, and its halves.
const thetas = 4

// expected forecasts the footprint of a bond dimension, its states shared among the charges as the configurations are, or where charges are too many to
// tell, as the present ones are.
func (s *search[T]) expected(bond int) float64 {
	psi := s.engine.psi
	bonds, err := mps.ExpectedBonds(psi.Group, psi.Axes(), psi.Charge(), bond)
	if err != nil {
		ratio := float64(bond) / float64(psi.MaxBond())
		return s.present() * ratio * ratio
	}
	return footprint(s.engine.op, bonds)
}

// present is the footprint of the bonds that the state has.
func (s *search[T]) present() float64 {
	psi := s.engine.psi
	bonds := make([]block.Axis, psi.Len()+1)
	for i, a := range psi.Sites {
		bonds[i] = a.Axes[0]
	}
	bonds[psi.Len()] = psi.Bond(psi.Len() - 1).Reversed()
	return footprint(s.engine.op, bonds)
}

// affordable returns the largest bond dimension from least to most whose forecast keeps the cap on memory, or least. The forecast is corrected by what
// the present state takes beyond its own.
func (s *search[T]) affordable(least, most int) int {
	if s.opt.Memory == 0 || most <= least {
		return most
	}
	excess := 1.0
	if d := s.engine.psi.MaxBond(); d > 1 {
		excess = s.present() / s.expected(d)
	}
	fits := func(bond int) bool { return excess*s.expected(bond) <= float64(s.opt.Memory) }
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
