package mps

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// Canonicalize brings the chain to canonical form with its centre at the given site. Bonds wider than their surroundings can fill
// become narrower; the state does not change.
func (c *Chain[T]) Canonicalize(center int, pool *task.Pool) {
	c.mustSite("Canonicalize", center)
	if c.Center >= 0 {
		c.MoveCenter(center, pool)
		return
	}
	c.rescale(center, c.gather(center, pool))
}

// MoveCenter moves the centre to another site by QR and LQ factorizations of the sites between. An unknown centre is first found.
func (c *Chain[T]) MoveCenter(to int, pool *task.Pool) {
	c.mustSite("MoveCenter", to)
	if c.Center < 0 {
		c.Canonicalize(to, pool)
		return
	}
	var ws block.Workspace[T]
	for c.Center < to {
		c.stepRight(c.Center, &ws, pool)
		c.Center++
	}
	for c.Center > to {
		c.stepLeft(c.Center, &ws, pool)
		c.Center--
	}
}

func (c *Chain[T]) mustSite(what string, i int) {
	if i < 0 || i >= c.Len() {
		panic(fmt.Sprintf("mps: %s to site %d of %v", what, i, c))
	}
}

// gather canonicalizes a chain of unknown centre, up to a factor 2^exponent that is left out: tensors far from norm one
// could overflow on the way to a result that does not.
func (c *Chain[T]) gather(center int, pool *task.Pool) (exponent int) {
	var ws block.Workspace[T]
	for i := 0; i < center; i++ {
		c.stepRight(i, &ws, pool)
		exponent += balance(c.Sites[i+1])
	}
	for i := c.Len() - 1; i > center; i-- {
		c.stepLeft(i, &ws, pool)
		exponent += balance(c.Sites[i-1])
	}
	c.Center = center
	return exponent
}

// stepRight makes site i an isometry from the left and passes the rest on.
func (c *Chain[T]) stepRight(i int, ws *block.Workspace[T], pool *task.Pool) {
	q, r := qr(c.Sites[i], ws, pool)
	c.Sites[i], c.Sites[i+1] = q, multiply(r, c.Sites[i+1], []int{1}, []int{0}, nil, pool)
}

// stepLeft makes site i an isometry from the right and passes the rest on.
func (c *Chain[T]) stepLeft(i int, ws *block.Workspace[T], pool *task.Pool) {
	l, q, err := block.LQ(c.Sites[i], 1, ws, pool.Until(nil))
	if err != nil {
		panic(err) // as in qr
	}
	c.Sites[i-1], c.Sites[i] = multiply(c.Sites[i-1], l, []int{2}, []int{0}, nil, pool), q
}

// qr factors a site with its right bond on the right. What moves a centre returns no error: it does not ask the stop of the pool, the only
// reason to fail.
func qr[T dense.Scalar](t *block.Tensor[T], ws *block.Workspace[T], pool *task.Pool) (q, r *block.Tensor[T]) {
	q, r, err := block.QR(t, 2, ws, pool.Until(nil))
	if err != nil {
		panic(err)
	}
	return q, r
}

// balance divides t by a power of two, without rounding, so that its norm lies in [1/2, 1), and returns the exponent. Zero and what is not
// finite stay.
func balance[T dense.Scalar](t *block.Tensor[T]) (exponent int) {
	_, exponent = math.Frexp(t.Norm())
	if exponent != 0 {
		scaleBy(t, -exponent)
	}
	return exponent
}

// scaleBy multiplies t by 2^exponent, in steps that float64 holds.
func scaleBy[T dense.Scalar](t *block.Tensor[T], exponent int) {
	const step, all = 1000, 4000 // all: beyond any two finite numbers
	exponent = max(-all, min(exponent, all))
	for exponent != 0 {
		e := max(-step, min(exponent, step))
		t.Scale(dense.FromFloat[T](math.Ldexp(1, e)))
		exponent -= e
	}
}

// rescale multiplies site i, as gather left it, by 2^exponent.
func (c *Chain[T]) rescale(i, exponent int) {
	scaleBy(c.Sites[i], exponent)
}

// Norm returns the norm of the state. With an unknown centre it is found by factorizations from the left, exact to rounding also where
// large parts cancel.
func (c *Chain[T]) Norm() float64 {
	if c.Center >= 0 {
		return c.Sites[c.Center].Norm()
	}
	t, exponent := c.Sites[0], 0
	var ws block.Workspace[T]
	for i := 1; i < c.Len(); i++ {
		_, r := qr(t, &ws, nil)
		t = multiply(r, c.Sites[i], []int{1}, []int{0}, nil, nil)
		exponent += balance(t)
	}
	return math.Ldexp(t.Norm(), exponent)
}

// Normalize divides the state by its norm and returns the norm. A state whose norm is zero or not finite stays as it is.
func (c *Chain[T]) Normalize() float64 {
	norm := c.Norm()
	if norm > 0 && !math.IsInf(norm, 1) {
		// Two steps, for 1/norm may overflow.
		fraction, exponent := math.Frexp(norm)
		t := c.Sites[max(c.Center, 0)]
		t.Scale(dense.FromFloat[T](1 / fraction))
		scaleBy(t, -exponent)
	}
	return norm
}
