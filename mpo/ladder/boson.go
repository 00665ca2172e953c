package ladder

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"
)

// A boson element is (b^+)^p f(n) b^q with f(n) = exp(polynomial of n): the bits of p, of q and of the number of f, from
// the lowest; the highest bit marks compounds. f number 0 is 1, so elements without an exponential mean the same on every ladder.
const (
	powerBits    = 7
	MaxPower     = 1<<powerBits - 1 // largest power of b or b^+ in a product
	functionBits = 31 - 2*powerBits
	maxFunctions = 1 << functionBits
)

func bosonOp(p, q, f int) OpID { return OpID(p | q<<powerBits | f<<(2*powerBits)) }

func bosonParts(a OpID) (p, q, f int) {
	return int(a & MaxPower), int(a >> powerBits & MaxPower), int(a >> (2 * powerBits))
}

// diagonalExp is exp(sum_k c[k-1] binomial(n, k)) for k = 1, 2, ...: imaginary parts lie in (-pi, pi], since the binomials are whole numbers
// 2 pi changes nothing. Two of them agree on all n exactly when their coefficients do.
type diagonalExp []complex128

type bosonRules struct {
	max       int
	functions []diagonalExp // number 0 is the empty one
	near      map[int64][]int
}

func newBosonRules(max int) *bosonRules {
	return &bosonRules{max: max, functions: []diagonalExp{nil}, near: make(map[int64][]int)}
}

func (r *bosonRules) dim() int                { return r.max + 1 }
func (r *bosonRules) labels() []Label         { return []Label{{Name: "N"}} }
func (r *bosonRules) stateLabels(s int) []int { return []int{s} }

var errPower = fmt.Errorf("a power of b or b^+ above %d", MaxPower)

// mul: b^q (b^+)^p = sum_k k! C(q,k) C(p,k) (b^+)^(p-k) b^(q-k), and f(n) (b^+)^r = (b^+)^r f(n+r).
func (r *bosonRules) mul(a, b OpID) ([]Weighted, error) {
	p1, q1, f1 := bosonParts(a)
	p2, q2, f2 := bosonParts(b)
	var out []Weighted
	weight := 1.0
	for k := 0; k <= min(q1, p2); k++ {
		if k > 0 {
			weight *= float64(q1-k+1) * float64(p2-k+1) / float64(k)
		}
		p, q := p1+p2-k, q1+q2-k
		if p > MaxPower || q > MaxPower {
			return nil, errPower
		}
		f, scale, err := r.times(f1, p2-k, f2, q1-k)
		if err != nil {
			return nil, err
		}
		out = append(out, Weighted{complex(weight, 0) * scale, bosonOp(p, q, f)})
	}
	return out, nil
}

// times returns f1(n+s1) f2(n+s2) as a constant times a function.
func (r *bosonRules) times(f1, s1, f2, s2 int) (f int, scale complex128, err error) {
	if f1 == 0 && f2 == 0 {
		return 0, 1, nil
	}
	c1, k1 := shifted(r.functions[f1], s1)
	c2, k2 := shifted(r.functions[f2], s2)
	if len(c1) < len(c2) {
		c1, c2 = c2, c1
	}
	for i, c := range c2 {
		c1[i] += c
	}
	f, err = r.intern(c1)
	return f, expOf(k1 + k2), err
}

// shifted rewrites sum_k c_k C(n+s,k) in binomials of n (Vandermonde): C(n+s,k) = sum_m C(n,m) C(s,k-m); constant is the part of m = 0.
func shifted(c diagonalExp, s int) (out diagonalExp, constant complex128) {
	out = slices.Clone(c)
	binomial := 1.0 // C(s, d)
	for d := 1; d <= len(c) && d <= s; d++ {
		binomial = binomial * float64(s-d+1) / float64(d)
		for k := d; k <= len(c); k++ {
			if k == d {
				constant += complex(binomial, 0) * c[k-1]
			} else {
				out[k-d-1] += complex(binomial, 0) * c[k-1]
			}
		}
	}
	return out, constant
}

// same is how close the coefficients of two exponents must be to count as equal.
const same = 1e-13

// intern returns the number of exp(sum c_k C(n,k)).
func (r *bosonRules) intern(c diagonalExp) (int, error) {
	c = slices.Clone(c)
	key := 0.0
	for i, z := range c {
		if !finite(z) {
			return 0, errors.New("an exponent that is not finite")
		}
		y := math.Remainder(imag(z), 2*math.Pi)
		if y < -math.Pi+same {
			y = math.Pi
		}
		if math.Abs(y) < same {
			y = 0
		}
		x := real(z)
		if math.Abs(x) < same {
			x = 0
		}
		c[i] = complex(x, y)
	}
	for len(c) > 0 && c[len(c)-1] == 0 {
		c = c[:len(c)-1]
	}
	if len(c) == 0 {
		return 0, nil
	}
	for i, z := range c {
		key += (real(z) + 1.7*imag(z)) / float64(i+1)
	}
	const cell = 1e-6
	if math.Abs(key) > 1e9 {
		return 0, errors.New("an exponent that is too large")
	}
	home := int64(math.Floor(key / cell))
	for _, h := range [3]int64{home, home - 1, home + 1} {
		for _, f := range r.near[h] {
			if r.functions[f].close(c) {
				return f, nil
			}
		}
	}
	if len(r.functions) == maxFunctions {
		return 0, fmt.Errorf("more than %d different exponentials of boson numbers", maxFunctions-1)
	}
	r.functions = append(r.functions, c)
	r.near[home] = append(r.near[home], len(r.functions)-1)
	return len(r.functions) - 1, nil
}

