package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"rundle/mps/block"
)

// Strings is a polynomial in the stored bases: a sum of products of site matrices, ready for tensors.
type Strings struct {
	Group   block.Group
	Axes    []block.Axis   // one per site, Flow In
	Tables  []*OpTable     // one per site, shared between like sites
	Coef    []complex128   // imag == 0 for all exactly when Real
	Start   []int32        // len(Coef)+1 into Factors
	Factors []StringFactor // sorted by site within a term, identities left out
	Real    bool           // all coefficients and matrices are real
	Charge  block.Charge   // what every term adds to the charge of a state
}

// StringFactor is an operator of a term: Op counts in the table of the site.
type StringFactor struct{ Site, Op int32 }

// OpTable lists the operators of a kind of site. Matrices[0] is the identity; where Filler is 1, Matrices[1] is the sign (-1)^n.
//
// Factors carry the sign matrix on their right where an odd number of odd factors follows on later sites; sites between two factors of a
// term get the Filler of their own table while an odd number of Odd factors follows. A term that is odd as a whole has
// its signs written out as factors, none of which counts as Odd.
type OpTable struct {
	Matrices [][]complex128 // Dim×Dim row-major <out|op|in>, states in axis order
	Charges  []block.Charge // what each operator adds
	Odd      []bool
	Filler   int32
}

// realPart is the share of a coefficient below which its imaginary (or real) part is taken for rounding of the gauge.
const realPart = 1e-10

// Strings passes p through the frames: rotation, gauge phases, state order, fermion signs. All terms must change the charges alike
// (see StringsByCharge).
func (f *Frames) Strings(p *Polynomial) (*Strings, error) {
	all, err := f.StringsByCharge(p)
	if err != nil {
		return nil, err
	}
	if len(all) > 1 {
		return nil, fmt.Errorf("the terms of an operator change the charges differently: one by %s, another by %s", f.describe(all[0].Charge), f.describe(all[1].Charge))
	}
	return all[0], nil
}

// StringsByCharge passes p through the frames and returns its parts of definite charge, sorted by charge. There is always one; an
// expectation value needs only that of charge zero.
func (f *Frames) StringsByCharge(p *Polynomial) ([]*Strings, error) {
	l := p.Ladder()
	if err := f.check(l); err != nil {
		return nil, err
	}
	lb := f.lb
	if lb == nil || lb.ladder != l {
		lb = newLabelling(l)
	}
	rot, err := f.rotationsOn(lb)
	if err != nil {
		return nil, err
	}
	if p, err = lb.spell(lb.rotate(p, rot), f.settler(lb)); err != nil {
		return nil, err
	}
	x, err := expand(lb, p, f.Real)
	if err != nil {
		return nil, err
	}
	w := newWriter(f, x)
	for t := range x.coef {
		w.term(t)
	}
	return w.finish(), nil
}

// Split returns the real and the imaginary part of p in real frames: p = a + i b with a and b real. Terms must change the charges alike.
func (f *Frames) Split(p *Polynomial) (a, b *Strings, err error) {
	s, err := f.Strings(p)
	if err != nil {
		return nil, nil, err
	}
	if !f.Real {
		return nil, nil, fmt.Errorf("these frames are complex (%s): no operator is split", f.Loop)
	}
	a, b = s.Split()
	return a, b, nil
}

// Split returns a and b with s = a + i b, both real; the matrices must be real, as they are in real frames. Tables are shared.
func (s *Strings) Split() (a, b *Strings) {
	parts := [2]*Strings{}
	for k := range parts {
		q := &Strings{Group: s.Group, Axes: s.Axes, Tables: s.Tables, Start: []int32{0}, Real: true, Charge: s.Charge}
		for t, z := range s.Coef {
			c := real(z)
			if k == 1 {
				c = imag(z)
			}
			if c != 0 {
				q.Coef = append(q.Coef, complex(c, 0))
				q.Factors = append(q.Factors, s.Factors[s.Start[t]:s.Start[t+1]]...)
				q.Start = append(q.Start, int32(len(q.Factors)))
			}
		}
		parts[k] = q
	}
	for _, t := range s.Tables {
		if !t.real() {
			panic("ladder: Strings.Split of strings with complex matrices")
		}
	}
	return parts[0], parts[1]
}

func (t *OpTable) real() bool {
	for _, m := range t.Matrices {
		for _, z := range m {
			if imag(z) != 0 {
				return false
			}
		}
	}
	return true
}

