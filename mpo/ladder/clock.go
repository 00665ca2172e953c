package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
)

// clockRules: element a + q·b is Z^a X^b; X Z = w^-1 Z X with w = exp(2 pi i/q).
type clockRules struct {
	q     int
	roots []complex128 // w^k
}

func newClockRules(q int) *clockRules {
	r := &clockRules{q: q, roots: make([]complex128, q)}
	for k := range r.roots {
		r.roots[k] = turn(k, q)
	}
	return r
}

// turn returns exp(2 pi i k/q), exact at multiples of a quarter.
func turn(k, q int) complex128 {
	k = mod(k, q)
	if 8*k%q == 0 {
		h := complex(math.Sqrt2/2, math.Sqrt2/2)
		return [8]complex128{1, h, 1i, -cmplx.Conj(h), -1, -h, -1i, cmplx.Conj(h)}[8*k/q]
	}
	s, c := math.Sincos(2 * math.Pi * float64(k) / float64(q))
	return complex(c, s)
}

// mod returns k modulo q in 0..q-1.
func mod(k, q int) int {
	if k %= q; k < 0 {
		k += q
	}
	return k
}

func (r *clockRules) powers(a OpID) (z, x int) { return int(a) % r.q, int(a) / r.q }
func (r *clockRules) element(z, x int) OpID    { return OpID(mod(z, r.q) + r.q*mod(x, r.q)) }

func (r *clockRules) dim() int                { return r.q }
func (r *clockRules) labels() []Label         { return []Label{{Name: "Q", Modulus: r.q}} }
func (r *clockRules) stateLabels(s int) []int { return []int{s} }

func (r *clockRules) mul(a, b OpID) ([]Weighted, error) {
	za, xa := r.powers(a)
	zb, xb := r.powers(b)
	return []Weighted{{r.roots[mod(-xa*zb, r.q)], r.element(za+zb, xa+xb)}}, nil
}

func (r *clockRules) adjoint(a OpID) ([]Weighted, error) {
	z, x := r.powers(a)
	return []Weighted{{r.roots[mod(-x*z, r.q)], r.element(-z, -x)}}, nil
}

func (r *clockRules) raise(a OpID) []int {
	_, x := r.powers(a)
	return []int{x}
}

func (r *clockRules) odd(OpID) bool { return false }

func (r *clockRules) diagonal(a OpID) bool { return int(a) < r.q }

func (r *clockRules) matrix(a OpID) []complex128 {
	z, x := r.powers(a)
	m := make([]complex128, r.q*r.q)
	for in := range r.q {
		out := mod(in+x, r.q)
		m[out*r.q+in] = r.roots[mod(z*out, r.q)]
	}
	return m
}

func (r *clockRules) format(a OpID, at string) string {
	if a == 0 {
		return "1"
	}
	z, x := r.powers(a)
	s := r.power("Z", z, at)
	if z != 0 && x != 0 {
		s += " "
	}
	return s + r.power("X", x, at)
}

// power writes the shorter of Z^k and (Z^+)^(q-k).
func (r *clockRules) power(name string, k int, at string) string {
	if k == 0 {
		return ""
	}
	if 2*k > r.q {
		name, k = name+"^+", r.q-k
	}
	return raised(name+at, k)
}

// raised writes x^k.
func raised(x string, k int) string {
	if k == 1 {
		return x
	}
	return fmt.Sprintf("%s^%d", x, k)
}

func (r *clockRules) symbol(name, super string) ([]Weighted, bool) {
	switch name + "^" + super {
	case "Z^":
		return []Weighted{{1, r.element(1, 0)}}, true
	case "Z^+":
		return []Weighted{{1, r.element(-1, 0)}}, true
	case "X^":
		return []Weighted{{1, r.element(0, 1)}}, true
	case "X^+":
		return []Weighted{{1, r.element(0, -1)}}, true
	}
	return nil, false
}

func (r *clockRules) symbols() string { return "Z, Z^+, X, X^+" }

// exponential expands exp of the diagonal in powers of Z: a discrete Fourier transform.
func (r *clockRules) exponential(x []Weighted) ([]Weighted, error) {
	d := diagonalValues(r, x)
	for i := range d {
		d[i] = expOf(d[i])
	}
	return r.expand(d), nil
}

func (r *clockRules) expand(d []complex128) []Weighted {
	out := make([]Weighted, 0, r.q)
	size := 0.0
	for _, v := range d {
		size = max(size, cmplx.Abs(v))
	}
	for z := range r.q {
		sum := complex128(0)
		for m, v := range d {
			sum += v * r.roots[mod(-z*m, r.q)]
		}
		if sum /= complex(float64(r.q), 0); cmplx.Abs(sum) > 1e-15*size {
			out = append(out, Weighted{sum, r.element(z, 0)})
		}
	}
	return out
}