func (c diagonalExp) close(d diagonalExp) bool {
	if len(c) != len(d) {
		return false
	}
	for i, z := range c {
		w := z - d[i]
		if math.Abs(real(w)) > same*max(1, math.Abs(real(z))) || math.Abs(math.Remainder(imag(w), 2*math.Pi)) > same {
			return false
		}
	}
	return true
}

// at returns the function at n. Angles are counted in half turns, so that exp(i*pi*n) is a sign at every n.
func (c diagonalExp) at(n int) complex128 {
	size, turns, binomial := 0.0, 0.0, 1.0
	for k, z := range c {
		if binomial = binomial * float64(n-k) / float64(k+1); binomial == 0 {
			break
		}
		size += binomial * real(z)
		turns += math.Remainder(binomial*(imag(z)/math.Pi), 2)
	}
	return expOf(complex(size, math.Pi*math.Remainder(turns, 2)))
}

// adjoint: ((b^+)^p f b^q)^+ = (b^+)^q f* b^p.
func (r *bosonRules) adjoint(a OpID) ([]Weighted, error) {
	p, q, f := bosonParts(a)
	if f != 0 {
		c := slices.Clone(r.functions[f])
		for i := range c {
			c[i] = cmplx.Conj(c[i])
		}
		var err error
		if f, err = r.intern(c); err != nil {
			return nil, err
		}
	}
	return []Weighted{{1, bosonOp(q, p, f)}}, nil
}

func (r *bosonRules) raise(a OpID) []int {
	p, q, _ := bosonParts(a)
	return []int{p - q}
}

func (r *bosonRules) odd(OpID) bool { return false }

func (r *bosonRules) diagonal(a OpID) bool {
	p, q, _ := bosonParts(a)
	return p == q
}

// matrix: <m| (b^+)^p f b^q |k> = sqrt(k!/l!) f(l) sqrt(m!/l!) with l = k-q, m = l+p.
func (r *bosonRules) matrix(a OpID) []complex128 {
	p, q, f := bosonParts(a)
	d := r.max + 1
	m := make([]complex128, d*d)
	for l := 0; l+max(p, q) <= r.max; l++ {
		v := math.Sqrt(falling(l+q, q)) * math.Sqrt(falling(l+p, p))
		if p == q {
			v = falling(l+q, q)
		}
		m[(l+p)*d+l+q] = complex(v, 0) * r.functions[f].at(l)
	}
	return m
}

// falling returns n!/(n-k)!.
func falling(n, k int) float64 {
	v := 1.0
	for i := range k {
		v *= float64(n - i)
	}
	return v
}

func (r *bosonRules) format(a OpID, at string) string {
	p, q, f := bosonParts(a)
	var s []string
	if p == 1 && q == 1 && f == 0 {
		return "n" + at
	}
	if p > 0 {
		s = append(s, raised("b^+"+at, p))
	}
	if f > 0 {
		s = append(s, "exp("+formatExponent(r.functions[f], "n"+at)+")")
	}
	if q > 0 {
		s = append(s, raised("b"+at, q))
	}
	if len(s) == 0 {
		return "1"
	}
	return strings.Join(s, " ")
}

// formatExponent writes sum_k c_k C(n,k) with the binomials spelled out.
func formatExponent(c diagonalExp, n string) string {
	var s strings.Builder
	for k, z := range c {
		if z == 0 {
			continue
		}
		if s.Len() > 0 {
			s.WriteString(" + ")
		}
		s.WriteString(formatNumber(z) + " " + n)
		for i := 1; i <= k; i++ {
			fmt.Fprintf(&s, " (%s-%d)/%d", n, i, i+1)
		}
	}
	return s.String()
}

func (r *bosonRules) symbol(name, super string) ([]Weighted, bool) {
	switch name + "^" + super {
	case "b^":
		return []Weighted{{1, bosonOp(0, 1, 0)}}, true
	case "b^+":
		return []Weighted{{1, bosonOp(1, 0, 0)}}, true
	case "n^":
		return []Weighted{{1, bosonOp(1, 1, 0)}}, true
	}
	return nil, false
}

func (r *bosonRules) symbols() string { return "b, b^+, n" }

// exponential: (b^+)^k b^k = k! C(n,k), so a polynomial of n is already an exponent.
func (r *bosonRules) exponential(x []Weighted) ([]Weighted, error) {
	var c diagonalExp
	scale := complex128(1)
	for _, w := range x {
		p, _, f := bosonParts(w.Op)
		if f != 0 {
			return nil, errors.New("exp of an exp")
		}
		if p == 0 {
			scale *= expOf(w.Coef)
			continue
		}
		for len(c) < p {
			c = append(c, 0)
		}
		c[p-1] += w.Coef * complex(falling(p, p), 0)
	}
	f, err := r.intern(c)
	if err != nil {
		return nil, err
	}
	for n := 0; n <= r.max; n++ {
		if v := scale * r.functions[f].at(n); !finite(v) {
			return nil, fmt.Errorf("exp is not finite at n = %d", n)
		}
	}
	return []Weighted{{scale, bosonOp(0, 0, f)}}, nil
}
