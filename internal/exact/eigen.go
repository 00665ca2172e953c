package exact

import (
	"errors"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"
)

// eigenHermitian returns all eigenvalues of the row-major n×n matrix,
// ascending, and the eigenvectors one after the other. Real matrices go to
// gonum, complex ones are reduced to a real tridiagonal matrix first.
func eigenHermitian(n int, a []complex128) ([]float64, []complex128, error) {
	for _, z := range a {
		if imag(z) != 0 {
			return eigenComplex(n, a)
		}
	}
	s := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			s.SetSym(i, j, real(a[i*n+j]))
		}
	}
	values, v, err := eigenSymmetric(s)
	if err != nil {
		return nil, nil, err
	}
	vectors := make([]complex128, n*n)
	for k := range n {
		for i := range n {
			vectors[k*n+i] = complex(v.At(i, k), 0)
		}
	}
	return values, vectors, nil
}

func eigenSymmetric(s *mat.SymDense) ([]float64, *mat.Dense, error) {
	var e mat.EigenSym
	if !e.Factorize(s, true) {
		return nil, nil, errors.New("exact: symmetric eigenvalues did not converge")
	}
	var v mat.Dense
	e.VectorsTo(&v)
	return e.Values(nil), &v, nil
}

// eigenComplex reduces A = Q T Q^H by Householder reflections, T real and
// tridiagonal, and takes the eigenvectors of T back through Q.
func eigenComplex(n int, a []complex128) ([]float64, []complex128, error) {
	a = append([]complex128(nil), a...)
	reflectors := make([][]complex128, 0, n)
	for k := 0; k+2 < n; k++ {
		u := make([]complex128, n-k-1)
		for i := range u {
			u[i] = a[(k+1+i)*n+k]
		}
		reflectors = append(reflectors, reflector(u))
		reflectBoth(n, k+1, a, u)
	}
	// What remains below the diagonal is complex: its phases go into a
	// diagonal unitary.
	phase := make([]complex128, n)
	t := mat.NewSymDense(n, nil)
	for k := range n {
		t.SetSym(k, k, real(a[k*n+k]))
		if k == 0 {
			phase[0] = 1
			continue
		}
		e := a[k*n+k-1]
		size := cmplx.Abs(e)
		t.SetSym(k-1, k, size)
		phase[k] = phase[k-1]
		if size > 0 {
			phase[k] *= e / complex(size, 0)
		}
	}
	values, v, err := eigenSymmetric(t)
	if err != nil {
		return nil, nil, err
	}
	vectors := make([]complex128, n*n)
	for k := range n {
		x := vectors[k*n : (k+1)*n]
		for i := range x {
			x[i] = phase[i] * complex(v.At(i, k), 0)
		}
		for c := len(reflectors) - 1; c >= 0; c-- {
			reflect(reflectors[c], x[c+1:])
		}
	}
	return values, vectors, nil
}

// reflector turns u into the unit vector of the reflection 1 - 2 u u^H that
// takes it onto its first component; a zero u stays zero.
func reflector(u []complex128) []complex128 {
	size := norm(u)
	if size == 0 {
		return u
	}
	phase := complex128(1)
	if u[0] != 0 {
		phase = u[0] / complex(cmplx.Abs(u[0]), 0)
	}
	u[0] += phase * complex(size, 0)
	scale(1/norm(u), u)
	return u
}

func reflect(u, x []complex128) { axpy(-2*dot(u, x), u, x) }

// reflectBoth replaces a by R a R with R acting on rows and columns from
// first on: a - 2 u p^H - 2 p u^H + 4 (u^H p) u u^H, p = a u.
func reflectBoth(n, first int, a, u []complex128) {
	p := make([]complex128, n)
	for i := range n {
		for j, x := range u {
			p[i] += a[i*n+first+j] * x
		}
	}
	up := dot(u, p[first:])
	for i := range n {
		row := a[i*n : (i+1)*n]
		for j, x := range u { // right side: a R
			row[first+j] -= 2 * p[i] * cmplx.Conj(x)
		}
	}
	// Left side on the result: u^H (a R) = (a u)^H - 2 (u^H a u) u^H for the
	// Hermitian a; written out for all columns.
	for j := range n {
		q := cmplx.Conj(p[j])
		if j >= first {
			q -= 2 * up * cmplx.Conj(u[j-first])
		}
		for i, x := range u {
			a[(first+i)*n+j] -= 2 * x * q
		}
	}
}

// binaryEntropy returns -x ln x - (1-x) ln(1-x), 0 outside (0, 1).
func binaryEntropy(x float64) float64 {
	if x <= 0 || x >= 1 {
		return 0
	}
	return -x*math.Log(x) - (1-x)*math.Log1p(-x)
}
