package observables

import (
	"context"
	"errors"
	"runtime"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// errZero reports a state in which nothing can be measured.
var errZero = errors.New("observables: the state is zero; it has no expectation values")

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
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		parts, err := neutralParts[T](frames, p)
		if err != nil {
			return nil, err
		}
		for _, q := range parts {
			out[i] += f.add(q.strings, i, q.weight)
		}
	}
	if err := f.walk(ctx, chain, out); err != nil {
		return nil, err
	}
	return out, nil
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

// walk runs through the sites once with the orthogonality centre and adds the values of all strings to out. Left of the centre the chain
// is left-canonical, right of it right-canonical, so a string costs steps on its own sites alone.
func (f *forest[T]) walk(ctx context.Context, chain *mps.Chain[T], out []complex128) error {
	w := &walk[T]{ctx: ctx, pool: task.New(runtime.GOMAXPROCS(0)), forest: f}
	w.scratch = make([]block.Scratch[T], w.pool.Threads())
	c := centred(chain, w.pool)
	norm := c.Sites[0].Norm()
	if !(norm > 0) {
		return errZero
	}
	unit := complex(1/(norm*norm), 0)
	center := c.Sites[0]
	var factors block.Workspace[T]
	for site := range c.Sites {
		values, err := w.step(site, c.Sites[site], center)
		if err != nil {
			return err
		}
		for _, v := range values {
			out[v.result] += v.value * unit
		}
		if site+1 < c.Len() {
			if center, err = moved(center, c.Sites[site+1], &factors, w.pool); err != nil {
				return err
			}
		}
	}
	return nil
}

// centred is a chain with its centre at the first site; it shares what it can with c.
func centred[T dense.Scalar](c *mps.Chain[T], pool *task.Pool) *mps.Chain[T] {
	d := &mps.Chain[T]{Group: c.Group, Sites: append([]*block.Tensor[T](nil), c.Sites...), Center: c.Center}
	d.Canonicalize(0, pool) // replaces tensors, writes into none
	return d
}

// moved is the centre of the next site.
func moved[T dense.Scalar](center, next *block.Tensor[T], ws *block.Workspace[T], pool *task.Pool) (*block.Tensor[T], error) {
	_, r, err := block.QR(center, 2, ws, pool)
	if err != nil {
		return nil, err
	}
	p := block.PlanContract(r.Structure, next.Structure, []int{1}, []int{0})
	out := block.New[T](p.Out)
	block.RunContract(p, out.Data, r.Data, next.Data, nil, pool)
	return out, nil
}
