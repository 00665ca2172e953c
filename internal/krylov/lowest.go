package krylov

import (
	"fmt"
	"math"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// Options bound the work of Lowest. The zero value means the defaults.
type Options struct {
	MaxVectors      int        // vectors of the Krylov space held at once; 0 means 32
	MaxApplications int        // calls of apply in all; more than MaxVectors allows restarts from the best vector. 0 means MaxVectors
	Tolerance       float64    // wanted norm of H x - value x, in units of H; 0 means 1e-12 of the largest value seen. Never below rounding
	Gain            float64    // stop once the last application lowered the value by less than this, in units of H; 0: never
	Pool            *task.Pool // shares the algebra of long vectors among its threads, to the same bits; nil: one thread
}

// Reason tells why Lowest stopped.
type Reason int

// The reasons. After the first two the pair is an eigenpair.
const (
	WithinTolerance Reason = iota // the residual is as small as wanted
	Invariant                     // the Krylov space of the start is exhausted: the pair is the lowest in it
	Exhausted                     // MaxApplications reached
	ZeroStart                     // the start vector is zero, or is spanned by the vectors to stay orthogonal to; nothing was computed
	SmallGain                     // the last application lowered the value by less than Options.Gain
	NotFinite                     // the start or the operator gave NaN or Inf; x is not to be used
)

func (r Reason) String() string {
	switch r {
	case WithinTolerance:
		return "within tolerance"
	case Invariant:
		return "invariant space"
	case Exhausted:
		return "exhausted"
	case ZeroStart:
		return "zero start"
	case SmallGain:
		return "small gain"
	case NotFinite:
		return "not finite"
	}
	return fmt.Sprintf("Reason(%d)", int(r))
}

// Result is what Lowest reports; the vector itself replaces the start vector.
type Result struct {
	Value        float64 // <x|H|x>
	Start        float64 // the same of the start vector, normalized
	Residual     float64 // norm of H x - value x, outside the span of against
	Gap          float64 // between the two lowest Ritz values of the last space; +Inf where it has one dimension. About the gap above x once the space has resolved it, else larger
	Applications int     // calls of apply
	Converged    bool    // Stopped is WithinTolerance or Invariant
	Stopped      Reason
}

const (
	defaultVectors   = 32
	defaultTolerance = 1e-12
	eps              = 0x1p-52
	// breakdown times the size of H is where a new direction is rounding noise: a few tens of eps, found on operators that leave
	// small spaces invariant (TestLowestInvariantSpace).
	breakdown = 32 * eps
	// floor times the size of H is the smallest residual that is waited for.
	floor = 8 * eps
)

// Lowest finds the lowest eigenvalue of the Hermitian operator H on the orthogonal complement of the vectors in against, which must be
// orthonormal, that is of PHP with their complement's projector P. apply writes H src to dst. The search starts from x, which need
// not be normalized; on return x is the best vector found, of norm 1. The space searched is that of x, H x, H^2 x, ...: a
// start without any part along the lowest eigenvector (by symmetry) does not find it.
func Lowest[T dense.Scalar](apply func(dst, src []T), x []T, against [][]T, opt Options, w *Workspace[T]) Result {
	for _, y := range against {
		if len(y) != len(x) {
			panic(fmt.Sprintf("krylov: start of length %d, vector to stay orthogonal to of length %d", len(x), len(y)))
		}
	}
	if opt.MaxVectors <= 0 {
		opt.MaxVectors = defaultVectors
	}
	if opt.MaxApplications <= 0 {
		opt.MaxApplications = opt.MaxVectors
	}
	if w == nil {
		w = new(Workspace[T])
	}
	w.pool = opt.Pool
	r := run[T]{apply: apply, against: against, opt: opt, w: w}
	if reason, ok := r.start(x); !ok {
		return Result{Value: math.NaN(), Residual: math.NaN(), Gap: math.NaN(), Stopped: reason}
	}
	for {
		done := r.expand(x)
		if r.result.Stopped != NotFinite {
			r.best(x)
		}
		if done {
			r.result.Converged = r.result.Stopped <= Invariant
			return r.result
		}
	}
}

// run is one call of Lowest.
type run[T dense.Scalar] struct {
	apply   func(dst, src []T)
	against [][]T
	opt     Options
	w       *Workspace[T]

	size   int     // vectors in the space
	judged int     // size of the space that result.Value belongs to
	scale  float64 // bound on the size of the projected H so far
	result Result
}

// start projects and normalizes x in place.
func (r *run[T]) start(x []T) (Reason, bool) {
	before := dense.Norm(x)
	if before == 0 {
		return ZeroStart, false
	}
	if !finite(before) {
		return NotFinite, false
	}
	divide(before, x)
	if len(r.against) == 0 {
		return 0, true
	}
	r.w.remove(r.against, x)
	after := dense.Norm(x)
	if after < 1e3*eps {
		return ZeroStart, false
	}
	divide(after, x)
	r.w.remove(r.against, x)
	divide(dense.Norm(x), x)
	return 0, true
}

// expand builds a Krylov space from the normalized x. It returns true when there is nothing left to do.
func (r *run[T]) expand(x []T) bool {
	w, n := r.w, len(x)
	room := min(r.opt.MaxVectors, r.opt.MaxApplications-r.result.Applications)
	rank := n - len(r.against) // no space is larger
	w.reset(room)
	r.size = 0
	copy(w.vector(0, n), x)
	for {
		j := r.size
		v, next := w.vector(j, n), w.vector(j+1, n)
		r.apply(next, v)
		r.result.Applications++
		r.size++
		w.remove(r.against, next)
		alpha, beta := w.orthogonalize(w.vectors[:r.size], next)
		if !finite(alpha) || !finite(beta) {
			return r.fail()
		}
		w.alpha[j], w.beta[j] = alpha, beta
		if r.result.Applications == 1 {
			r.result.Start = alpha
		}
		left := 0.0
		if j > 0 {
			left = w.beta[j-1]
		}
		r.scale = max(r.scale, math.Abs(alpha)+left+beta)
		exhausted := beta <= breakdown*r.scale || r.size >= rank
		full := r.size == room
		if exhausted || full || r.size <= 32 || r.size%8 == 0 || r.opt.Gain > 0 {
			if done := r.judge(beta, exhausted); done || full {
				return done || r.result.Applications >= r.opt.MaxApplications
			}
		}
		divide(beta, next)
	}
}

// judge solves the tridiagonal problem and decides whether its lowest pair is good enough.
func (r *run[T]) judge(beta float64, exhausted bool) bool {
	w, m := r.w, r.size
	if err := dense.TridiagonalEigen(w.alpha[:m], w.beta[:m-1], w.values[:m], w.ritz[:m*m]); err != nil {
		return r.fail()
	}
	gain, known := r.result.Value-w.values[0], m > 1 && r.judged == m-1
	r.result.Value, r.judged = w.values[0], m
	r.result.Residual = beta * math.Abs(w.ritz[(m-1)*m])
	r.result.Gap = math.Inf(1)
	if m > 1 {
		r.result.Gap = w.values[1] - w.values[0]
	}
	tolerance := r.opt.Tolerance
	if tolerance <= 0 {
		tolerance = defaultTolerance * max(math.Abs(w.values[0]), math.Abs(w.values[m-1]))
	}
	switch {
	case exhausted:
		r.result.Stopped = Invariant
	case r.result.Residual <= max(tolerance, floor*r.scale):
		r.result.Stopped = WithinTolerance
	case known && gain < r.opt.Gain:
		r.result.Stopped = SmallGain
	default:
		r.result.Stopped = Exhausted
		return false
	}
	return true
}

// fail ends the search for numbers that are not finite.
func (r *run[T]) fail() bool {
	nan := math.NaN()
	r.result.Value, r.result.Residual, r.result.Gap, r.result.Stopped = nan, nan, nan, NotFinite
	return true
}

// best writes the lowest vector of the space to x.
func (r *run[T]) best(x []T) {
	m := r.size
	coef, _ := r.w.room(m)
	for i := range m {
		coef[i] = dense.FromFloat[T](r.w.ritz[i*m])
	}
	clear(x)
	divide(norm(r.w.read(pass[T]{x: x, factors: coef, subtract: r.w.vectors[:m], norm: true}, nil), x), x)
}

func finite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// divide divides x by s; a division, not a product with 1/s, which overflows for subnormal s.
func divide[T dense.Scalar](s float64, x []T) {
	if s < 0x1p-1000 {
		d := dense.FromFloat[T](s)
		for i := range x {
			x[i] /= d
		}
		return
	}
	dense.Scale(dense.FromFloat[T](1/s), x)
}