// rotationsOn returns the rotation of each leg; the sites of one leg must agree.
func (f *Frames) rotationsOn(lb *labelling) (rotations, error) {
	rot := make(rotations, len(lb.classes))
	seen := make([]bool, len(rot))
	for i, s := range f.Sites {
		leg := lb.class[i]
		if seen[leg] && rot[leg] != s.Rotation {
			return nil, fmt.Errorf("the frame of site %d is turned otherwise than that of its leg", i)
		}
		rot[leg], seen[leg] = s.Rotation, true
	}
	return rot, nil
}

// turnOf returns exp(i sum angle*step).
func turnOf(angles []float64, steps []int32) complex128 {
	sum := 0.0
	for a, theta := range angles {
		sum += theta * float64(steps[a])
	}
	if sum == 0 {
		return 1
	}
	return cmplx.Rect(1, sum)
}

// describe writes a charge with names, as in "N = 1, Sz = 1/2".
func (f *Frames) describe(c block.Charge) string {
	text := ""
	for i, info := range f.Charges {
		if i > 0 {
			text += ", "
		}
		text += info.Name + " = " + info.show(c[i])
	}
	if text == "" {
		return "nothing"
	}
	return text
}

// show writes a stored integer as the user's number.
func (c ChargeInfo) show(n int32) string {
	if c.Halves {
		return half(int(n))
	}
	return fmt.Sprint(n)
}

// writer turns an expansion into Strings by charge.
type writer struct {
	f        *Frames
	x        *expansion
	axes     []block.Axis
	tables   []*tableWriter
	byCharge map[block.Charge]*Strings
	line     []StringFactor
}

// tableWriter fills an OpTable on demand.
type tableWriter struct {
	OpTable
	frame *block.Frame
	local *localTable
	sign  []float64 // (-1)^n of each stored state; nil: no fermions
	index map[opKey]opRef
}

type opKey struct {
	op     int32
	signed bool // times the sign matrix
	hidden bool // does not count as odd
}

type opRef struct {
	op     int32
	factor float64 // +1 or -1
}

func newWriter(f *Frames, x *expansion) *writer {
	w := &writer{f: f, x: x, byCharge: make(map[block.Charge]*Strings)}
	type kind struct {
		class  *siteClass
		states *block.Charge
	}
	axes := make(map[kind]block.Axis)
	shared := make(map[kind]*tableWriter)
	byText := make(map[string]kind)
	for i := range f.Sites {
		s := &f.Sites[i]
		k := kind{x.lb.at(i), &s.Charges[0]}
		if shared[k] == nil {
			text := fmt.Sprintf("%p %v %v", k.class, s.Charges, s.Order)
			if old, ok := byText[text]; ok {
				shared[k], axes[k] = shared[old], axes[old]
			} else {
				byText[text] = k
				shared[k], axes[k] = newTableWriter(f, x.tables[k.class], s), s.Axis()
			}
		}
		w.tables, w.axes = append(w.tables, shared[k]), append(w.axes, axes[k])
	}
	return w
}

func newTableWriter(f *Frames, local *localTable, s *block.Frame) *tableWriter {
	t := &tableWriter{frame: s, local: local, index: make(map[opKey]opRef)}
	d := s.Dim()
	one := make([]complex128, d*d)
	for i := range d {
		one[i*d+i] = 1
	}
	t.add(one, block.Charge{}, false)
	t.index[opKey{}] = opRef{0, 1}
	if k := local.class.site.Kind(); k == KindFermion || k == KindElectron {
		t.sign = make([]float64, d)
		signs := make([]complex128, d*d)
		for i, state := range s.Order {
			n := int32(0)
			for _, x := range local.class.steps[state] {
				n += x
			}
			t.sign[i] = float64(1 - 2*(n%2))
			signs[i*d+i] = complex(t.sign[i], 0)
		}
		t.add(signs, block.Charge{}, false)
		t.index[opKey{signed: true}] = opRef{1, 1}
		t.index[opKey{signed: true, hidden: true}] = opRef{1, 1}
		t.index[opKey{hidden: true}] = opRef{0, 1}
		t.Filler = 1
	}
	return t
}

func (t *tableWriter) add(m []complex128, c block.Charge, odd bool) int32 {
	t.Matrices, t.Charges, t.Odd = append(t.Matrices, m), append(t.Charges, c), append(t.Odd, odd)
	return int32(len(t.Matrices) - 1)
}

