package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
)

// localOp is an operator of a site in the site's own states. In a real expansion its matrix is real.
type localOp struct {
	matrix []complex128 // Dim×Dim, <out|op|in>
	steps  []int32      // by how much it raises each label, in steps of one
	odd    bool
	split  bool // part of a complex operator
}

// weightedOp is a multiple of a local operator of a table.
type weightedOp struct {
	op   int32
	coef complex128
}

// localTable turns basis elements of a site's algebra into local operators. With real set, an element with a complex matrix becomes the
// sum of its real part and i times its imaginary part; like parts of different elements are one operator, so that what
// is real in total (cosines from pairs of clock operators) comes out with real coefficients.
type localTable struct {
	class *siteClass
	real  bool
	ops   []localOp // ops[0] is the identity
	parts map[OpID][]weightedOp
}

func newLocalTable(c *siteClass, real bool) *localTable {
	t := &localTable{class: c, real: real, parts: make(map[OpID][]weightedOp)}
	t.of(Identity)
	return t
}

// of returns the sum of local operators that an element stands for; it is empty if the element vanishes on the site's states.
func (t *localTable) of(op OpID) []weightedOp {
	parts, ok := t.parts[op]
	if !ok {
		parts = t.convert(op)
		t.parts[op] = parts
	}
	return parts
}

func (t *localTable) convert(op OpID) []weightedOp {
	site := t.class.site
	re, im := separate(site.Matrix(op))
	o := localOp{matrix: site.Matrix(op), steps: t.class.toSteps(site.Raise(op), nil), odd: site.Odd(op)}
	switch {
	case re == nil && im == nil:
		return nil
	case im == nil:
		o.matrix = re
		return []weightedOp{t.place(o, 1)}
	case !t.real:
		return []weightedOp{t.place(o, 1)}
	case re == nil:
		o.matrix, o.split = im, true
		return []weightedOp{t.place(o, 1i)}
	}
	o.split, o.matrix = true, re
	first := t.place(o, 1)
	o.matrix = im
	return []weightedOp{first, t.place(o, 1i)}
}

// place files an operator; of parts of complex operators it finds equals up to sign.
func (t *localTable) place(o localOp, coef complex128) weightedOp {
	if o.split {
		for i := range t.ops {
			if !t.ops[i].split {
				continue
			}
			if s := proportion(t.ops[i].matrix, o.matrix); s != 0 {
				return weightedOp{int32(i), coef * complex(s, 0)}
			}
		}
	}
	t.ops = append(t.ops, o)
	return weightedOp{int32(len(t.ops) - 1), coef}
}

// tinyElement is the share of the largest element below which a matrix element is rounding.
const tinyElement = 4e-15

// separate returns the real and the imaginary part, nil where one vanishes.
func separate(m []complex128) (re, im []complex128) {
	top := 0.0
	for _, z := range m {
		top = max(top, math.Abs(real(z)), math.Abs(imag(z)))
	}
	for i, z := range m {
		if math.Abs(real(z)) > tinyElement*top {
			if re == nil {
				re = make([]complex128, len(m))
			}
			re[i] = complex(real(z), 0)
		}
		if math.Abs(imag(z)) > tinyElement*top {
			if im == nil {
				im = make([]complex128, len(m))
			}
			im[i] = complex(imag(z), 0)
		}
	}
	return re, im
}

// proportion returns +1 or -1 if b is that multiple of a, else 0.
func proportion(a, b []complex128) float64 {
	plus, minus, top := 0.0, 0.0, 0.0
	for i := range a {
		plus = max(plus, cmplx.Abs(a[i]-b[i]))
		minus = max(minus, cmplx.Abs(a[i]+b[i]))
		top = max(top, cmplx.Abs(a[i]))
	}
	switch {
	case plus <= tinyElement*top:
		return 1
	case minus <= tinyElement*top:
		return -1
	}
	return 0
}

// expansion is a polynomial written in local operators: term t is coef[t] times the product of factors[start[t]:start[t+1]].
type expansion struct {
	lb      *labelling
	poly    *Polynomial
	tables  map[*siteClass]*localTable
	coef    []complex128
	start   []int32
	factors []StringFactor // Op counts in the site's localTable
	origin  []int32        // term of poly; nil: the same number
}

