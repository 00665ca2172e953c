package dmrg

import (
	"context"
	"fmt"
	"math/rand/v2"
	"slices"
	"time"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Neighbours finds the ground states of several sectors, in their order, as Ground does each of them, but begins from the nearest one found: its state with
// particles added or removed, or spins flipped, somewhere. Sectors that no such step leads to, and those after a change of arithmetic, begin as in Ground.
// The options hold for each sector; Start serves the first that it fits. If ctx ends, the error is ctx's, and the last result is unfinished.
func Neighbours(ctx context.Context, h *ladder.Hamiltonian, sectors []ladder.Sector, opt Options) ([]*Result, error) {
	if opt.From != nil {
		return nil, fmt.Errorf("dmrg: a waypoint is where Ground goes on; several sectors begin from a state (Options.Start)")
	}
	opt.OnWaypoint = nil
	begin := time.Now()
	var all []*Result
	var near neighbourhood
	for _, sector := range sectors {
		p, err := begun(ctx, h, sector, opt, begin)
		if err != nil {
			return all, err
		}
		var r *Result
		switch {
		case p.rewritten != nil:
			r, err = neighbour(p, &near, p.rewritten.state)
		case p.strings.Real && !opt.Complex:
			r, err = neighbour(p, &near, mps.NewReal)
		default:
			r, err = neighbour(p, &near, mps.NewComplex)
		}
		if r != nil {
			all = append(all, r)
		}
		if err != nil {
			return all, err
		}
		opt.Start = nil
	}
	return all, nil
}

// neighbourhood are the ground states found, as their searches see them.
type neighbourhood struct {
	real    []*mps.Chain[float64]
	complex []*mps.Chain[complex128]
}

func chainsOf[T dense.Scalar](n *neighbourhood) *[]*mps.Chain[T] {
	var own any = &n.real
	if dense.IsComplex[T]() {
		own = &n.complex
	}
	return own.(*[]*mps.Chain[T])
}

// neighbour finds the ground state of one sector.
func neighbour[T dense.Scalar](p *problem, near *neighbourhood, wrap wrapper[T]) (*Result, error) {
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	if err != nil {
		return nil, err
	}
	total, err := pickTotal(p, op)
	if err != nil {
		return nil, err
	}
	known := chainsOf[T](near)
	var start *mps.Chain[T]
	if p.opt.Start == nil {
		start = warmStart(p, total, *known)
	}
	l := newLevels(p, op, total, wrap)
	s := newSearch[T](p)
	if start == nil {
		if err := s.begin(p, op, total); err != nil {
			return nil, err
		}
	} else {
		s.engine, s.warm = newEngine(op, start, p.opt, p.halt), true
	}
	r, err := l.run(s)
	if err == nil {
		*known = append(*known, s.engine.psi)
	}
	return r, err
}

// warmWeight is what a start may lose: it is but a start.
const warmWeight = 1e-6

// warmStart makes a start in a sector from the nearest of the states known; nil where there is none, or no way.
func warmStart[T dense.Scalar](p *problem, total block.Charge, known []*mps.Chain[T]) *mps.Chain[T] {
	var best *mps.Chain[T]
	var way []block.Charge
	for _, c := range known {
		if c.Group != p.strings.Group || c.Len() != len(p.strings.Axes) || !sameAxes(c, p.strings.Axes) {
			continue
		}
		if steps, ok := stepsTo(p.strings, p.strings.Group.Sub(total, c.Charge())); ok && (best == nil || len(steps) < len(way)) {
			best, way = c, steps
		}
	}
	if best == nil {
		return nil
	}
	rng := rand.New(rand.NewPCG(p.opt.Seed, warmStream))
	// One stage of growth leads to about the bond dimension of the neighbour.
	bond := max(firstBond, int(float64(best.MaxBond())/unknownFactor))
	for _, step := range way {
		if best = stepped(best, step, rng); best == nil {
			return nil
		}
		if _, err := best.Truncate(block.Cut{Bond: bond, Weight: warmWeight}, nil); err != nil {
			return nil // nothing is left: the step is not possible in this state
		}
	}
	return best
}

const (
	warmStream  = 0x7761726d // sets the random numbers of starts apart
	mostReached = 2000       // differences of charge looked at on the way to a neighbour
)

func sameAxes[T dense.Scalar](c *mps.Chain[T], axes []block.Axis) bool {
	for i, a := range axes {
		if !c.Sites[i].Axes[1].Equal(a) {
			return false
		}
	}
	return true
}

// stepsTo splits a difference of charges into the fewest steps that single sites can take.
func stepsTo(s *ladder.Strings, difference block.Charge) (way []block.Charge, ok bool) {
	steps := siteSteps(s)
	before := map[block.Charge]block.Charge{{}: {}} // the last step to what was reached
	reached := []block.Charge{{}}
	for k := 0; k < len(reached) && len(reached) < mostReached; k++ {
		if reached[k] == difference {
			break
		}
		for _, step := range steps {
			q := s.Group.Add(reached[k], step)
			if _, seen := before[q]; !seen {
				before[q] = step
				reached = append(reached, q)
			}
		}
	}
	if _, seen := before[difference]; !seen {
		return nil, false
	}
	for q := difference; q != (block.Charge{}); q = s.Group.Sub(q, before[q]) {
		way = append(way, before[q])
	}
	return way, true
}

// siteSteps lists the differences of charge between two states of a site, in order.
func siteSteps(s *ladder.Strings) []block.Charge {
	var steps []block.Charge
	for _, a := range s.Axes {
		for _, to := range a.Sectors {
			for _, from := range a.Sectors {
				if step := s.Group.Sub(to.Charge, from.Charge); step != (block.Charge{}) && !slices.Contains(steps, step) {
					steps = append(steps, step)
				}
			}
		}
	}
	slices.SortFunc(steps, block.Charge.Compare)
	return steps
}

// stepped applies the sum over the sites of x_i R_i, x_i random and positive, where R_i leads from each local state to all whose charge is larger by step. Bonds
// carry the states of before with none of the R applied, and those with one of them, shifted by the step: dimensions double. It is nil where no site of
// the chain can take the step.
func stepped[T dense.Scalar](c *mps.Chain[T], step block.Charge, rng *rand.Rand) *mps.Chain[T] {
	g, last := c.Group, c.Len()-1
	shifted := func(a block.Axis) []block.Sector {
		var out []block.Sector
		for _, s := range a.Sectors {
			out = append(out, block.Sector{Charge: g.Add(s.Charge, step), Dim: s.Dim})
		}
		return out
	}
	out := &mps.Chain[T]{Group: g, Sites: make([]*block.Tensor[T], c.Len()), Center: -1}
	left := c.Sites[0].Axes[0]
	for i, a := range c.Sites {
		right := block.NewAxis(block.Out, shifted(a.Axes[2])...)
		if i < last {
			right = block.NewAxis(block.Out, append(shifted(a.Axes[2]), a.Axes[2].Sectors...)...)
		}
		t := block.New[T](block.NewStructure(g, []block.Axis{left, a.Axes[1], right}, block.Charge{}))
		x := dense.FromFloat[T](0.5 + rng.Float64())
		for k := range a.Blocks {
			if i < last {
				put(t, a, k, block.Charge{}, block.Charge{}, nil, dense.FromFloat[T](1))
			}
			if i > 0 {
				put(t, a, k, step, step, nil, dense.FromFloat[T](1))
			}
			put(t, a, k, block.Charge{}, step, &step, x)
		}
		out.Sites[i] = t
		left = right.Reversed()
	}
	if !(out.Norm() > 0) {
		return nil
	}
	return out
}

// put adds x times block k of a to t, its bonds shifted by the charges l and r. Shifted states come last in their sectors, the others first. Where move is
// given, each local state goes to all whose charge is larger by that.
func put[T dense.Scalar](t, a *block.Tensor[T], k int, l, r block.Charge, move *block.Charge, x T) {
	g, from := a.Group, &a.Blocks[k]
	charge := func(axis int) block.Charge { return a.Axes[axis].Sectors[from.Sectors[axis]].Charge }
	site := charge(1)
	if move != nil {
		site = g.Add(site, *move)
	}
	li, okL := t.Axes[0].Find(g.Add(charge(0), l))
	si, okS := t.Axes[1].Find(site)
	ri, okR := t.Axes[2].Find(g.Add(charge(2), r))
	if !okL || !okS || !okR {
		return
	}
	at, ok := t.Find(li, si, ri)
	if !ok {
		return
	}
	to := &t.Blocks[at]
	row, col := 0, 0
	if l != (block.Charge{}) {
		row = to.Shape[0] - from.Shape[0]
	}
	if r != (block.Charge{}) {
		col = to.Shape[2] - from.Shape[2]
	}
	src, dst, width := a.Block(k), t.Block(at), from.Shape[2]
	for i := range from.Shape[0] {
		for s := range from.Shape[1] {
			line := src[(i*from.Shape[1]+s)*width:][:width]
			for u := range to.Shape[1] {
				if move == nil && u != s {
					continue
				}
				dense.Axpy(x, line, dst[((row+i)*to.Shape[1]+u)*to.Shape[2]+col:][:width])
			}
		}
	}
}
