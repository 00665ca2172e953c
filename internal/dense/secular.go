package dense

import "math"

// secular is the equation of a divide-and-conquer merge,
//
//	f(x) = 1 + sum_j z_j^2 / (D_j - x) = 0,
//
// with D = d ascending (eigenvalues x) or, if squared, D = d^2 (singular values w, x = w^2). Its roots lie one above each pole. A root
// is kept as the pole that is nearest and the distance from it, w = d[origin] + offset, so that every difference D_j - x comes out to
// full relative accuracy; this is what makes the vectors orthogonal (Gu, Eisenstat 1995).
type secular struct {
	d, z    []float64
	origin  []int
	offset  []float64
	squared bool

	stop   func() bool // nil: never
	halted bool        // stop said so
}

// rootsBetween is the number of roots found between two questions whether to stop.
const rootsBetween = 64

// stopped asks stop and keeps a yes.
func (s *secular) stopped() bool {
	s.halted = s.halted || (s.stop != nil && s.stop())
	return s.halted
}

// secularSteps bounds the iterations for one root; five are usual.
const secularSteps = 100

// value returns root i.
func (s *secular) value(i int) float64 { return s.d[s.origin[i]] + s.offset[i] }

// gap returns D_j - x at x = pole + t.
func (s *secular) gap(j int, pole, t float64) float64 {
	x := (s.d[j] - pole) - t
	if s.squared {
		x *= (s.d[j] + pole) + t
	}
	return x
}

// step returns t moved by h, where h is measured on the axis of D.
func (s *secular) step(pole, t, h float64) float64 {
	if !s.squared {
		return t + h
	}
	w := pole + t
	square := w*w + h
	if square < 0 {
		square = 0
	}
	return t + h/(w+math.Sqrt(square))
}

// solve finds all roots. It reports false if one does not converge, or stopped by stop.
func (s *secular) solve() bool {
	norm := 0.0
	for _, z := range s.z {
		norm += z * z
	}
	for i := range s.d {
		if i%rootsBetween == rootsBetween-1 && s.stopped() {
			return false
		}
		var ok bool
		if i+1 < len(s.d) {
			ok = s.inner(i)
		} else {
			ok = s.last(norm)
		}
		if !ok {
			return false
		}
	}
	return true
}

// inner finds root i between two poles. The start solves the equation with all but the two poles frozen at the midpoint.
func (s *secular) inner(i int) bool {
	d, z := s.d, s.z
	width := d[i+1] - d[i]
	if s.squared {
		width *= d[i+1] + d[i]
	}
	mid := s.step(d[i], 0, width/2)
	below, _ := s.sums(d[:i], z[:i], d[i], mid)
	above, _ := s.sums(d[i+2:], z[i+2:], d[i], mid)
	c := 1 + below + above
	z0, z1 := z[i]*z[i], z[i+1]*z[i+1]
	if c+(z1-z0)/(width/2) > 0 {
		h := nearRoot(c, c*width+z0+z1, z0*width)
		return s.refine(i, i, s.step(d[i], 0, h), 0, mid)
	}
	h := nearRoot(c, -c*width+z0+z1, -z1*width)
	return s.refine(i, i+1, s.step(d[i+1], 0, h), s.step(d[i+1], 0, -width/2), 0)
}

// last finds the root above all poles; norm is the sum of z^2.
func (s *secular) last(norm float64) bool {
	i := len(s.d) - 1
	d, z := s.d, s.z
	if i == 0 {
		s.origin[0], s.offset[0] = 0, s.step(d[0], 0, norm)
		return true
	}
	mid, top := s.step(d[i], 0, norm/2), s.step(d[i], 0, norm)
	top += 4 * epsilon * top
	below, _ := s.sums(d[:i-1], z[:i-1], d[i], mid)
	c := 1 + below
	width := d[i] - d[i-1]
	if s.squared {
		width *= d[i] + d[i-1]
	}
	z0, z1 := z[i-1]*z[i-1], z[i]*z[i]
	low, high := 0.0, mid
	if c-z0/(width+norm/2)-z1/(norm/2) < 0 {
		low, high = mid, top
	}
	t := mid
	if c > 0 {
		t = s.step(d[i], 0, farRoot(c, -c*width+z0+z1, -z1*width))
	}
	return s.refine(i, i, t, low, high)
}

