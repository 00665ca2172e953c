package ladder

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
)

// value is what a part of a formula is at a place: a number, or with ops a sum of operator products (not merged).
type value struct {
	z   complex128
	ops *list
}

// expr is a compiled formula.
type expr interface {
	eval(f *frame) (value, error)
}

// errAbsent: the formula needs a site that the ladder does not have here; the place is left out.
var errAbsent = errors.New("no such site")

// frame is the state of evaluating one term place by place.
type frame struct {
	ladder *Ladder
	vars   []float64 // by slot; legs by position
	mul    multiplier
	lists  []*list // lists[:used] are in use until the place is done
	used   int
	steps  int // of sums and products, all places together

	halves int    // places left out though a summand has its sites there
	half   string // the first

	// Filled when a ring may count something twice.
	track   bool
	wrapped bool
	touched []int32
}

func newFrame(l *Ladder, slots int) *frame {
	return &frame{ladder: l, vars: make([]float64, slots), mul: multiplier{ladder: l}}
}

// maxSteps bounds the work of one term.
const maxSteps = 50_000_000

func (f *frame) begin() {
	f.used, f.wrapped, f.touched = 0, false, f.touched[:0]
}

func (f *frame) list() *list {
	if f.used == len(f.lists) {
		f.lists = append(f.lists, new(list))
	}
	l := f.lists[f.used]
	f.used++
	l.reset()
	return l
}

// add returns x + y, in the storage of one of them.
func (f *frame) add(x, y value) value {
	switch {
	case x.ops == nil && y.ops == nil:
		return value{z: x.z + y.z}
	case x.ops == nil:
		x, y = y, x
	}
	if y.ops != nil {
		x.ops.addAll(y.ops, 1)
	} else if y.z != 0 {
		x.ops.close(y.z)
	}
	return x
}

// scale returns c·v, in the storage of v.
func scale(v value, c complex128) value {
	if v.ops == nil {
		return value{z: v.z * c}
	}
	for i := range v.ops.coef {
		v.ops.coef[i] *= c
	}
	return v
}

// mergeAbove is the number of terms above which a product is merged at once, so that powers do not pile up duplicates.
const mergeAbove = 64

// maxProduct bounds the terms of one product of sums (and their factors, by four times as many).
const maxProduct = 4_000_000

func (f *frame) product(x, y value) (value, error) {
	switch {
	case x.ops == nil:
		return scale(y, x.z), nil
	case y.ops == nil:
		return scale(x, y.z), nil
	}
	out := f.list()
	for i, a := range x.ops.coef {
		for k, b := range y.ops.coef {
			if err := f.mul.multiply(out, a*b, x.ops.term(i), y.ops.term(k)); err != nil {
				return value{}, err
			}
		}
		if len(out.coef) > maxProduct || len(out.factors) > 4*maxProduct {
			return value{}, fmt.Errorf("a product of more than %d million terms", maxProduct/1_000_000)
		}
	}
	if len(out.coef) > mergeAbove {
		*out = out.merged()
	}
	return value{ops: out}, nil
}

// exponential is exp of a sum of diagonal operators, each on one site.
func (f *frame) exponential(x *list) (value, error) {
	merged := x.merged()
	scalar := complex128(1)
	out := f.list()
	for i := 0; i < len(merged.coef); {
		t := merged.term(i)
		if len(t) == 0 {
			scalar *= expOf(merged.coef[i])
			i++
			continue
		}
		site := t[0].Site
		ops := f.ladder.Site(int(site)).ops
		var sum []Weighted
		for ; i < len(merged.coef); i++ {
			t := merged.term(i)
			if len(t) > 1 {
				return value{}, errors.New("exp of a product of operators on different sites")
			}
			if t[0].Site != site {
				break
			}
			if !f.ladder.Site(int(site)).Diagonal(t[0].Op) {
				return value{}, errors.New("exp of an operator that is not diagonal")
			}
			for _, w := range ops.spread(t[0].Op) {
				sum = append(sum, Weighted{merged.coef[i] * w.Coef, w.Op})
			}
		}
		w, err := ops.exponentiate(mergeWeighted(sum))
		if err == nil {
			w, err = ops.condense(w)
		}
		if err != nil {
			return value{}, err
		}
		if len(w) == 0 {
			return value{ops: f.list()}, nil
		}
		scalar *= w[0].Coef
		if w[0].Op != Identity {
			out.factors = append(out.factors, Factor{site, w[0].Op})
		}
	}
	out.close(scalar)
	return value{ops: out}, nil
}

