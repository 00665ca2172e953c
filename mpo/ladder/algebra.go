package ladder

import (
	"math"
	"math/cmplx"
	"slices"
	"sync"
)

// OpID names an element of a site's local operator basis; 0 is the identity. What the others are is the business of the site's
// kind; on one ladder, sites that compare equal read an OpID alike.
type OpID uint32

// Identity is the identity of every site.
const Identity OpID = 0

// Weighted is a basis element with its coefficient.
type Weighted struct {
	Coef complex128
	Op   OpID
}

// rules is what each kind of site tells about its operator basis. Products come back in any order and may hold an element
// twice; local merges and caches them.
type rules interface {
	dim() int
	labels() []Label
	stateLabels(state int) []int
	mul(a, b OpID) ([]Weighted, error)
	adjoint(a OpID) ([]Weighted, error)
	raise(a OpID) []int
	odd(a OpID) bool
	diagonal(a OpID) bool
	matrix(a OpID) []complex128
	// format writes the element with at ("[a,3]") behind each operator.
	format(a OpID, at string) string
	// symbol returns the operator written name^super, false if there is none.
	symbol(name, super string) ([]Weighted, bool)
	// symbols lists what symbol knows, for errors.
	symbols() string
	// exponential returns exp(x) for a sum x of diagonal elements.
	exponential(x []Weighted) ([]Weighted, error)
}

// local is the operator algebra of one kind of site with its caches, safe for concurrent use. It adds to the basis of the rules the
// compounds: interned sums of basis elements, all even or all odd.
type local struct {
	rules
	mu        sync.RWMutex
	products  map[[2]OpID][]Weighted
	adjoints  map[OpID][]Weighted
	matrices  map[OpID][]complex128
	compounds [][]Weighted
	bySize    map[compoundKey][]OpID
}

func newLocal(r rules) *local {
	return &local{
		rules:    r,
		products: make(map[[2]OpID][]Weighted),
		adjoints: make(map[OpID][]Weighted),
		matrices: make(map[OpID][]complex128),
		bySize:   make(map[compoundKey][]OpID),
	}
}

// multiply returns a·b merged; the result is shared and must not be changed.
func (l *local) multiply(a, b OpID) ([]Weighted, error) {
	key := [2]OpID{a, b}
	l.mu.RLock()
	w, ok := l.products[key]
	l.mu.RUnlock()
	if ok {
		return w, nil
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	w, err := l.product(a, b)
	if err != nil {
		return nil, err
	}
	l.products[key] = w
	return w, nil
}

// conjugate returns the adjoint of a; the result is shared.
func (l *local) conjugate(a OpID) ([]Weighted, error) {
	l.mu.RLock()
	w, ok := l.adjoints[a]
	l.mu.RUnlock()
	if ok {
		return w, nil
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	w, err := l.adjointOf(a)
	if err != nil {
		return nil, err
	}
	l.adjoints[a] = w
	return w, nil
}

func (l *local) cachedMatrix(a OpID) []complex128 {
	l.mu.RLock()
	m, ok := l.matrices[a]
	l.mu.RUnlock()
	if ok {
		return m
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	m = l.matrixOf(a)
	l.matrices[a] = m
	return m
}

func (l *local) write(a OpID, at string) string {
	l.mu.RLock()
	defer l.mu.RUnlock()
	return l.writeOp(a, at)
}

// exponentiate guards exponential, which may intern new elements.
func (l *local) exponentiate(x []Weighted) ([]Weighted, error) {
	l.mu.Lock()
	defer l.mu.Unlock()
	w, err := l.exponential(x)
	return mergeWeighted(w), err
}

// cancelled is the share of the summed magnitudes below which a sum of terms counts as exactly cancelled; sums within a site
// carry the rounding of its basis too.
const (
	cancelled      = 1e-15
	cancelledLocal = 1e-14
)

// cancels reports whether a sum of terms with summed magnitudes size is zero up to rounding; one that is not finite is not.
func cancels(sum complex128, size, share float64) bool {
	return sum == 0 || cmplx.Abs(sum) <= share*size && !math.IsInf(size, 0)
}

// mergeWeighted sorts by element, adds like elements, and drops what cancels.
func mergeWeighted(w []Weighted) []Weighted {
	if len(w) == 0 {
		return nil
	}
	w = slices.Clone(w)
	slices.SortStableFunc(w, func(a, b Weighted) int { return int(int64(a.Op) - int64(b.Op)) })
	out := w[:0]
	for i := 0; i < len(w); {
		op, sum, size := w[i].Op, complex128(0), 0.0
		for ; i < len(w) && w[i].Op == op; i++ {
			sum += w[i].Coef
			size += cmplx.Abs(w[i].Coef)
		}
		if !cancels(sum, size, cancelledLocal) {
			out = append(out, Weighted{sum, op})
		}
	}
	return slices.Clip(out)
}

func finite(z complex128) bool {
	return !math.IsNaN(real(z)) && !math.IsInf(real(z), 0) && !math.IsNaN(imag(z)) && !math.IsInf(imag(z), 0)
}

// tidy removes from the sum x+iy of a coefficient the part that only rounding can have left there.
func tidy(z complex128) complex128 {
	x, y := real(z), imag(z)
	if math.Abs(x) < 2e-16*math.Abs(y) {
		x = 0
	}
	if math.Abs(y) < 2e-16*math.Abs(x) {
		y = 0
	}
	return complex(x, y)
}