// expand writes p in local operators; in real ones if real is set, which makes two parts of a complex one. Products that would become too many
// terms are an error.
func expand(lb *labelling, p *Polynomial, real bool) (*expansion, error) {
	x := &expansion{lb: lb, poly: p, tables: make(map[*siteClass]*localTable)}
	for _, c := range lb.classes {
		if x.tables[c] == nil {
			x.tables[c] = newLocalTable(c, real)
		}
	}
	n := p.NumTerms()
	x.coef, x.start = make([]complex128, 0, n), make([]int32, 1, n+1)
	x.origin = make([]int32, 0, n)
	straight, several := true, false
	var lists [][]weightedOp
	for t := range n {
		coef, factors := p.Term(t)
		lists = lists[:0]
		ways := 1
		for _, f := range factors {
			parts := x.tables[lb.at(int(f.Site))].of(f.Op)
			if ways *= len(parts); ways > maxWays {
				return nil, tooLong(p, t)
			}
			lists = append(lists, parts)
		}
		straight, several = straight && ways == 1, several || ways > 1
		for way := range ways {
			x.appendWay(coef, factors, lists, way)
			x.origin = append(x.origin, int32(t))
		}
	}
	if several {
		x.merge()
	}
	if straight {
		x.origin = nil
	}
	return x, nil
}

// appendWay adds the term that takes one part of each factor; way counts through all choices.
func (x *expansion) appendWay(coef complex128, factors []Factor, lists [][]weightedOp, way int) {
	for k, f := range factors {
		part := lists[k][way%len(lists[k])]
		way /= len(lists[k])
		coef *= part.coef
		if part.op != 0 {
			x.factors = append(x.factors, StringFactor{Site: f.Site, Op: part.op})
		}
	}
	x.coef = append(x.coef, coef)
	x.start = append(x.start, int32(len(x.factors)))
}

// merge adds up terms with equal factors, and clears what rounding has left of real and imaginary parts.
func (x *expansion) merge() {
	out := expansion{start: []int32{0}}
	size := []float64{}
	seen := make(map[string]int)
	var key []byte
	for t := range x.coef {
		key = key[:0]
		f := x.factors[x.start[t]:x.start[t+1]]
		for _, g := range f {
			key = append(key, byte(g.Site), byte(g.Site>>8), byte(g.Site>>16), byte(g.Op), byte(g.Op>>8), byte(g.Op>>16), byte(g.Op>>24))
		}
		i, ok := seen[string(key)]
		if !ok {
			i = len(out.coef)
			seen[string(key)] = i
			out.coef, size = append(out.coef, 0), append(size, 0)
			out.factors = append(out.factors, f...)
			out.start = append(out.start, int32(len(out.factors)))
			out.origin = append(out.origin, x.origin[t])
		}
		out.coef[i] += x.coef[t]
		size[i] += cmplx.Abs(x.coef[t])
	}
	x.coef, x.start, x.factors, x.origin = out.coef[:0], make([]int32, 1, len(out.start)), out.factors[:0], out.origin[:0]
	const rounding = 1e-14
	for t, z := range out.coef {
		re, im := real(z), imag(z)
		if math.Abs(re) <= rounding*size[t] {
			re = 0
		}
		if math.Abs(im) <= rounding*size[t] {
			im = 0
		}
		if re == 0 && im == 0 {
			continue
		}
		x.coef = append(x.coef, complex(re, im))
		x.factors = append(x.factors, out.factors[out.start[t]:out.start[t+1]]...)
		x.start = append(x.start, int32(len(x.factors)))
		x.origin = append(x.origin, out.origin[t])
	}
}

// op returns the local operator of a factor.
func (x *expansion) op(f StringFactor) *localOp {
	return &x.tables[x.lb.at(int(f.Site))].ops[f.Op]
}

// raise appends the raising vector of term t, sorted by variable.
func (x *expansion) raise(steps []step, t int) []step {
	for _, f := range x.factors[x.start[t]:x.start[t+1]] {
		for a, n := range x.op(f).steps {
			if n != 0 {
				steps = append(steps, step{x.lb.first[f.Site] + int32(a), n})
			}
		}
	}
	return steps
}

// show writes the operators of the polynomial's term that term t came from, with the phase of its coefficient.
func (x *expansion) show(t int32) string {
	if x.origin != nil {
		t = x.origin[t]
	}
	coef, factors := x.poly.Term(int(t))
	var parts []string
	for _, f := range factors {
		parts = append(parts, x.lb.ladder.FormatOp(int(f.Site), f.Op))
	}
	if len(parts) == 0 {
		parts = []string{"1"}
	}
	return fmt.Sprintf("%s (phase %.4g pi)", strings.Join(parts, " "), cmplx.Phase(coef)/math.Pi)
}
