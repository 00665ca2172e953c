package mpo

import (
	"fmt"

	"rundle/internal/dense"
)

// maxDense bounds the dimension of a dense matrix: 4096² complex numbers take 256 MiB.
const maxDense = 4096

// Dense returns the row-major matrix <out|o|in> over all product states, the last site running fastest, each site's states in
// the order of its axis. It is for checks on a few sites; more than 4096 states panic.
func (o *Operator[T]) Dense() []T {
	total := 1
	for _, d := range o.dims() {
		if total *= d; total > maxDense {
			panic(fmt.Sprintf("mpo: dense matrix of an operator on local dimensions %v; at most %d states", o.dims(), maxDense))
		}
	}
	// parts[w] is the matrix of all that leads to index w, on the sites done so far.
	parts, n := [][]T{{dense.FromFloat[T](1)}}, 1
	for i, entries := range o.Sites {
		d := o.Phys[i].Dim()
		next := make([][]T, o.Bonds[i+1].Dim())
		for w := range next {
			next[w] = make([]T, n*d*n*d)
		}
		for _, e := range entries {
			from, to := parts[e.Left], next[e.Right]
			for r := range n {
				for c := range n {
					to[(r*d+int(e.Out))*n*d+c*d+int(e.In)] += from[r*n+c] * e.Value
				}
			}
		}
		parts, n = next, n*d
	}
	return parts[0]
}
