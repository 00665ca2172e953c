package exact

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

type number interface{ float64 | complex128 }

func fromFloat[N number](x float64) N {
	var out N
	switch p := any(&out).(type) {
	case *float64:
		*p = x
	case *complex128:
		*p = complex(x, 0)
	}
	return out
}

func dot[N number](x, y []N) N {
	var s N
	switch x := any(x).(type) {
	case []float64:
		var sum float64
		for i, v := range any(y).([]float64) {
			sum += x[i] * v
		}
		*any(&s).(*float64) = sum
	case []complex128:
		var sum complex128
		for i, v := range any(y).([]complex128) {
			sum += cmplx.Conj(x[i]) * v
		}
		*any(&s).(*complex128) = sum
	}
	return s
}

func axpy[N number](a N, x, y []N) {
	for i, v := range x {
		y[i] += a * v
	}
}

func scale[N number](a float64, x []N) {
	f := fromFloat[N](a)
	for i := range x {
		x[i] *= f
	}
}

func norm[N number](x []N) float64 {
	switch s := any(dot(x, x)).(type) {
	case float64:
		return math.Sqrt(s)
	case complex128:
		return math.Sqrt(real(s))
	}
	panic("unreachable")
}

func orthogonalize[N number](w []N, bases ...[][]N) {
	for range 2 {
		for _, basis := range bases {
			for _, v := range basis {
				axpy(-dot(v, w), v, w)
			}
		}
	}
}

const (
	lanczosVectors = 80   // most basis vectors before a restart
	lanczosKept    = 20   // Ritz vectors that survive a restart
	lanczosCycles  = 2000 // restarts before giving up
	lanczosGoal    = 1e-13
)

// A lanczosRun is a Krylov basis v with the projected matrix t; the vector
// after the last one of v is next, coupled by beta.
type lanczosRun[N number] struct {
	apply  func(dst, src []N)
	locked [][]N
	v      [][]N
	t      *mat.SymDense // real: the couplings are norms and Ritz components
	next   []N
	beta   float64
	scale  float64 // largest |Ritz value| seen
}

// lanczos returns the lowest eigenpair orthogonal to the locked vectors, to a
// residual of 1e-13 of the matrix norm.
func lanczos[N number](apply func(dst, src []N), start []N, locked [][]N) (float64, []N, error) {
	r := &lanczosRun[N]{apply: apply, locked: locked, next: start, t: mat.NewSymDense(lanczosVectors, nil)}
	orthogonalize(r.next, locked)
	r.beta = norm(r.next)
	scale(1/r.beta, r.next)
	for range lanczosCycles {
		for len(r.v) < lanczosVectors {
			r.extend()
			full := len(r.v) == lanczosVectors
			if !full && len(r.v)%8 != 0 && r.beta > 1e-13*r.scale {
				continue
			}
			values, s := r.ritz()
			n := len(r.v)
			if r.beta*math.Abs(s.At(n-1, 0)) <= lanczosGoal*r.scale {
				x := r.combine(s, 0)
				return r.quotient(x), x, nil
			}
			if full {
				r.restart(values, s)
				break
			}
		}
	}
	return 0, nil, errors.New("no convergence of the Lanczos iteration")
}

// extend takes next into the basis and finds the new next.
func (r *lanczosRun[N]) extend() {
	j := len(r.v)
	r.v = append(r.v, r.next)
	w := make([]N, len(r.next))
	r.apply(w, r.next)
	alpha := dot(r.next, w)
	switch a := any(alpha).(type) {
	case float64:
		r.t.SetSym(j, j, a)
	case complex128:
		r.t.SetSym(j, j, real(a))
	}
	orthogonalize(w, r.locked, r.v)
	r.beta = norm(w)
	r.scale = max(r.scale, math.Abs(r.t.At(j, j)), r.beta)
	if r.beta > 0 {
		scale(1/r.beta, w)
	}
	r.next = w
	if j+1 < lanczosVectors {
		r.t.SetSym(j, j+1, r.beta)
	}
}

func (r *lanczosRun[N]) ritz() ([]float64, *mat.Dense) {
	n := len(r.v)
	t := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			t.SetSym(i, j, r.t.At(i, j))
		}
	}
	var e mat.EigenSym
	if !e.Factorize(t, true) {
		panic("exact: eigenvalues of the projected matrix did not converge")
	}
	var s mat.Dense
	e.VectorsTo(&s)
	values := e.Values(nil)
	r.scale = max(r.scale, math.Abs(values[0]), math.Abs(values[n-1]))
	return values, &s
}

func (r *lanczosRun[N]) combine(s *mat.Dense, column int) []N {
	x := make([]N, len(r.next))
	for j, v := range r.v {
		axpy(fromFloat[N](s.At(j, column)), v, x)
	}
	scale(1/norm(x), x)
	return x
}

func (r *lanczosRun[N]) quotient(x []N) float64 {
	y := make([]N, len(x))
	r.apply(y, x)
	switch e := any(dot(x, y)).(type) {
	case float64:
		return e
	case complex128:
		return real(e)
	}
	panic("unreachable")
}

// restart keeps the lowest Ritz vectors; next stays coupled to all of them.
func (r *lanczosRun[N]) restart(values []float64, s *mat.Dense) {
	n := len(r.v)
	kept := make([][]N, lanczosKept)
	for i := range kept {
		kept[i] = r.combine(s, i)
	}
	r.t.Zero()
	for i := range kept {
		r.t.SetSym(i, i, values[i])
		r.t.SetSym(i, lanczosKept, r.beta*s.At(n-1, i))
	}
	r.v = kept
}