// compact writes a sum that acts on one site as a single term where it can, so that long products of such sums stay short.
func (f *frame) compact(v value) (value, error) {
	if v.ops == nil || len(v.ops.coef) < 2 {
		return v, nil
	}
	merged := v.ops.merged()
	site, sum := int32(-1), make([]Weighted, 0, len(merged.coef))
	for i, c := range merged.coef {
		switch t := merged.term(i); {
		case len(t) == 0:
			sum = append(sum, Weighted{c, Identity})
		case len(t) > 1 || site >= 0 && t[0].Site != site:
			return v, nil
		default:
			site = t[0].Site
			sum = append(sum, Weighted{c, t[0].Op})
		}
	}
	if site < 0 {
		return v, nil
	}
	w, err := f.ladder.Site(int(site)).ops.condense(sum)
	if err != nil {
		return value{}, err
	}
	out := f.list()
	for _, x := range w {
		if x.Op == Identity {
			out.add(x.Coef, nil)
		} else {
			out.add(x.Coef, []Factor{{site, x.Op}})
		}
	}
	return value{ops: out}, nil
}

// constant is a number known when the formula is compiled.
type constant complex128

func (c constant) eval(*frame) (value, error) { return value{z: complex128(c)}, nil }

// variable is an index as a number.
type variable int

func (v variable) eval(f *frame) (value, error) { return value{z: complex(f.vars[v], 0)}, nil }

type negation struct{ x expr }

func (n negation) eval(f *frame) (value, error) {
	v, err := n.x.eval(f)
	return scale(v, -1), err
}

// binary is x op y; at is the place of errors.
type binary struct {
	op   byte
	x, y expr
	at   origin
}

func (b *binary) eval(f *frame) (value, error) {
	x, err := b.x.eval(f)
	if err != nil {
		return value{}, err
	}
	y, err := b.y.eval(f)
	if err != nil {
		return value{}, err
	}
	switch b.op {
	case '+':
		return b.checked(f.add(x, y))
	case '-':
		return b.checked(f.add(x, scale(y, -1)))
	case '*':
		v, err := f.product(x, y)
		if err != nil {
			return value{}, b.at.wrap(err)
		}
		return b.checked(v)
	case '/':
		return b.divide(x, y)
	case '%':
		return b.remainder(x, y)
	}
	return b.power(f, x, y)
}

func (b *binary) divide(x, y value) (value, error) {
	if y.ops != nil {
		return value{}, b.at.fail("divide by numbers only", "division by an operator")
	}
	if y.z == 0 {
		return value{}, b.at.fail("leave that place out with a condition", "division by zero")
	}
	if x.ops == nil {
		return b.checked(value{z: x.z / y.z})
	}
	return scale(x, 1/y.z), nil
}

func (b *binary) remainder(x, y value) (value, error) {
	if x.ops != nil || y.ops != nil || imag(x.z) != 0 || imag(y.z) != 0 {
		return value{}, b.at.fail("", "%% needs real numbers")
	}
	p, q := real(x.z), real(y.z)
	if q == 0 {
		return value{}, b.at.fail("", "remainder of a division by zero")
	}
	r := math.Mod(p, q)
	if r != 0 && (r < 0) != (q < 0) {
		r += q // (j-1) % 2 alternates at j = 0 too
	}
	return value{z: complex(r, 0)}, nil
}

// maxExponent bounds powers of operators.
const maxExponent = 64

func (b *binary) power(f *frame, x, y value) (value, error) {
	if y.ops != nil {
		return value{}, b.at.fail("operators may stand in exp, as in exp(i*pi*n[a,j])", "an operator as exponent")
	}
	if x.ops == nil {
		if x.z == 0 && real(y.z) < 0 {
			return value{}, b.at.fail("", "0 to a negative power")
		}
		return b.checked(value{z: power(x.z, y.z)})
	}
	n := real(y.z)
	if imag(y.z) != 0 || n != math.Trunc(n) || n < 0 || n > maxExponent {
		return value{}, b.at.fail("powers of operators are whole numbers from 0 to 64", "operator to the power %s", formatNumber(y.z))
	}
	if n == 0 {
		return value{z: 1}, nil
	}
	result := x
	for range int(n) - 1 {
		var err error
		if result, err = f.product(result, x); err != nil {
			return value{}, b.at.wrap(err)
		}
	}
	return result, nil
}

// copy returns v in the frame's own storage.
func (f *frame) copy(v value) value {
	if v.ops == nil {
		return v
	}
	out := f.list()
	out.addAll(v.ops, 1)
	return value{ops: out}
}

// checked refuses numbers that are not finite; the coefficients of operators are checked at the end.
func (b *binary) checked(v value) (value, error) {
	if v.ops == nil && !finite(v.z) {
		return value{}, b.at.fail("", "the result is not a finite number")
	}
	return v, nil
}

