package dmrg

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"time"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// Spectrum is the low end of the levels of a sector.
type Spectrum struct {
	Levels     []Level // by increasing EnergyLimit
	Multiplets []Multiplet
	Whole      bool    // the last multiplet is known to be complete
	Reason     string  // why it is not
	Flops      float64 // real operations of all searches
}

// Level is one state of a spectrum. Its error bar holds what the states below it leave undone.
type Level struct {
	*Result
	Multiplet     int     // states whose energies differ by no more than their error bars share it; from 0
	Gap, GapError float64 // EnergyLimit above that of the lowest state
}

// Multiplet is a group of levels that the error bars do not tell apart. What its states have in common, such as the mean of an observable, is
// defined better than each of them is.
type Multiplet struct {
	First, Count        int     // Levels[First : First+Count]
	Energy, EnergyError float64 // mean of the limits and of the errors
	Splitting           float64 // highest limit less lowest one
	SplittingBound      float64 // bounds the splitting of the exact levels
}

// extraLevels bounds the states beyond those asked for that complete the last multiplet.
const extraLevels = 12

// Lowest finds the k lowest states of h in a sector, and those that belong to the multiplet of the last: each as Ground does, orthogonal to those below.
// States that the error bars do not tell apart, or that mix, are then searched for together. Charges that the sector does not name are left free as
// long as they have few values, and levels of all of them returned. There are fewer levels than k where the sector has fewer states, or where the
// time ends; the verdict of each says how far it got.
//
// Precision holds for each level. If ctx ends, the error is ctx's, and the spectrum holds the levels so far, the last of them unfinished.
func Lowest(ctx context.Context, h *ladder.Hamiltonian, sector ladder.Sector, k int, opt Options) (*Spectrum, error) {
	if k < 1 {
		return nil, fmt.Errorf("dmrg: %d states asked for: want one or more", k)
	}
	if opt.From != nil {
		return nil, errors.New("dmrg: a waypoint is where Ground goes on; Lowest goes on from states (Options.Start and Levels)")
	}
	opt.OnWaypoint = nil
	p, err := begun(ctx, h, sector, opt, time.Now())
	if err != nil {
		return nil, err
	}
	defer p.opt.depot.remove()
	if k > 1 {
		p.opt.Precision *= lowerShare // the rest is for what lower states leave
	}
	if p.rewritten != nil {
		return lowest(p, k, p.rewritten.state)
	}
	if p.strings.Real && !opt.Complex {
		return lowest(p, k, mps.NewReal)
	}
	return lowest(p, k, mps.NewComplex)
}

// lowerShare is the part of the precision that a search for a level may use up by itself.
const lowerShare = 0.5

// climb finds the lowest levels over several totals.
type climb[T dense.Scalar] struct {
	from   *problem
	k      int
	owners []*levels[T]
	spent  float64
	reason string
}

func lowest[T dense.Scalar](p *problem, k int, wrap wrapper[T]) (*Spectrum, error) {
	totals, err := p.totals()
	if err != nil {
		return nil, err
	}
	op, err := mpo.Build[T](p.strings, mpo.Options{})
	if err != nil {
		return nil, err
	}
	c := &climb[T]{from: p, k: k}
	for _, q := range totals {
		c.owners = append(c.owners, newLevels(p, op, q, wrap))
	}
	if err = c.search(); err == nil {
		err = c.refine()
	}
	if err != nil {
		c.reason = "the search was ended"
	}
	return c.spectrum(), err
}

// totals are the values of the charges in which levels are looked for.
func (p *problem) totals() ([]block.Charge, error) {
	if p.opt.Start != nil {
		total, err := p.totalOfStart()
		return []block.Charge{total}, err
	}
	totals, all := p.frames.Totals(p.target, totalLimit)
	if len(totals) == 0 {
		return nil, fmt.Errorf("dmrg: no state of the ladder lies in the sector")
	}
	if !all || len(totals) > lookAtAll {
		return nil, fmt.Errorf("dmrg: the sector leaves more than %d values of the conserved charges open, too many for several levels; name some of %v", lookAtAll, p.freeNames())
	}
	return totals, nil
}

// search finds levels where the next may be hidden, until no total can hide one below the top of what was asked for.
func (c *climb[T]) search() error {
	for {
		l, limit := c.hidden()
		if l == nil {
			return nil
		}
		start, err := c.startOf(l)
		if err != nil {
			return err
		}
		r, err := l.next(start, limit)
		if err != nil {
			return err
		}
		if c.spent += r.Flops; c.from.opt.OnLevel != nil && r.Verdict != unfinished {
			c.from.opt.OnLevel(r)
		}
		if r.Verdict == TimeCap {
			c.reason = "the time is up"
			return nil
		}
	}
}

