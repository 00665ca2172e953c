package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
)

// spinRules: an element is phi_a(mid) (S^+)^r or phi_a(mid) (S^-)^|r| with mid the mean of the m before and after, a polynomial phi_a of
// degree a <= 2s - |r|. With mid in place of S^z every element's adjoint is one element, and phi is real. Up to s = 2 the phi are
// powers; above, powers are too ill-conditioned and phi_a for a >= 2 are polynomials orthogonal on the values that mid takes (Gram).
type spinRules struct {
	twoS  int
	bands []spinBand // by |r|
	start []int      // element of (a = 0, r): start[r+twoS]
	parts []spinPart // by element
}

type spinPart struct{ a, r int }

// spinBand holds what the elements with one |r| share; its points t = 0..2s-|r| have mid = s - |r|/2 - t.
type spinBand struct {
	weight  []float64   // <m+r|(S^+)^r|m> at the points
	phi     [][]float64 // [a][point]
	inverse [][]float64 // [a][point]: coefficient of phi_a in a function on the points
}

const largestPowerBasis = 4 // 2s

func newSpinRules(twoS int) *spinRules {
	s := &spinRules{twoS: twoS, start: make([]int, 2*twoS+1)}
	for k := 0; k <= twoS; k++ {
		s.bands = append(s.bands, newSpinBand(twoS, k))
		s.addBand(k)
		if k > 0 {
			s.addBand(-k)
		}
	}
	return s
}

// addBand numbers the elements that raise m by r.
func (s *spinRules) addBand(r int) {
	s.start[r+s.twoS] = len(s.parts)
	for a := 0; a <= s.twoS-abs(r); a++ {
		s.parts = append(s.parts, spinPart{a, r})
	}
}

func newSpinBand(twoS, k int) spinBand {
	n := twoS - k + 1
	b := spinBand{weight: make([]float64, n)}
	x := make([]float64, n)
	for t := range n {
		x[t] = float64(twoS-k)/2 - float64(t)
		square := 1.0 // product of s(s+1) - m(m+1) = (s-m)(s+m+1) along the way, in integers
		for i := 1; i <= k; i++ {
			down := t + i // s - m before the step
			square *= float64(down * (twoS - down + 1))
		}
		b.weight[t] = math.Sqrt(square)
	}
	if twoS <= largestPowerBasis {
		b.phi = powers(x)
		b.inverse = invert(b.phi)
		return b
	}
	b.phi, b.inverse = gram(x)
	return b
}

// powers returns x^a at the points.
func powers(x []float64) [][]float64 {
	phi := make([][]float64, len(x))
	for a := range phi {
		phi[a] = make([]float64, len(x))
		for t, v := range x {
			phi[a][t] = math.Pow(v, float64(a))
		}
	}
	return phi
}

// invert returns inv with sum_t inv[a][t] phi[b][t] = delta_ab, by elimination with pivoting.
func invert(phi [][]float64) [][]float64 {
	n := len(phi)
	m := make([][]float64, n) // rows: points; columns: phi_a(t) | unit
	for t := range m {
		m[t] = make([]float64, 2*n)
		for a := range n {
			m[t][a] = phi[a][t]
		}
		m[t][n+t] = 1
	}
	for c := range n {
		p := c
		for t := c; t < n; t++ {
			if math.Abs(m[t][c]) > math.Abs(m[p][c]) {
				p = t
			}
		}
		m[c], m[p] = m[p], m[c]
		for t := range n {
			if t == c || m[t][c] == 0 {
				continue
			}
			f := m[t][c] / m[c][c]
			for k := c; k < 2*n; k++ {
				m[t][k] -= f * m[c][k]
			}
		}
	}
	out := make([][]float64, n)
	for a := range out {
		out[a] = m[a][n:]
		for t := range out[a] {
			out[a][t] /= m[a][a]
		}
	}
	return out
}

// gram returns 1, x and polynomials of rising degree orthogonal on the points, at most 1 in size, and the dual vectors.
func gram(x []float64) (phi, inverse [][]float64) {
	n := len(x)
	for a := range n {
		v := make([]float64, n)
		for t := range v {
			v[t] = 1
			if a > 0 {
				v[t] = x[t] * phi[a-1][t]
			}
		}
		for range 2 { // twice, or high degrees lose orthogonality
			for b := range a {
				dot := 0.0
				for t := range v {
					dot += inverse[b][t] * v[t]
				}
				for t := range v {
					v[t] -= dot * phi[b][t]
				}
			}
		}
		largest, square := 0.0, 0.0
		for t := range v {
			largest = max(largest, math.Abs(v[t]))
		}
		dual := make([]float64, n)
		for t := range v {
			if a >= 2 {
				v[t] /= largest
			}
			square += v[t] * v[t]
		}
		for t := range v {
			dual[t] = v[t] / square
		}
		phi, inverse = append(phi, v), append(inverse, dual)
	}
	return phi, inverse
}

func (s *spinRules) element(a, r int) OpID { return OpID(s.start[r+s.twoS] + a) }

func (s *spinRules) dim() int                    { return s.twoS + 1 }
func (s *spinRules) labels() []Label             { return []Label{{Name: "Sz", Twice: true}} }
func (s *spinRules) stateLabels(state int) []int { return []int{s.twoS - 2*state} }

