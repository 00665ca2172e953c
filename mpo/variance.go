package mpo

import (
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// Variance returns ||(h - E) psi||² / ||psi||² with E = <h>, which is <(h - E)²> for Hermitian h, and an estimate, on the large side,
// of the rounding error in it. A result below the estimate, negative ones included, says no more than that. h must add no charge.
//
// No large numbers are subtracted: E is taken off inside the operator, spread over the sites so that the finished part of h on
// the left of each cut has expectation value zero, and the product (h - E)^+ (h - E) is contracted as one compressed operator.
//
// The estimate follows the rounding of each step to the end. In the contraction up to site i, entry v between indices a and w
// adds v L[a] to L[w], where L are the environments on the left; elements of size |v L[a]| are rounded independently
// and reach the result multiplied by elements of R[w], the environment on the right. The squares
//
//	(4 eps |v| ||L[a]||_F max|R[w]|)²
//
// are summed over all entries and sites. To their root come the difference between the contractions from the two ends and
// what the compression of the product left out.
func Variance[T dense.Scalar](psi *mps.Chain[T], h *Operator[T], pool *task.Pool) (variance, rounding float64) {
	mustAct("variance", h, psi)
	psi = normalized(psi, 0, pool)
	shares := localShares(psi, h, pool)
	for i := range shares {
		shares[i] = -shares[i]
	}
	rest := shift(h, shares).operator()
	square, dropped := product(Adjoint(rest), rest, Options{Tolerance: 1e-14}.settle())

	fromRight, tops := contractRight(psi, square, pool)
	fromLeft, noise2 := contractLeft(psi, square, tops, pool)
	return fromLeft, math.Sqrt(noise2) + math.Abs(fromLeft-fromRight) + dropped
}

// localShares splits the expectation value of h by sites: share i is what the terms add that end at site i. The centre of psi
// is its first site.
func localShares[T dense.Scalar](psi *mps.Chain[T], h *Operator[T], pool *task.Pool) []T {
	shares := make([]T, h.Len())
	var ws Workspace[T]
	env, before := LeftEdge(h), dense.FromFloat[T](0)
	for i := range h.Sites {
		env = GrowLeft(h, i, env, psi.Sites[i], psi.Sites[i], &ws, pool)
		after := dense.FromFloat[T](0)
		if d := h.Bonds[i+1].Done; d >= 0 {
			after = trace(env, h.Bonds[i+1], d)
		}
		shares[i], before = after-before, after
	}
	return shares
}

// trace sums the diagonal of a left environment at one index of the bond, of charge zero.
func trace[T dense.Scalar](env *block.Tensor[T], bond Bond, index int) T {
	sum := dense.FromFloat[T](0)
	for i, b := range env.Blocks {
		first := env.Axes[1].Offset(b.Sectors[1])
		n, w := b.Shape[0], b.Shape[1]
		if index < first || index >= first+w || env.Axes[0].Sectors[b.Sectors[0]].Charge != env.Axes[2].Sectors[b.Sectors[2]].Charge {
			continue
		}
		data := env.Block(i)
		for r := range n {
			sum += data[(r*w+index-first)*b.Shape[2]+r]
		}
	}
	return sum
}

// contractRight returns <psi|o|psi>, contracted from the right end, and the largest element of each index of every environment.
func contractRight[T dense.Scalar](psi *mps.Chain[T], o *Operator[T], pool *task.Pool) (value float64, tops [][]float64) {
	var ws Workspace[T]
	n := o.Len()
	tops = make([][]float64, n+1)
	env := RightEdge(o, psi.Charge(), psi.Charge())
	tops[n] = largest(env, 0, o.Bonds[n].Dim())
	for i := n - 1; i >= 0; i-- {
		env = GrowRight(o, i, env, psi.Sites[i], psi.Sites[i], &ws, pool)
		tops[i] = largest(env, 0, o.Bonds[i].Dim())
	}
	return dense.Real(edgeValue(env, 0)), tops
}

// contractLeft returns <psi|o|psi>, contracted from the left end, and the sum of squares of the rounding model of Variance.
func contractLeft[T dense.Scalar](psi *mps.Chain[T], o *Operator[T], tops [][]float64, pool *task.Pool) (value, noise2 float64) {
	const step = 4 * 0x1p-52
	var ws Workspace[T]
	env := LeftEdge(o)
	for i := range o.Sites {
		size := norms(env, 1, o.Bonds[i].Dim())
		for _, e := range o.Sites[i] {
			x := step * dense.Abs(e.Value) * size[e.Left] * tops[i+1][e.Right]
			noise2 += x * x
		}
		env = GrowLeft(o, i, env, psi.Sites[i], psi.Sites[i], &ws, pool)
	}
	return dense.Real(edgeValue(env, 0)), noise2
}

// norms returns the Frobenius norm of an environment at each of n indices of its MPO axis.
func norms[T dense.Scalar](env *block.Tensor[T], axis, n int) []float64 {
	sums := make([]float64, n)
	eachIndex(env, axis, func(w int, x T) { a := dense.Abs(x); sums[w] += a * a })
	for w := range sums {
		sums[w] = math.Sqrt(sums[w])
	}
	return sums
}

// largest returns the largest element of an environment at each of n indices of its MPO axis.
func largest[T dense.Scalar](env *block.Tensor[T], axis, n int) []float64 {
	tops := make([]float64, n)
	eachIndex(env, axis, func(w int, x T) { tops[w] = max(tops[w], dense.Abs(x)) })
	return tops
}

// eachIndex visits all elements with their index on the axis.
func eachIndex[T dense.Scalar](t *block.Tensor[T], axis int, visit func(w int, x T)) {
	for i, b := range t.Blocks {
		first, inner := t.Axes[axis].Offset(b.Sectors[axis]), 1
		for _, d := range b.Shape[axis+1:] {
			inner *= d
		}
		for k, x := range t.Block(i) {
			visit(first+k/inner%b.Shape[axis], x)
		}
	}
}
