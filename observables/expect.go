package observables

import (
	"context"
	"runtime"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Expectations returns <psi|P|psi>/<psi|psi> for every polynomial P, all in one pass.
func Expectations(ctx context.Context, s *mps.State, polys []*ladder.Polynomial) ([]complex128, error) {
	if c, ok := s.Real(); ok {
		return expectations(ctx, c, s.Frames(), polys)
	}
	c, _ := s.Complex()
	return expectations(ctx, c, s.Frames(), polys)
}

func expectations[T dense.Scalar](ctx context.Context, chain *mps.Chain[T], frames *ladder.Frames, polys []*ladder.Polynomial) ([]complex128, error) {
	out := make([]complex128, len(polys))
	f := newForest[T](chain.Len())
	for i, p := range polys {
		parts, err := neutralParts[T](frames, p)
		if err != nil {
			return nil, err
		}
		for _, q := range parts {
			out[i] += f.add(q.strings, i, q.weight)
		}
	}
	err := f.walk(ctx, chain, out)
	return out, err
}

// weighted is a sum of strings with a factor.
type weighted struct {
	strings *ladder.Strings
	weight  complex128
}

// neutralParts passes a polynomial through the frames, keeps what conserves the charges, and splits it into real parts for a
// real chain: p = a + i b.
func neutralParts[T dense.Scalar](frames *ladder.Frames, p *ladder.Polynomial) ([]weighted, error) {
	all, err := frames.StringsByCharge(p)
	if err != nil {
		return nil, err
	}
	for _, s := range all {
		if s.Charge != (block.Charge{}) {
			continue
		}
		if dense.IsComplex[T]() {
			return []weighted{{s, 1}}, nil
		}
		a, b := s.Split()
		return []weighted{{a, 1}, {b, 1i}}, nil
	}
	return nil, nil
}

// live is a beginning of strings with its environment, waiting for the next site.
type live[T dense.Scalar] struct {
	node *node[T]
	env  *block.Tensor[T] // axes (bra In, ket Out); total charge: what the operators so far add
}

// walk runs through the sites once. Left of the centre the chain is left-canonical, right of it right-canonical, so a string
// costs transfer steps on its own sites alone.
func (f *forest[T]) walk(ctx context.Context, chain *mps.Chain[T], out []complex128) error {
	pool := task.New(runtime.GOMAXPROCS(0))
	c := chain.Clone()
	c.Canonicalize(0, pool)
	center := c.Sites[0]
	norm := center.Norm()
	var active []live[T]
	for site := 0; site < c.Len(); site++ {
		if err := ctx.Err(); err != nil {
			return err
		}
		next := make([][]live[T], len(active)+1)
		values := make([][]contribution, len(active)+1)
		flops := float64(len(active)+1) * stepFlops(c.Sites[site])
		b, conj := c.Sites[site], c.Sites[site].Conj()
		here, hereConj := center, center.Conj()
		pool.Do(len(active)+1, flops, func(_, i int) {
			if i == len(active) {
				next[i], values[i] = f.step(f.starts[site], here, here, hereConj)
				return
			}
			t := block.Contract(active[i].env, b, []int{1}, []int{0})
			next[i], values[i] = f.step(active[i].node.children, t, b, conj)
		})
		active = active[:0:0]
		for i := range next {
			active = append(active, next[i]...)
			for _, v := range values[i] {
				out[v.result] += v.value * complex(1/(norm*norm), 0)
			}
		}
		if site+1 < c.Len() {
			_, r := block.QR(center, 2)
			center = block.Contract(r, c.Sites[site+1], []int{1}, []int{0})
		}
	}
	return nil
}

type contribution struct {
	result int
	value  complex128
}

// step applies the operators of nodes to t (axes bra, site, right) and either closes with bra or keeps the new environment.
func (f *forest[T]) step(nodes []*node[T], t, bra, conj *block.Tensor[T]) (next []live[T], values []contribution) {
	for _, n := range nodes {
		u := t
		if op := f.ops[n.op]; op != nil {
			u = block.Permute(block.Contract(t, op, []int{1}, []int{1}), 0, 2, 1)
		}
		if len(n.ends) > 0 {
			v := dense.ToComplex(overlap(bra, u))
			for _, e := range n.ends {
				values = append(values, contribution{e.result, e.weight * v})
			}
		}
		if len(n.children) > 0 {
			next = append(next, live[T]{n, block.Contract(conj, u, []int{0, 1}, []int{0, 1})})
		}
	}
	return next, values
}

// overlap is sum conj(a) b for tensors of equal structure; where the structures differ in charge it is zero.
func overlap[T dense.Scalar](a, b *block.Tensor[T]) T {
	if a.Total != b.Total {
		return dense.FromFloat[T](0)
	}
	return block.Dot(a, b)
}

// stepFlops estimates the cost of one transfer step.
func stepFlops[T dense.Scalar](a *block.Tensor[T]) float64 {
	var f float64
	for _, b := range a.Blocks {
		f += 4 * float64(b.Len) * float64(b.Shape[0])
	}
	return f
}