// nearRoot and farRoot solve c h^2 - a h + b = 0: the root of smaller and of larger h for the signs met here.
func nearRoot(c, a, b float64) float64 {
	root := math.Sqrt(math.Abs(a*a - 4*b*c))
	if a > 0 {
		return 2 * b / (a + root)
	}
	return (a - root) / (2 * c)
}

func farRoot(c, a, b float64) float64 {
	root := math.Sqrt(math.Abs(a*a - 4*b*c))
	if a >= 0 {
		return (a + root) / (2 * c)
	}
	return 2 * b / (a - root)
}

// refine iterates from t, measured from pole `origin`, to root i, which lies in [low, high]. Each step fits f by c + p/(D_i - x) +
// q/(D_i+1 - x) (Li, LAPACK Working Note 89: the middle way; after a slow step, fixed weight); a step that leaves the bracket is
// replaced by a bisection.
func (s *secular) refine(i, origin int, t, low, high float64) bool {
	pole := s.d[origin]
	first, final := i, i+1 == len(s.d)
	if final {
		first = i - 1
	}
	if !(t > low && t < high) {
		t = between(low, high)
	}
	fixed, previous := false, math.Inf(1)
	for range secularSteps {
		psi, dpsi := s.sums(s.d[:first+1], s.z[:first+1], pole, t)
		phi, dphi := s.sums(s.d[first+1:], s.z[first+1:], pole, t)
		f, slope := 1+psi+phi, dpsi+dphi
		moved := t
		if s.squared {
			moved *= 2*pole + t
		}
		if math.Abs(f) <= epsilon*(8*(1+math.Abs(psi)+math.Abs(phi))+math.Abs(moved)*slope) {
			s.origin[i], s.offset[i] = origin, t
			return true
		}
		if f < 0 {
			low = t
		} else {
			high = t
		}
		fixed = fixed != (math.Abs(f) > math.Abs(previous)/10 && f*previous > 0)
		previous = f

		gap0, gap1 := s.gap(first, pole, t), s.gap(first+1, pole, t)
		c := f - gap0*dpsi - gap1*dphi
		if fixed && !final {
			if origin == first {
				q := s.z[first] / gap0
				c = f - gap1*slope - (gap0-gap1)*q*q
			} else {
				q := s.z[first+1] / gap1
				c = f - gap0*slope - (gap1-gap0)*q*q
			}
		}
		a, b := (gap0+gap1)*f-gap0*gap1*slope, gap0*gap1*f
		var h float64
		if final {
			h = farRoot(math.Abs(c), a, b)
		} else {
			h = nearRoot(c, a, b)
		}
		if !(f*h < 0) {
			h = -f / slope
		}
		next := s.step(pole, t, h)
		if !(next > low && next < high) {
			next = between(low, high)
		}
		if next == t || high-low <= 2*epsilon*math.Max(math.Abs(low), math.Abs(high)) {
			s.origin[i], s.offset[i] = origin, next
			return next != 0
		}
		t = next
	}
	return false
}

// between bisects an interval on one side of zero, by magnitude where its ends differ much.
func between(low, high float64) float64 {
	a, b := math.Abs(low), math.Abs(high)
	sign := 1.0
	if low < 0 {
		a, b, sign = b, a, -1
	}
	switch {
	case a == 0:
		return sign * b / 64
	case b > 16*a:
		return sign * math.Sqrt(a) * math.Sqrt(b)
	}
	return low + (high-low)/2
}

// recompute replaces z by the vector for which the roots found are exact (Gu, Eisenstat 1995, eq. 3.3; Loewner).
func (s *secular) recompute(product []float64) {
	k := len(s.d)
	product = product[:k]
	last := s.d[s.origin[k-1]]
	for i := range product {
		product[i] = -s.gap(i, last, s.offset[k-1])
	}
	for j := range k - 1 {
		pole, t := s.d[s.origin[j]], s.offset[j]
		s.quotients(product[:j+1], s.d[:j+1], pole, t, s.d[j+1])
		s.quotients(product[j+1:], s.d[j+1:], pole, t, s.d[j])
	}
	for i, p := range product {
		s.z[i] = math.Copysign(math.Sqrt(math.Abs(p)), s.z[i])
	}
}
