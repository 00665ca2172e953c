package dmrg

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps/block"
)

// Settings of the choice among the values of free charges.
const (
	scoutBond  = 32
	totalLimit = 1 << 18 // values of the free charges listed
	lookAtAll  = 12      // up to so many are all looked at
	walkStarts = 64      // product states compared for the start of a walk
)

// pickTotal returns the target where every charge is named, that of the start state where there is one; else the total of lowest energy among
// the values of the free charges.
//
// Each total looked at gets a scout, a short search. Up to a dozen totals are all looked at. Of more, a walk starts at the total whose product
// state has the lowest diagonal energy and steps to lower neighbours, at a distance that is halved as often as none is lower, down to one and
// two steps of every charge: for energies convex in the charges, which thermodynamic stability asks of a bulk, up to an alternation of even
// and odd values, that is the global minimum. At last the scouts of the lowest are sent on, at growing bond dimensions, until their error
// bars separate or nothing is left to gain.
//
// At the cap on time it returns the best so far.
func pickTotal[T dense.Scalar](p *problem, op *mpo.Operator[T]) (block.Charge, error) {
	if p.opt.From != nil {
		return p.opt.From.charge(), nil
	}
	if p.opt.Start != nil {
		return p.totalOfStart()
	}
	totals, all := p.frames.Totals(p.target, totalLimit)
	switch {
	case len(totals) == 0:
		return block.Charge{}, fmt.Errorf("dmrg: no state of the ladder lies in the sector")
	case len(totals) == 1:
		return totals[0], nil
	case !all:
		return block.Charge{}, fmt.Errorf("dmrg: the sector leaves more than %d values of the conserved charges open; name some of %v", totalLimit, p.freeNames())
	}
	c := &choice[T]{p: p, op: op, scouts: make(map[block.Charge]*scout[T]), totals: totals, spacing: spacings(totals)}
	best, err := c.lowest()
	if errors.Is(err, errTime) {
		p.undecided, err = true, nil
	}
	return best, err
}

// freeNames lists the charges that the target leaves open.
func (p *problem) freeNames() (names []string) {
	for i, free := range p.target.Free {
		if free {
			names = append(names, p.frames.Charges[i].Name)
		}
	}
	return names
}

// totalOfStart lets the start state decide what the sector leaves open. A start that does not fit is reported later.
func (p *problem) totalOfStart() (block.Charge, error) {
	total := p.target.Charge
	start := p.opt.Start
	for i, free := range p.target.Free {
		if free && start.Frames().Group == p.frames.Group {
			total[i] = start.Charge()[i]
		}
	}
	return total, nil
}

// choice looks for the total of lowest energy.
type choice[T dense.Scalar] struct {
	p       *problem
	op      *mpo.Operator[T]
	totals  []block.Charge // those that most basis states have first
	spacing [block.MaxCharges]int64
	scouts  map[block.Charge]*scout[T]
	best    block.Charge // of those looked at
}

// scout is a short search in one sector.
type scout[T dense.Scalar] struct {
	total  block.Charge
	search *search[T]
	est    estimate
}

// energy is an upper bound of the lowest energy of the sector, low a lower one as far as the estimate goes.
func (s *scout[T]) energy() float64 { return s.search.stages[len(s.search.stages)-1].energy() }
func (s *scout[T]) low() float64    { return s.est.limit - s.est.err }

func (c *choice[T]) lowest() (block.Charge, error) {
	c.best = c.totals[0]
	near := c.totals
	if len(c.totals) > lookAtAll {
		if err := c.walkStart(); err != nil {
			return c.best, err
		}
		var err error
		if near, err = c.walk(); err != nil {
			return c.best, err
		}
	}
	for _, q := range near {
		if _, err := c.look(q); err != nil {
			return c.best, err
		}
	}
	return c.separate(near)
}

// look sends a scout to a total, once, and keeps the best up to date: of equals, the first.
func (c *choice[T]) look(q block.Charge) (*scout[T], error) {
	if s := c.scouts[q]; s != nil {
		return s, nil
	}
	psi, err := productChain[T](c.p, q)
	if err != nil {
		return nil, err
	}
	s := &scout[T]{total: q, search: newSearch[T](c.p)}
	s.search.engine = newEngine(c.op, psi, c.p.opt, c.p.halt)
	s.search.opt.OnSweep, s.search.opt.OnStage, s.search.opt.Sweeps = nil, nil, math.MaxInt
	if err := s.search.engine.prepare(); err != nil {
		return nil, err
	}
	if err := s.goOn(min(scoutBond, c.p.opt.Bond)); err != nil {
		return nil, err
	}
	c.scouts[q] = s
	if b := c.scouts[c.best]; b == nil || s.energy() < b.energy()-c.tie() {
		c.best = q
	}
	for _, s := range c.scouts {
		if s.low() > c.scouts[c.best].energy()+c.p.opt.Precision {
			s.search.engine = nil // out of the race: its memory is of use elsewhere
		}
	}
	return s, nil
}

// tie is the difference of energies that says nothing.
func (c *choice[T]) tie() float64 { return 1e-9 * c.p.scale }

// goOn settles one bond dimension.
func (s *scout[T]) goOn(bond int) error {
	_, _, err := s.search.stage(bond)
	s.est = s.search.estimate()
	return err
}

// walkStart sets out from the total with the lowest diagonal energy of a product state; of equals, the first.
func (c *choice[T]) walkStart() error {
	stride := 1 + len(c.totals)/walkStarts
	low := math.Inf(1)
	for i := 0; i < len(c.totals); i += stride {
		_, e, err := c.p.starter.states(c.totals[i])
		if err != nil {
			return err
		}
		if e < low-c.tie() {
			c.best, low = c.totals[i], e
		}
	}
	return nil
}