// ref returns the number of an operator in the table, with the sign it takes.
func (t *tableWriter) ref(g block.Group, key opKey) opRef {
	r, ok := t.index[key]
	if ok {
		return r
	}
	o := &t.local.ops[key.op]
	d := t.frame.Dim()
	m := make([]complex128, d*d)
	var c block.Charge
	for i, out := range t.frame.Order {
		for j, in := range t.frame.Order {
			z := o.matrix[out*d+in]
			if z == 0 {
				continue
			}
			if key.signed {
				z *= complex(t.sign[j], 0)
			}
			m[i*d+j] = z
			c = g.Sub(t.frame.Charges[i], t.frame.Charges[j])
		}
	}
	odd := o.odd && !key.hidden
	if t.sign != nil {
		for i, old := range t.Matrices {
			if t.Odd[i] != odd {
				continue
			}
			if s := exactProportion(old, m); s != 0 {
				r = opRef{int32(i), s}
				t.index[key] = r
				return r
			}
		}
	}
	r = opRef{t.add(m, c, odd), 1}
	t.index[key] = r
	return r
}

// exactProportion is +1 or -1 where b is exactly that multiple of a, else 0.
func exactProportion(a, b []complex128) float64 {
	if slices.Equal(a, b) {
		return 1
	}
	for i := range a {
		if a[i] != -b[i] {
			return 0
		}
	}
	return -1
}

// term appends term t of the expansion to the Strings of its charge.
func (w *writer) term(t int) {
	g := w.f.Group
	factors := w.x.factors[w.x.start[t]:w.x.start[t+1]]
	coef := w.gauged(t, factors)
	odd := 0
	for _, f := range factors {
		if w.x.op(f).odd {
			odd++
		}
	}
	w.line = w.line[:0]
	sum := block.Charge{}
	place := func(site int32, key opKey) {
		tab := w.tables[site]
		r := tab.ref(g, key)
		if r.factor < 0 {
			coef = -coef
		}
		if r.op != 0 {
			w.line = append(w.line, StringFactor{site, r.op})
			sum = g.Add(sum, tab.Charges[r.op])
		}
	}
	hidden := odd%2 == 1
	after := odd // odd factors from here on
	next := int32(0)
	for _, f := range factors {
		if hidden && after%2 == 1 {
			w.signs(next, f.Site, place)
		}
		if w.x.op(f).odd {
			after--
		}
		place(f.Site, opKey{f.Op, after%2 == 1 && w.tables[f.Site].sign != nil, hidden && w.tables[f.Site].sign != nil})
		next = f.Site + 1
	}
	s := w.byCharge[sum]
	if s == nil {
		s = &Strings{Group: g, Axes: w.axes, Charge: sum, Start: []int32{0}, Real: true}
		w.byCharge[sum] = s
	}
	s.Coef = append(s.Coef, coef)
	s.Factors = append(s.Factors, w.line...)
	s.Start = append(s.Start, int32(len(s.Factors)))
	s.Real = s.Real && imag(coef) == 0
}

// signs writes the sign matrices of the sites from..to-1 as factors.
func (w *writer) signs(from, to int32, place func(int32, opKey)) {
	for i := from; i < to; i++ {
		if w.tables[i].sign != nil {
			place(i, opKey{signed: true, hidden: true})
		}
	}
}

// gauged returns the coefficient of term t with its gauge phase. In real frames what is real or imaginary up to rounding is made so exactly.
func (w *writer) gauged(t int, factors []StringFactor) complex128 {
	c := w.x.coef[t]
	angle := 0.0
	for _, f := range factors {
		if angles := w.f.Sites[f.Site].Angles; angles != nil {
			for a, n := range w.x.op(f).steps {
				angle += angles[a] * float64(n)
			}
		}
	}
	if angle != 0 {
		c *= cmplx.Rect(1, angle)
	}
	if !w.f.Real {
		return c
	}
	size := cmplx.Abs(w.x.coef[t])
	switch {
	case math.Abs(imag(c)) <= realPart*size:
		return complex(math.Copysign(size, real(c)), 0)
	case math.Abs(real(c)) <= realPart*size:
		return complex(0, math.Copysign(size, imag(c)))
	}
	return c
}

// finish returns the parts sorted by charge, an empty one if there are none.
func (w *writer) finish() []*Strings {
	var out []*Strings
	for _, s := range w.byCharge {
		out = append(out, s)
	}
	if len(out) == 0 {
		out = append(out, &Strings{Group: w.f.Group, Axes: w.axes, Start: []int32{0}, Real: true})
	}
	slices.SortFunc(out, func(a, b *Strings) int { return a.Charge.Compare(b.Charge) })
	tables := make([]*OpTable, len(w.tables))
	realTables := true
	checked := make(map[*tableWriter]bool)
	for i, t := range w.tables {
		tables[i] = &t.OpTable
		if !checked[t] {
			checked[t] = true
			realTables = realTables && t.real()
		}
	}
	for _, s := range out {
		s.Tables = tables
		s.Real = s.Real && realTables
	}
	return out
}