// call is a function of one or two numbers, or exp of operators.
type call struct {
	name string
	args []expr
	at   origin
}

func (c *call) eval(f *frame) (value, error) {
	var z [2]complex128
	for i, a := range c.args {
		v, err := a.eval(f)
		if err != nil {
			return value{}, err
		}
		if v.ops != nil {
			if c.name != "exp" {
				return value{}, c.at.fail("of operators only exp can be taken", "%s of an operator", c.name)
			}
			v, err = f.exponential(v.ops)
			return v, c.at.wrap(err)
		}
		z[i] = v.z
	}
	r, problem := function(c.name, z[0], z[1])
	if problem != "" {
		return value{}, c.at.fail("", "%s", problem)
	}
	if !finite(r) {
		return value{}, c.at.fail("", "%s(%s) is not a finite number", c.name, formatNumber(z[0]))
	}
	return value{z: r}, nil
}

// function evaluates a named function; problem tells what is wrong with the arguments.
func function(name string, x, y complex128) (result complex128, problem string) {
	switch name {
	case "exp":
		return expOf(x), ""
	case "sin":
		if imag(x) == 0 {
			return complex(clean(math.Sin(real(x)), real(x)), 0), ""
		}
		return cmplx.Sin(x), ""
	case "cos":
		if imag(x) == 0 {
			return complex(clean(math.Cos(real(x)), real(x)), 0), ""
		}
		return cmplx.Cos(x), ""
	case "sqrt":
		if imag(x) == 0 && real(x) >= 0 {
			return complex(math.Sqrt(real(x)), 0), ""
		}
		return cmplx.Sqrt(x), ""
	case "abs":
		return complex(cmplx.Abs(x), 0), ""
	case "bessel":
		n := real(x)
		if imag(x) != 0 || n != math.Trunc(n) || math.Abs(n) > 1000 {
			return 0, "bessel(n, x) needs a whole n from -1000 to 1000"
		}
		if imag(y) != 0 {
			return 0, "bessel(n, x) needs a real x"
		}
		return complex(math.Jn(int(n), real(y)), 0), ""
	}
	return 0, "unknown function " + name
}

// fold is a sum or product over a range of whole numbers.
type fold struct {
	slot     int
	from, to whole
	body     expr
	product  bool
	at       origin
}

func (s *fold) tooMany() error {
	return s.at.fail("shorten the range", "more than %d million steps of sums and products", maxSteps/1_000_000)
}

func (s *fold) eval(f *frame) (value, error) {
	from, err := s.from.eval(f)
	if err != nil {
		return value{}, err
	}
	to, err := s.to.eval(f)
	if err != nil {
		return value{}, err
	}
	if to-from > maxSteps {
		return value{}, s.tooMany()
	}
	outer := f.vars[s.slot]
	defer func() { f.vars[s.slot] = outer }()
	acc := value{}
	if s.product {
		acc.z = 1
	}
	var a, b list // own storage: what the body leaves in the frame's lists is given back after each step
	for k := from; k <= to; k++ {
		if f.steps++; f.steps > maxSteps {
			return value{}, s.tooMany()
		}
		f.vars[s.slot] = float64(k)
		mark := f.used
		v, err := s.body.eval(f)
		if err != nil {
			return value{}, err
		}
		if s.product {
			if v, err = f.compact(v); err == nil {
				v, err = f.product(acc, v)
			}
		} else {
			v = f.add(acc, v)
		}
		if err == nil && v.ops != nil {
			err = v.ops.full()
		}
		if err != nil {
			return value{}, s.at.wrap(err)
		}
		acc = v
		if v.ops != nil && v.ops != &a {
			b.reset()
			b.addAll(v.ops, 1)
			a, b = b, a
			acc = value{ops: &a}
		}
		f.used = mark
	}
	if acc.ops == nil {
		return acc, nil
	}
	return f.copy(acc), nil
}

// conjugation is x plus or minus its Hermitian conjugate.
type conjugation struct {
	x     expr
	minus bool
	at    origin
}

func (c *conjugation) eval(f *frame) (value, error) {
	v, err := c.x.eval(f)
	if err != nil {
		return value{}, err
	}
	sign := complex128(1)
	if c.minus {
		sign = -1
	}
	if v.ops == nil {
		return value{z: v.z + sign*cmplx.Conj(v.z)}, nil
	}
	for i, n := 0, len(v.ops.coef); i < n; i++ {
		if err := f.mul.adjoint(v.ops, sign*v.ops.coef[i], v.ops.term(i)); err != nil {
			return value{}, c.at.wrap(err)
		}
	}
	return v, nil
}
