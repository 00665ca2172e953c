package ladder

import "math"

// whole is an expression that must be a whole number.
type whole struct {
	x  expr
	at origin
}

func (w whole) eval(f *frame) (int, error) {
	v, err := w.x.eval(f)
	if err != nil {
		return 0, err
	}
	r := real(v.z)
	if v.ops != nil || imag(v.z) != 0 {
		return 0, w.at.fail("", "expected a whole number")
	}
	if r != math.Trunc(r) || math.Abs(r) > 1e9 {
		return 0, w.at.fail("", "expected a whole number, got %s", formatReal(r))
	}
	return int(r), nil
}

// rungIndex is the rung of an operator. A rung beyond the ends wraps on a ring and leaves the place out on an open ladder if it was
// reached from an index, as in [a,j+1]; a constant beyond the ends, or a listed value of an index, is a mistake.
type rungIndex struct {
	slot    int // index plus offset; -1: general
	offset  int
	general whole
	wraps   bool
	skips   bool
	moves   bool // differs from place to place: a missing site leaves the place out
	at      origin
}

func (r *rungIndex) eval(f *frame) (int, error) {
	rung := 0
	if r.slot >= 0 {
		v := f.vars[r.slot]
		if v != math.Trunc(v) || math.Abs(v) > 1e9 {
			return 0, r.at.fail("", "rung index %s is not a whole number", formatReal(v))
		}
		rung = int(v) + r.offset
	} else {
		var err error
		if rung, err = r.general.eval(f); err != nil {
			return 0, err
		}
	}
	n := f.ladder.rungs
	switch {
	case rung >= 0 && rung < n:
		return rung, nil
	case f.ladder.boundary == Periodic && r.wraps:
		f.wrapped = true
		return mod(rung, n), nil
	case r.skips:
		return 0, errAbsent
	}
	return 0, r.at.fail(rungHint(n), "rung %d out of range", rung)
}

// legIndex is the leg of an operator: a leg or an index, shifted across the ladder.
type legIndex struct {
	slot  int // -1: leg
	leg   int
	shift *whole // nil: none
	at    origin
}

func (x *legIndex) eval(f *frame) (int, error) {
	leg := x.leg
	if x.slot >= 0 {
		leg = int(f.vars[x.slot])
	}
	if x.shift == nil {
		return leg, nil
	}
	s, err := x.shift.eval(f)
	if err != nil {
		return 0, err
	}
	leg += s
	n := len(f.ladder.legs)
	if leg >= 0 && leg < n {
		return leg, nil
	}
	if f.ladder.across == Periodic {
		f.wrapped = true
		return mod(leg, n), nil
	}
	if x.slot < 0 {
		return 0, x.at.fail("legs in order: "+f.ladder.legNames(), "no leg %+d away from %q", s, f.ladder.legs[x.leg].name)
	}
	return 0, errAbsent
}

// siteIndex is a place on the ladder.
type siteIndex struct {
	leg  legIndex
	rung rungIndex
}

func (x *siteIndex) eval(f *frame) (site, leg int, err error) {
	if leg, err = x.leg.eval(f); err != nil {
		return 0, 0, err
	}
	rung, err := x.rung.eval(f)
	if err != nil {
		return 0, 0, err
	}
	i := f.ladder.index[leg*f.ladder.rungs+rung]
	if i < 0 {
		if !x.rung.moves {
			return 0, 0, x.rung.at.fail("the leg is missing there", "leg %q has no site on rung %d", f.ladder.legs[leg].name, rung)
		}
		return 0, 0, errAbsent
	}
	if f.track {
		f.touched = append(f.touched, i)
	}
	return int(i), leg, nil
}

// operator is name^super on a site; byLeg holds what it is on each leg.
type operator struct {
	symbol string
	byLeg  [][]Weighted
	at     siteIndex
	origin origin
}

func (o *operator) eval(f *frame) (value, error) {
	site, leg, err := o.at.eval(f)
	if err != nil {
		return value{}, err
	}
	sum := o.byLeg[leg]
	if sum == nil {
		return value{}, unknownOperator(o.origin, f.ladder, leg, o.symbol)
	}
	out := f.list()
	for _, w := range sum {
		if w.Op != Identity {
			out.factors = append(out.factors, Factor{int32(site), w.Op})
		}
		out.close(w.Coef)
	}
	return value{ops: out}, nil
}

func unknownOperator(at origin, l *Ladder, leg int, symbol string) error {
	g := l.legs[leg]
	return at.fail(g.site.kind.String()+": "+g.site.Symbols(), "unknown operator %q on leg %q", symbol, g.name)
}

// localNumber is a profile at a rung or a site.
type localNumber struct {
	values []float64
	site   *siteIndex // nil: by rung
	rung   rungIndex
	bySite bool
}

func (p *localNumber) eval(f *frame) (value, error) {
	if p.site == nil {
		r, err := p.rung.eval(f)
		if err != nil {
			return value{}, err
		}
		return value{z: complex(p.values[r], 0)}, nil
	}
	track := f.track
	f.track = false // a profile does not make a pair
	site, _, err := p.site.eval(f)
	f.track = track
	if err != nil {
		return value{}, err
	}
	if !p.bySite {
		site = int(f.ladder.sites[site].rung)
	}
	return value{z: complex(p.values[site], 0)}, nil
}
