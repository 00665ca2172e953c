// Package block holds block-sparse tensors with abelian charges: the arithmetic below matrix-product states and operators. It knows
// charges and shapes, not what they mean.
//
// # Charges, axes, structures
//
// A Group is a product of up to four charges, each U(1) or Z_q; a Charge is a value of it. An Axis is one index of a tensor: its
// states, sorted by charge into sectors, and a flow, In (+1) or Out (-1). A tensor has a total charge, and an element may
// differ from zero only where
//
//	sum over axes of Flow*charge = Total        (in each charge; modulo q for Z_q)
//
// so that it falls into dense blocks, one for each allowed choice of a sector on every axis. A Structure is the table of all allowed
// blocks; a Tensor is a structure with a slab of numbers. Blocks are row-major, sorted lexicographically by sector positions, and start at
// multiples of eight elements: on a cache line of their own if the slab does. The gaps between them are zero always, which lets
// norms, sums and scalar products run over whole slabs. Every function of this package that writes a slab keeps this; who
// writes a slab by hand has to do so too. A tensor without axes is a number: one block if its total is zero.
//
// The dense image of a tensor (Dense, FromDense) counts the states of each axis in the order of its sectors.
//
// # Plans
//
// A contraction, a permutation of axes or a bipartition into matrices is planned once for its structures (PlanContract,
// PlanPermute, PlanMatrix) and run many times on slabs (RunContract, RunPermute, Gather and Scatter). Plans hold offsets and
// sizes only, serve real and complex numbers alike, are immutable, and may be run by several goroutines at once. The
// convenient forms (Contract, Permute) plan and run once.
//
// A contraction is a list of GEMM chains, one for each result block; a chain of much work is split along its longer
// side. Contracted axes that lead or trail in an operand, in matching order, cost nothing: the product takes the
// block as it is stored, transposed or not. Any other order is first permuted into scratch, on the operand where that
// moves less. So put the axes that are summed most often first or last. Each element of the result has one writer and the chain's
// order is fixed, hence the result is the same, bit by bit, at any number of threads.
//
// # Factorizations
//
// QR, LQ and SVD act across a bipartition: the first axes against the rest. The bond they create carries the sum of Flow*charge
// of the left axes. The left factor gets it as an axis Out and has total zero; the right factor gets it as an axis In and
// takes over the total of the tensor. Cut selects singular values over all charges together (White 1992; with charges as in Schollwoeck 2011,
// section 4). A multiplet of equal values may be split by the cap Cut.Bond; which of them stay then depends on their rounding, and on the
// order of the sectors if they are equal to the last bit.
//
// # Memory
//
// New structures and tensors belong to the caller. Axes and structures are shared freely and never written after they are
// built. RunContract and RunPermute write only into the slab they are given, and take what they need besides from a Scratch, which
// recycles slabs by size; with one that has seen the plan before they allocate nothing on a single thread. Factorizations keep their memory in
// a Workspace and allocate their results. The zero value of Group is the trivial group, of
// Charge the zero charge, of Cut the cut that drops nothing but zeros, of Scratch and Workspace an empty store. A nil pool means one thread. Tensor, Structure and
// the plans have no useful zero value.
//
// # Panics and errors
//
// Shapes that do not fit, axes that do not pair, charges that are not normalized are mistakes of the caller and panic, with the
// shapes concerned. What depends on numbers is an error: ErrZero and *SVDError from SVD, *ForbiddenError from FromDense; and
// NewGroup, whose rules may come from a file.
//
// # Papers
//
//   - S. R. White, Phys. Rev. Lett. 69, 2863 (1992): truncation by the density matrix.
//   - U. Schollwoeck, Ann. Phys. 326, 96 (2011): matrix-product states and their conserved charges.
//   - S. Singh, R. N. C. Pfeifer, G. Vidal, Phys. Rev. A 82, 050301 (2010): tensors with a global symmetry, their blocks and fusing.
package block
