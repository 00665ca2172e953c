package ladder

import (
	"math"
	"math/cmplx"
)

// The real gauge: one angle per label of every site, such that the coefficient of each term times exp(i sum raise*angle) is
// real. Terms that move labels in the same way share their condition, which leaves few of them.

// step is one entry of a raising vector.
type step struct {
	at int32 // variable of the labelling
	n  int32
}

// move is a way in which terms change the labels, up to sign, with the phase of the first such term.
type move struct {
	steps []step
	phase float64 // argument of the coefficient, for the sign of steps given
	term  int32   // term of the expansion
	rival int32   // a term with the same steps and another phase modulo pi, or -1
}

// movesOf collects the distinct moves of an expansion, in the order of their first terms.
func movesOf(x *expansion) []move {
	var out []move
	index := make(map[uint64][]int32)
	var buf []step
	for t := range x.coef {
		buf = x.raise(buf[:0], t)
		phi := cmplx.Phase(x.coef[t])
		if x.lb.flip(buf) {
			phi = -phi
		}
		h := hashSteps(buf)
		known := false
		for _, i := range index[h] {
			m := &out[i]
			if !sameSteps(m.steps, buf) {
				continue
			}
			known = true
			if m.rival < 0 && !x.lb.agree(m, phi) {
				m.rival = int32(t)
			}
			break
		}
		if !known {
			m := move{steps: append([]step(nil), buf...), phase: phi, term: int32(t), rival: -1}
			if !x.lb.agree(&m, phi) {
				m.rival = int32(t)
			}
			index[h] = append(index[h], int32(len(out)))
			out = append(out, m)
		}
	}
	return out
}

// flip brings steps to their standard sign (clock steps to -q/2 < n <= q/2, the first step positive) and reports whether the sign changed.
func (lb *labelling) flip(steps []step) bool {
	if len(steps) == 0 {
		return false
	}
	for i := range steps {
		steps[i].n = lb.centred(steps[i])
	}
	// A clock step q/2 is its own opposite: the sign is that of the first other step.
	negative := false
	for _, s := range steps {
		if q := lb.modulusOf(s.at); q == 0 || 2*s.n != q {
			negative = s.n < 0
			break
		}
	}
	if !negative {
		return false
	}
	for i := range steps {
		steps[i].n = lb.centred(step{steps[i].at, -steps[i].n})
	}
	return true
}

// centred returns the step of a clock between -q/2 (excluded) and q/2, others as they are.
func (lb *labelling) centred(s step) int32 {
	q := lb.modulusOf(s.at)
	if q == 0 {
		return s.n
	}
	n := ((s.n % q) + q) % q
	if 2*n > q {
		n -= q
	}
	return n
}

// modulusOf returns q for the variable of a clock, 0 for others.
func (lb *labelling) modulusOf(v int32) int32 {
	if !lb.hasClocks {
		return 0
	}
	return int32(lb.at(lb.siteOf(int(v))).modulus)
}

// agree reports whether a phase is compatible with that of the move.
func (lb *labelling) agree(m *move, phi float64) bool {
	if !phaseOf(phi - m.phase).vanishes() {
		return false
	}
	// A move that is its own opposite (nothing moves, or clocks by q/2) comes with both signs of the phase: it must be real by itself, up to
	// the gauge, which for such moves only shifts by multiples of pi.
	for _, s := range m.steps {
		if q := lb.modulusOf(s.at); q == 0 || 2*s.n != q {
			return true
		}
	}
	return phaseOf(phi).vanishes()
}

func hashSteps(steps []step) uint64 {
	h := uint64(14695981039346656037)
	for _, s := range steps {
		h = (h ^ uint64(uint32(s.at))) * 1099511628211
		h = (h ^ uint64(uint32(s.n))) * 1099511628211
		h ^= h >> 29
	}
	return h
}

func sameSteps(a, b []step) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		if a[i] != b[i] {
			return false
		}
	}
	return true
}

// relations states what the moves leave unchanged; with the right-hand sides of the real gauge.
func relationsOf(moves []move) []relation {
	out := make([]relation, 0, len(moves))
	for i := range moves {
		if len(moves[i].steps) == 0 {
			continue
		}
		r := relation{rhs: phaseOf(-moves[i].phase), terms: make([]entry, len(moves[i].steps))}
		for k, s := range moves[i].steps {
			r.terms[k] = entry{s.at, exactOf(int64(s.n))}
		}
		out = append(out, r)
	}
	return out
}

// gauge finds the angles, one per variable; nil angles: all coefficients are real as they are. If there are none, loop names an obstruction.
func gauge(x *expansion, moves []move) (angles []float64, loop string) {
	plain := true
	for i := range moves {
		if moves[i].rival >= 0 {
			return nil, x.rivalry(moves[i])
		}
		plain = plain && phaseOf(moves[i].phase).vanishes()
	}
	if plain {
		return nil, ""
	}
	// A clock turns by multiples of 2 pi/q only: modulo pi these are the multiples of pi/q for odd q, of 2 pi/q for even q.
	relations := relationsOf(moves)
	for i := range x.lb.sites() {
		if q := x.lb.at(i).modulus; q != 0 {
			if q%2 == 0 {
				q /= 2
			}
			relations = append(relations, relation{terms: []entry{{x.lb.first[i], exactOf(int64(q))}}})
		}
	}
	s := solveRelations(x.lb.variables(), relations)
	if len(s.bad) > 0 {
		return nil, x.obstruction(moves)
	}
	angles = make([]float64, x.lb.variables())
	for i := range x.lb.sites() {
		for v := x.lb.first[i]; v < x.lb.first[i+1]; v++ {
			angles[v] = clockTurn(s.shift[v].angle, x.lb.at(i).modulus)
		}
	}
	return angles, ""
}

// clockTurn returns the multiple of 2 pi/q equal to the angle modulo pi; other sites (q = 0) keep the angle.
func clockTurn(angle float64, q int) float64 {
	if q == 0 {
		return math.Remainder(angle, math.Pi)
	}
	best, off := 0.0, math.Inf(1)
	for k := range q {
		turn := 2 * math.Pi * float64(k) / float64(q)
		if d := math.Abs(math.Remainder(turn-angle, math.Pi)); d < off-1e-9 {
			best, off = turn, d
		}
	}
	return best
}
