package ladder

// multiplier multiplies terms; it holds scratch and serves one goroutine.
type multiplier struct {
	ladder *Ladder
	slots  []slot
	prefix []Factor
	drop   bool // leave out what the cut of an electron site leaves nothing of
}

// slot is a place in a product: one factor, or where both terms act on a site the sum that their product is.
type slot struct {
	factor Factor
	sum    []Weighted // nil: the factor alone
}

// multiply appends c·A·B to out. Moving an odd factor of B left past the odd factors of A on later sites changes the sign for each.
func (m *multiplier) multiply(out *list, c complex128, a, b []Factor) error {
	if len(b) == 0 || len(a) == 0 || a[len(a)-1].Site < b[0].Site {
		out.factors = append(append(out.factors, a...), b...)
		out.close(c)
		return nil
	}
	odd := 0 // odd factors of A not yet placed, all on later sites
	for _, f := range a {
		if m.odd(f) {
			odd++
		}
	}
	m.slots = m.slots[:0]
	single := true
	for len(a) > 0 && len(b) > 0 {
		switch {
		case a[0].Site < b[0].Site:
			if odd > 0 && m.odd(a[0]) {
				odd--
			}
			m.slots = append(m.slots, slot{factor: a[0]})
			a = a[1:]
		case a[0].Site > b[0].Site:
			if odd%2 == 1 && m.odd(b[0]) {
				c = -c
			}
			m.slots = append(m.slots, slot{factor: b[0]})
			b = b[1:]
		default:
			if odd > 0 && m.odd(a[0]) {
				odd--
			}
			if odd%2 == 1 && m.odd(b[0]) {
				c = -c
			}
			w, err := m.ladder.Site(int(a[0].Site)).ops.multiply(a[0].Op, b[0].Op)
			if err != nil {
				return err
			}
			if len(w) == 0 {
				return nil
			}
			m.slots = append(m.slots, slot{factor: a[0], sum: w})
			single = single && len(w) == 1
			a, b = a[1:], b[1:]
		}
	}
	for _, f := range a {
		m.slots = append(m.slots, slot{factor: f})
	}
	for _, f := range b { // A is used up: nothing to pass
		m.slots = append(m.slots, slot{factor: f})
	}
	if single {
		for _, s := range m.slots {
			if s.sum != nil {
				c *= s.sum[0].Coef
				s.factor.Op = s.sum[0].Op
			}
			if s.factor.Op != Identity {
				out.factors = append(out.factors, s.factor)
			}
		}
		out.close(c)
		return nil
	}
	m.prefix = m.prefix[:0]
	return m.expand(out, c, 0)
}

// expand multiplies out the sums of the slots from k on.
func (m *multiplier) expand(out *list, c complex128, k int) error {
	for k < len(m.slots) && m.slots[k].sum == nil {
		m.prefix = append(m.prefix, m.slots[k].factor)
		k++
	}
	if k == len(m.slots) {
		if !m.drop || !m.gone(m.prefix) {
			out.add(c, m.prefix)
		}
		return out.full()
	}
	depth := len(m.prefix)
	for _, w := range m.slots[k].sum {
		m.prefix = m.prefix[:depth]
		if w.Op != Identity {
			m.prefix = append(m.prefix, Factor{m.slots[k].factor.Site, w.Op})
		}
		if err := m.expand(out, c*w.Coef, k+1); err != nil {
			return err
		}
	}
	m.prefix = m.prefix[:depth]
	return nil
}

// adjoint appends the adjoint of c·A: reversing k odd factors costs k(k-1)/2 exchanges.
func (m *multiplier) adjoint(out *list, c complex128, a []Factor) error {
	odd := 0
	m.slots = m.slots[:0]
	for _, f := range a {
		if m.odd(f) {
			odd++
		}
		w, err := m.ladder.Site(int(f.Site)).ops.conjugate(f.Op)
		if err != nil {
			return err
		}
		m.slots = append(m.slots, slot{factor: f, sum: w})
	}
	c = complex(real(c), -imag(c))
	if odd*(odd-1)/2%2 == 1 {
		c = -c
	}
	m.prefix = m.prefix[:0]
	return m.expand(out, c, 0)
}

func (m *multiplier) odd(f Factor) bool { return m.ladder.Site(int(f.Site)).Odd(f.Op) }

// writeOut appends the terms of in to out in the form in which polynomials leave the evaluation: compounds written out where that gives
// at most maxSpread terms, and products left out of which the cut of an electron site leaves nothing.
func (m *multiplier) writeOut(out, in *list) error {
	m.drop = true
	defer func() { m.drop = false }()
	for i, c := range in.coef {
		f := in.term(i)
		size, some := 1, false
		for _, x := range f {
			if x.Op.compound() && size <= maxSpread {
				some = true
				size *= len(m.ladder.Site(int(x.Site)).ops.spread(x.Op))
			}
		}
		if !some || size > maxSpread {
			if !m.gone(f) {
				out.add(c, f)
			}
			continue
		}
		m.slots = m.slots[:0]
		for _, x := range f {
			s := slot{factor: x}
			if x.Op.compound() {
				s.sum = m.ladder.Site(int(x.Site)).ops.spread(x.Op)
			}
			m.slots = append(m.slots, s)
		}
		m.prefix = m.prefix[:0]
		if err := m.expand(out, c, 0); err != nil {
			return err
		}
	}
	return nil
}

// gone reports whether the cut of an electron site leaves nothing of a product.
func (m *multiplier) gone(f []Factor) bool {
	for _, x := range f {
		if site := m.ladder.Site(int(x.Site)); site.single && site.Vanishes(x.Op) {
			return true
		}
	}
	return false
}
