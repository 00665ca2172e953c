package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
)

// A string such as prod(k=1..m, exp(i*pi*n[a,k])) has, written in basis elements, a number of terms exponential in its length. A
// compound keeps it one term: it stands for a sum of basis elements of one site. Compounds are not linearly independent of the
// basis, so short strings are written out (see [maxSpread]) and only long ones stay compounds.
const compoundBit OpID = 1 << 31

// maxCompounds bounds the interned sums of one kind of site.
const maxCompounds = 1 << 18

// maxSpread is the number of terms up to which a product of compounds is written out.
const maxSpread = 64

func (a OpID) compound() bool { return a&compoundBit != 0 }

// compoundKey is a coarse fingerprint: equal sums have equal or neighbouring keys.
type compoundKey struct {
	terms int
	first OpID
	size  int64
}

// leader returns a, or the first element of a compound.
func (l *local) leader(a OpID) OpID {
	if !a.compound() {
		return a
	}
	l.mu.RLock()
	defer l.mu.RUnlock()
	return l.parts(a)[0].Op
}

// spread returns the sum that an element stands for.
func (l *local) spread(a OpID) []Weighted {
	l.mu.RLock()
	defer l.mu.RUnlock()
	return l.parts(a)
}

// parts is spread for callers that hold the lock.
func (l *local) parts(a OpID) []Weighted {
	if a.compound() {
		return l.compounds[a&^compoundBit]
	}
	return []Weighted{{1, a}}
}

// condense returns a merged sum as a constant times one element, if all its elements are even or all odd.
func (l *local) condense(w []Weighted) ([]Weighted, error) {
	if len(w) < 2 {
		return w, nil
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	var out []Weighted
	for _, x := range w {
		for _, y := range l.parts(x.Op) {
			out = append(out, Weighted{x.Coef * y.Coef, y.Op})
		}
	}
	return l.condensed(mergeWeighted(out))
}

func (l *local) condensed(w []Weighted) ([]Weighted, error) {
	if len(w) < 2 {
		return w, nil
	}
	for _, x := range w[1:] {
		if l.odd(x.Op) != l.odd(w[0].Op) {
			return w, nil
		}
	}
	scale := w[0].Coef // so that multiples share one compound
	c := make([]Weighted, len(w))
	size := 0.0
	for i, x := range w {
		c[i] = Weighted{x.Coef / scale, x.Op}
		size += cmplx.Abs(c[i].Coef)
	}
	cell := math.Floor(math.Log(size) * 1e7)
	for _, shift := range []float64{0, -1, 1} {
		for _, op := range l.bySize[compoundKey{len(c), c[0].Op, int64(cell + shift)}] {
			if sameSum(l.parts(op), c) {
				return []Weighted{{scale, op}}, nil
			}
		}
	}
	if len(l.compounds) == maxCompounds {
		return nil, fmt.Errorf("more than %d different sums inside products", maxCompounds)
	}
	op := compoundBit | OpID(len(l.compounds))
	l.compounds = append(l.compounds, c)
	key := compoundKey{len(c), c[0].Op, int64(cell)}
	l.bySize[key] = append(l.bySize[key], op)
	return []Weighted{{scale, op}}, nil
}

func sameSum(a, b []Weighted) bool {
	for i, x := range a {
		if x.Op != b[i].Op || cmplx.Abs(x.Coef-b[i].Coef) > same*cmplx.Abs(x.Coef) {
			return false
		}
	}
	return true
}

// product multiplies; a compound times a compound is condensed again, any other product is written out.
func (l *local) product(a, b OpID) ([]Weighted, error) {
	switch {
	case a == Identity:
		return []Weighted{{1, b}}, nil
	case b == Identity:
		return []Weighted{{1, a}}, nil
	}
	var out []Weighted
	for _, x := range l.parts(a) {
		for _, y := range l.parts(b) {
			w, err := l.mul(x.Op, y.Op)
			if err != nil {
				return nil, err
			}
			for _, z := range w {
				out = append(out, Weighted{x.Coef * y.Coef * z.Coef, z.Op})
			}
		}
	}
	out = mergeWeighted(out)
	if a.compound() && b.compound() {
		return l.condensed(out)
	}
	return out, nil
}

func (l *local) adjointOf(a OpID) ([]Weighted, error) {
	var out []Weighted
	for _, x := range l.parts(a) {
		w, err := l.adjoint(x.Op)
		if err != nil {
			return nil, err
		}
		for _, y := range w {
			out = append(out, Weighted{cmplx.Conj(x.Coef) * y.Coef, y.Op})
		}
	}
	out = mergeWeighted(out)
	if a.compound() {
		return l.condensed(out)
	}
	return out, nil
}

func (l *local) matrixOf(a OpID) []complex128 {
	if !a.compound() {
		return l.matrix(a)
	}
	sum := make([]complex128, l.dim()*l.dim())
	for _, x := range l.parts(a) {
		for i, v := range l.matrix(x.Op) {
			sum[i] += x.Coef * v
		}
	}
	return sum
}

func (l *local) writeOp(a OpID, at string) string {
	if !a.compound() {
		return l.format(a, at)
	}
	var s []string
	for _, x := range l.parts(a) {
		switch {
		case x.Op == Identity:
			s = append(s, formatNumber(x.Coef))
		case x.Coef == 1:
			s = append(s, l.format(x.Op, at))
		default:
			s = append(s, formatNumber(x.Coef)+" "+l.format(x.Op, at))
		}
	}
	return "(" + strings.Join(s, " + ") + ")"
}