// walk steps to lower totals until none of the nearest is lower, and returns those with the last one.
func (c *choice[T]) walk() ([]block.Charge, error) {
	if _, err := c.look(c.best); err != nil {
		return nil, err
	}
	for reach := c.span() / 4; ; {
		at := c.best
		ring := c.around(at, max(1, reach))
		for _, q := range ring {
			if _, err := c.look(q); err != nil {
				return nil, err
			}
			if c.best != at {
				break // the first that is lower will do
			}
		}
		if c.best != at {
			continue
		}
		if reach <= 1 {
			return append([]block.Charge{at}, ring...), nil
		}
		reach /= 2
	}
}

// span is the widest range of a charge among the totals.
func (c *choice[T]) span() int64 {
	var widest int64
	for k := range c.p.strings.Group.Len() {
		low, top := c.totals[0][k], c.totals[0][k]
		for _, q := range c.totals {
			low, top = min(low, q[k]), max(top, q[k])
		}
		widest = max(widest, int64(top)-int64(low))
	}
	return widest
}

// around returns the totals to compare with: for every direction (the signs of the steps of the charges) the one whose distance is nearest to
// reach; at reach 1 all within two steps of each charge. The closest come first.
func (c *choice[T]) around(at block.Charge, reach int64) []block.Charge {
	var all []spot
	byDirection := make(map[block.Charge]spot)
	for _, q := range c.totals {
		s := c.spot(at, q, reach)
		switch {
		case q == at:
		case reach <= 1 && s.steps <= pairSteps:
			all = append(all, s)
		case reach > 1:
			if old, ok := byDirection[s.direction]; !ok || s.compare(old) < 0 {
				byDirection[s.direction] = s
			}
		}
	}
	for _, s := range byDirection {
		all = append(all, s)
	}
	slices.SortFunc(all, spot.compare)
	ring := make([]block.Charge, len(all))
	for i, s := range all {
		ring[i] = s.q
	}
	return ring
}

// pairSteps is how far the last look around goes: pairs of particles move by two.
const pairSteps = 2

// spot is a total seen from another.
type spot struct {
	q, direction block.Charge
	miss         int64 // of the largest difference of a charge against the wanted one
	apart        int64 // squared distance
	steps        int64 // largest number of steps of a charge
}

func (c *choice[T]) spot(at, q block.Charge, reach int64) spot {
	s := spot{q: q}
	var far int64
	for k := range c.p.strings.Group.Len() {
		d := int64(q[k]) - int64(at[k])
		s.direction[k] = int32(cmp.Compare(d, 0))
		s.apart += d * d
		d = max(d, -d)
		far, s.steps = max(far, d), max(s.steps, d/c.spacing[k])
	}
	s.miss = max(far-reach, reach-far)
	return s
}

func (s spot) compare(o spot) int {
	return cmp.Or(cmp.Compare(s.miss, o.miss), cmp.Compare(s.apart, o.apart), s.q.Compare(o.q))
}

// spacings returns the smallest difference of two values of each charge among the totals, 1 where there is one value.
func spacings(totals []block.Charge) (least [block.MaxCharges]int64) {
	for k := range least {
		values := make([]int32, len(totals))
		for i, q := range totals {
			values[i] = q[k]
		}
		slices.Sort(values)
		for i := 1; i < len(values); i++ {
			if d := int64(values[i]) - int64(values[i-1]); d > 0 && (least[k] == 0 || d < least[k]) {
				least[k] = d
			}
		}
		least[k] = max(1, least[k])
	}
	return least
}

// separate sends the scouts of the totals on until one is the lowest beyond error bars, or all that may be the lowest are known to the wanted
// precision: then they are degenerate for the user, and the first of them, in the order of the totals, stands for all.
func (c *choice[T]) separate(near []block.Charge) (block.Charge, error) {
	for bond := min(scoutBond, c.p.opt.Bond); ; bond = min(c.p.opt.Bond, 2*bond) {
		low := c.scouts[near[0]].energy()
		for _, q := range near {
			low = min(low, c.scouts[q].energy())
		}
		var rivals []block.Charge
		known := true
		for _, q := range near {
			s := c.scouts[q]
			if s.low() > low+c.p.opt.Precision {
				s.search.engine = nil
				continue
			}
			rivals = append(rivals, q)
			known = known && s.est.err <= c.p.opt.Precision
		}
		near = rivals
		if len(near) == 1 || known || bond >= c.p.opt.Bond {
			return c.firstLowest(near), nil
		}
		next := min(c.p.opt.Bond, 2*bond)
		for _, q := range near {
			s := c.scouts[q]
			if s.search.affordable(bond, next) < next {
				return c.firstLowest(near), nil
			}
			if s.est.err > c.p.opt.Precision {
				if err := s.goOn(next); err != nil {
					return c.best, err
				}
			}
		}
	}
}

// firstLowest is the first of the totals, in their order, within the precision of the lowest.
func (c *choice[T]) firstLowest(near []block.Charge) block.Charge {
	low := math.Inf(1)
	for _, q := range near {
		low = min(low, c.scouts[q].energy())
	}
	for _, q := range c.totals {
		if slices.Contains(near, q) && c.scouts[q].energy() <= low+max(c.p.opt.Precision, c.tie()) {
			return q
		}
	}
	return near[0]
}