// startOf is where the search for the next level of a total begins.
func (c *climb[T]) startOf(l *levels[T]) (*mps.Chain[T], error) {
	n := len(l.found)
	for _, s := range c.from.opt.Levels {
		if s.Frames().Group == c.from.frames.Group && s.Charge() == l.total {
			if n == 0 {
				return givenChain[T](c.from, s, l.total)
			}
			n--
		}
	}
	if len(l.found) == 0 {
		return startChain[T](c.from, l.total)
	}
	return l.start()
}

// hidden returns the total where the lowest level not found may be, if that may lie within the top multiplet asked for, and a limit above which
// it does not. A total that was not looked at comes first.
func (c *climb[T]) hidden() (*levels[T], float64) {
	all := c.sorted()
	top, whole := c.top(all)
	var best *levels[T]
	low := math.Inf(1)
	for _, l := range c.owners {
		if l.exhausted() {
			continue
		}
		bound := math.Inf(-1)
		if n := len(l.found); n > 0 {
			last := l.found[n-1].result
			bound = max(last.EnergyLimit-last.EnergyError, l.cleared)
			if math.IsNaN(bound) {
				continue // nothing is known of its levels
			}
		}
		if bound < low {
			best, low = l, bound
		}
	}
	switch {
	case best == nil || low > top:
		return nil, 0
	case !whole && len(all) >= c.k+extraLevels:
		c.reason = fmt.Sprintf("the last multiplet has more than %d states within the error bars", extraLevels)
		return nil, 0
	}
	return best, top
}

// sorted lists what was found by its energies.
func (c *climb[T]) sorted() []*found[T] {
	var all []*found[T]
	for _, l := range c.owners {
		all = append(all, l.found...)
	}
	slices.SortStableFunc(all, func(a, b *found[T]) int { return cmp.Compare(a.result.EnergyLimit, b.result.EnergyLimit) })
	return all
}

// top is the energy below which a level belongs to what was asked for, +Inf where less than that was found; whole is whether something was found
// above it.
func (c *climb[T]) top(all []*found[T]) (top float64, whole bool) {
	if len(all) < c.k {
		return math.Inf(1), true
	}
	n := c.k
	for n < len(all) && together(all[n-1].result, all[n].result) {
		n++
	}
	last := all[n-1].result
	return last.EnergyLimit + last.EnergyError, n < len(all)
}

// together is whether the error bars of two levels, the lower one first, leave open that they are equal.
func together(a, b *Result) bool { return b.EnergyLimit-a.EnergyLimit <= a.EnergyError+b.EnergyError }

// spectrum puts together what was found.
func (c *climb[T]) spectrum() *Spectrum {
	s := &Spectrum{Flops: c.spent, Whole: c.reason == "", Reason: c.reason}
	all := c.sorted()
	for i, f := range all {
		if i > 0 && !together(all[i-1].result, f.result) {
			if i >= c.k {
				break
			}
			s.close(i)
		}
		level := Level{Result: f.result, Multiplet: len(s.Multiplets)}
		if i > 0 {
			level.Gap, level.GapError = f.result.EnergyLimit-all[0].result.EnergyLimit, f.result.EnergyError+all[0].result.EnergyError
		}
		s.Levels = append(s.Levels, level)
	}
	s.close(len(s.Levels))
	if !s.Whole {
		s.doubt()
	}
	return s
}

// doubt takes back what was said of the last multiplet where it may have more states.
func (s *Spectrum) doubt() {
	for i := range s.Levels {
		if l := s.Levels[i]; l.Multiplet == len(s.Multiplets)-1 && l.Verdict == Converged {
			l.Verdict, l.Result.Reason = Suspect, "this multiplet may have more states: "+s.Reason
		}
	}
}

// close ends a multiplet before level i.
func (s *Spectrum) close(i int) {
	m := Multiplet{}
	if n := len(s.Multiplets); n > 0 {
		m.First = s.Multiplets[n-1].First + s.Multiplets[n-1].Count
	}
	group := s.Levels[m.First:i]
	if len(group) == 0 {
		return
	}
	m.Count = len(group)
	low, high := math.Inf(1), math.Inf(-1)
	for _, l := range group {
		m.Energy += l.EnergyLimit / float64(m.Count)
		m.EnergyError += l.EnergyError / float64(m.Count)
		low, high = min(low, l.EnergyLimit-l.EnergyError), max(high, l.EnergyLimit+l.EnergyError)
	}
	m.Splitting = group[m.Count-1].EnergyLimit - group[0].EnergyLimit
	if m.Count > 1 {
		m.SplittingBound = high - low
	}
	s.Multiplets = append(s.Multiplets, m)
}

// refine takes the lowest combinations of the states of each total.
func (c *climb[T]) refine() error {
	for _, l := range c.owners {
		if len(l.found) > 1 {
			if err := l.refine(); err != nil {
				if errors.Is(err, errTime) {
					c.reason = "the time is up"
					return nil
				}
				return err
			}
		}
	}
	return nil
}
