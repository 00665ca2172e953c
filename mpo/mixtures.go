package mpo

import (
	"rundle/internal/dense"
	"rundle/mps/block"
)

// mixtures places the matrices of one side's mixtures in a slab. Mixtures of one term alone are read from the environment.
type mixtures[T dense.Scalar] struct {
	list    []mixture[T]
	env     *block.Structure
	left    bool
	sectors int       // of the ket's bond
	at      []int     // place by mixture * sectors + ket sector; -1 before its first use
	parts   []mixPart // what to fill in
	size    int
}

// mixPart is one matrix of a mixture: that of an environment block.
type mixPart struct{ mixture, block, at int }

func newMixtures[T dense.Scalar](list []mixture[T], env *block.Structure, left bool) *mixtures[T] {
	axis := 1
	if left {
		axis = 2
	}
	m := &mixtures[T]{list: list, env: env, left: left, sectors: len(env.Axes[axis].Sectors)}
	m.at = make([]int, len(list)*m.sectors)
	for i := range m.at {
		m.at[i] = -1
	}
	return m
}

// matrix tells where a mixture stands for a block of the environment, ket its sector on the ket's bond: the slab, the offset and the distance of
// rows there.
func (m *mixtures[T]) matrix(mix, e, ket int) (from operand, at, ld int) {
	x, b := &m.list[mix], &m.env.Blocks[e]
	rows, cols := b.Shape[1], b.Shape[2]
	from = rightMixed
	if m.left {
		rows, from = b.Shape[0], leftMixed
	}
	if len(x.terms) == 1 && x.unit == 0 {
		if m.left {
			return leftEnvironment, b.Offset + x.terms[0].inner*cols, b.Shape[1] * cols
		}
		return rightEnvironment, b.Offset + x.terms[0].inner*rows*cols, cols
	}
	if m.at[mix*m.sectors+ket] < 0 {
		s := slab{m.size}
		at = s.take(rows * cols)
		m.size = s.size
		m.at[mix*m.sectors+ket] = at
		m.parts = append(m.parts, mixPart{mix, e, at})
	}
	return from, m.at[mix*m.sectors+ket], cols
}

// fill writes all matrices to dst.
func (m *mixtures[T]) fill(dst, env []T) {
	for i := range m.parts {
		m.fillPart(i, dst, env)
	}
}

func (m *mixtures[T]) fillPart(i int, dst, env []T) {
	p := &m.parts[i]
	x, b := &m.list[p.mixture], &m.env.Blocks[p.block]
	rows, cols, ld, step := b.Shape[1], b.Shape[2], b.Shape[2], b.Shape[1]*b.Shape[2]
	if m.left {
		rows, ld, step = b.Shape[0], b.Shape[1]*b.Shape[2], b.Shape[2]
	}
	for r := range rows {
		row := dst[p.at+r*cols:][:cols]
		for k, t := range x.terms {
			from := b.Offset + t.inner*step + r*ld
			if k == 0 {
				copy(row, env[from:from+cols])
				dense.Scale(t.value, row)
			} else {
				dense.Axpy(t.value, env[from:from+cols], row)
			}
		}
		if x.unit != 0 {
			row[r] += x.unit
		}
	}
}

// isIdentity tells whether an environment is exactly the identity at an index of its MPO bond: growth across isometries makes it so.
func isIdentity[T dense.Scalar](env *block.Tensor[T], left bool, at place) bool {
	bond, bra, ket := 1, 0, 2
	if !left {
		bond, bra, ket = 0, 2, 1
	}
	if at == nowhere || env.Axes[bond].Sectors[at.sector].Charge != (block.Charge{}) || !env.Axes[bra].Equal(env.Axes[ket].Reversed()) {
		return false
	}
	for i := range env.Blocks {
		b := &env.Blocks[i]
		if b.Sectors[bond] != at.sector {
			continue
		}
		n := b.Shape[2]
		data, ld := env.Data[b.Offset+at.inner*n*n:], n
		if left {
			data, ld = env.Data[b.Offset+at.inner*n:], b.Shape[1]*n
		}
		for r := range n {
			for c, x := range data[r*ld : r*ld+n] {
				if r == c && x != 1 || r != c && x != 0 {
					return false
				}
			}
		}
	}
	return true
}
