package mps

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Schmidt returns the Schmidt values of the cut after site b, 0 <= b < Len()-1: their squares add up to one, the sectors of the axis carry the
// charge of the sites left of the cut, Norm is that of the state. A zero state gives block.ErrZero. The chain does not change.
func (c *Chain[T]) Schmidt(b int, pool *task.Pool) (block.Spectrum, error) {
	if b < 0 || b >= c.Len()-1 {
		panic(fmt.Sprintf("mps: Schmidt values of cut %d of %v", b, c))
	}
	v, exponent := c.canonicalView(b, pool)
	_, r := qr(v.Sites[b], nil, pool)
	return spectrum(r, b, exponent, nil, pool)
}

// Spectra returns the Schmidt values of all Len()-1 cuts in one pass; see Schmidt.
func (c *Chain[T]) Spectra(pool *task.Pool) ([]block.Spectrum, error) {
	v, exponent := c.canonicalView(0, pool)
	all := make([]block.Spectrum, c.Len()-1)
	t := v.Sites[0]
	var ws block.Workspace[T]
	for b := range all {
		_, r := qr(t, &ws, pool)
		var err error
		if all[b], err = spectrum(r, b, exponent, &ws, pool); err != nil {
			return nil, err
		}
		t = multiply(r, v.Sites[b+1], []int{1}, []int{0}, nil, pool)
	}
	return all, nil
}

// canonicalView returns a view of c with its centre at a site; a factor 2^exponent is left out.
func (c *Chain[T]) canonicalView(center int, pool *task.Pool) (v *Chain[T], exponent int) {
	v = c.view()
	if v.Center < 0 {
		return v, v.gather(center, pool)
	}
	v.MoveCenter(center, pool)
	return v, 0
}

// spectrum decomposes the factor r (bond In, bond Out) that stands at cut b.
func spectrum[T dense.Scalar](r *block.Tensor[T], b, exponent int, ws *block.Workspace[T], pool *task.Pool) (block.Spectrum, error) {
	_, s, _, err := block.SVD(r, 1, block.Cut{}, ws, pool)
	if err != nil {
		return block.Spectrum{}, fmt.Errorf("mps: cut %d: %w", b, err)
	}
	for _, list := range s.Values {
		for i := range list {
			list[i] /= s.Norm
		}
	}
	s.Norm = math.Ldexp(s.Norm, exponent)
	return s, nil
}
