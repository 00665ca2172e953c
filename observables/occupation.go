package observables

import (
	"context"
	"runtime"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// Occupations returns for every site the probabilities of its local states, which add up to one: element k is that of state k in the
// order of the site's kind (boson: n = k). Where the frames turn the local axes (of spins and clocks) it is nil: the states are
// then those of another axis.
func Occupations(ctx context.Context, s *mps.State) ([][]float64, error) {
	var stored [][]float64
	var err error
	if c, ok := s.Real(); ok {
		stored, err = occupations(ctx, c)
	} else {
		c, _ := s.Complex()
		stored, err = occupations(ctx, c)
	}
	if err != nil {
		return nil, err
	}
	for i, frame := range s.Frames().Sites {
		if frame.Rotation != 0 {
			stored[i] = nil
			continue
		}
		own := make([]float64, len(stored[i]))
		for k, state := range frame.Order {
			own[state] = stored[i][k]
		}
		stored[i] = own
	}
	return stored, nil
}

// occupations goes through the sites with the orthogonality centre; states count in the order of the axes.
func occupations[T dense.Scalar](ctx context.Context, chain *mps.Chain[T]) ([][]float64, error) {
	pool := task.New(runtime.GOMAXPROCS(0))
	c := centred(chain, pool)
	center := c.Sites[0]
	if !(center.Norm() > 0) {
		return nil, errZero
	}
	out := make([][]float64, c.Len())
	var factors block.Workspace[T]
	for site := range out {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		out[site] = weights(center)
		if site+1 < c.Len() {
			var err error
			if center, err = moved(center, c.Sites[site+1], &factors, pool); err != nil {
				return nil, err
			}
		}
	}
	return out, nil
}

// weights adds up the squares of a site tensor by the state of the site, relative to all.
func weights[T dense.Scalar](t *block.Tensor[T]) []float64 {
	axis := t.Axes[1]
	out := make([]float64, axis.Dim())
	for i, b := range t.Blocks {
		data := t.Block(i)
		first := axis.Offset(b.Sectors[1])
		for l := range b.Shape[0] {
			for k := range b.Shape[1] {
				row := data[(l*b.Shape[1]+k)*b.Shape[2]:][:b.Shape[2]]
				n := dense.Norm(row)
				out[first+k] += n * n
			}
		}
	}
	var total float64
	for _, p := range out {
		total += p
	}
	for k := range out {
		out[k] /= total
	}
	return out
}