// values returns the band of an element: at point t it takes state t+|r| to t (r > 0) or t to t+|r|.
func (s *spinRules) values(op OpID) (r int, v []float64) {
	part := s.parts[op]
	b := &s.bands[abs(part.r)]
	v = make([]float64, len(b.weight))
	for t := range v {
		v[t] = b.phi[part.a][t] * b.weight[t]
	}
	return part.r, v
}

func abs(x int) int { return max(x, -x) }

// row and column of point t in a band.
func bandPoint(r, t int) (out, in int) {
	if r >= 0 {
		return t, t + r
	}
	return t - r, t
}

func (s *spinRules) mul(x, y OpID) ([]Weighted, error) {
	if x == Identity {
		return []Weighted{{1, y}}, nil
	}
	if y == Identity {
		return []Weighted{{1, x}}, nil
	}
	r1, v1 := s.values(x)
	r2, v2 := s.values(y)
	r := r1 + r2
	if abs(r) > s.twoS {
		return nil, nil
	}
	d := make([]complex128, s.twoS-abs(r)+1)
	for t := range d {
		out, in := bandPoint(r, t)
		mid := in - r2
		if mid < 0 || mid > s.twoS {
			continue
		}
		d[t] = complex(v1[min(out, mid)]*v2[min(mid, in)], 0)
	}
	w := s.expand(r, d)
	for i := range w {
		w[i].Coef = complex(snap(real(w[i].Coef)), 0)
	}
	return w, nil
}

// snap rounds to a fraction with a small denominator what is one up to rounding, so that products of spins cancel exactly.
func snap(x float64) float64 {
	const denominator = 48
	if r := math.Round(x * denominator); math.Abs(x*denominator-r) < 1e-14*math.Abs(r) {
		return r / denominator
	}
	return x
}

// expand writes a band with the given matrix elements in the basis, leaving out what only rounding put there.
func (s *spinRules) expand(r int, d []complex128) []Weighted {
	b := &s.bands[abs(r)]
	largest := 0.0
	g := make([]complex128, len(d))
	for t, v := range d {
		g[t] = v / complex(b.weight[t], 0)
		largest = max(largest, cmplx.Abs(g[t]))
	}
	var out []Weighted
	for a := range d {
		sum, size := complex128(0), 0.0
		for t := range g {
			sum += complex(b.inverse[a][t], 0) * g[t]
		}
		for _, p := range b.phi[a] {
			size = max(size, math.Abs(p))
		}
		if cmplx.Abs(sum)*size > 1e-14*largest {
			out = append(out, Weighted{tidy(sum), s.element(a, r)})
		}
	}
	return out
}

func (s *spinRules) adjoint(x OpID) ([]Weighted, error) {
	p := s.parts[x]
	return []Weighted{{1, s.element(p.a, -p.r)}}, nil
}

func (s *spinRules) raise(x OpID) []int   { return []int{2 * s.parts[x].r} }
func (s *spinRules) odd(OpID) bool        { return false }
func (s *spinRules) diagonal(x OpID) bool { return s.parts[x].r == 0 }

func (s *spinRules) matrix(x OpID) []complex128 {
	n := s.twoS + 1
	m := make([]complex128, n*n)
	r, v := s.values(x)
	for t, e := range v {
		out, in := bandPoint(r, t)
		m[out*n+in] = complex(e, 0)
	}
	return m
}

func (s *spinRules) format(x OpID, at string) string {
	if x == Identity {
		return "1"
	}
	p := s.parts[x]
	step := "S^+" + at
	if p.r < 0 {
		step = "S^-" + at
	}
	step = raised(step, abs(p.r))
	if p.a == 0 {
		return step
	}
	mid := "S^z" + at // left of the step m is already changed: mid = S^z - r/2
	if p.r != 0 {
		mid = fmt.Sprintf("(S^z%s %s %s)", at, map[bool]string{true: "-", false: "+"}[p.r > 0], half(abs(p.r)))
	}
	if s.twoS <= largestPowerBasis || p.a == 1 {
		mid = raised(mid, p.a)
	} else {
		mid = fmt.Sprintf("P%d(%s)", p.a, mid)
	}
	if p.r == 0 {
		return mid
	}
	return mid + " " + step
}

func (s *spinRules) symbol(name, super string) ([]Weighted, bool) {
	if name != "S" {
		return nil, false
	}
	raise, lower := s.element(0, 1), s.element(0, -1)
	switch super {
	case "z":
		return []Weighted{{1, s.element(1, 0)}}, true
	case "+":
		return []Weighted{{1, raise}}, true
	case "-":
		return []Weighted{{1, lower}}, true
	case "x":
		return []Weighted{{0.5, raise}, {0.5, lower}}, true
	case "y":
		return []Weighted{{-0.5i, raise}, {0.5i, lower}}, true
	}
	return nil, false
}

func (s *spinRules) symbols() string { return "S^z, S^+, S^-, S^x, S^y" }

func (s *spinRules) exponential(x []Weighted) ([]Weighted, error) {
	d := diagonalValues(s, x)
	for i := range d {
		d[i] = expOf(d[i])
	}
	return s.expand(0, d), nil
}
