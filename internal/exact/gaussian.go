package exact

import (
	"fmt"
	"math"
	"math/cmplx"
)

// A Gaussian is a state of free fermions, known by its two-point functions.
type Gaussian struct {
	Energy float64
	Gap    float64 // to the next state of the same particle number or parity
	Odd    bool    // parity of the particle number
	n      int
	paired bool
	hop    []complex128 // <c_i^+ c_j>
	pair   []complex128 // <c_i c_j>
}

func newGaussian(n int) *Gaussian {
	return &Gaussian{n: n, hop: make([]complex128, n*n), pair: make([]complex128, n*n)}
}

// Density returns <n_i>.
func (g *Gaussian) Density(i int) float64 { return real(g.hop[i*g.n+i]) }

// TwoPoint returns <first_i second_j> of operators named c, c^+ or n.
func (g *Gaussian) TwoPoint(first string, i int, second string, j int) complex128 {
	return g.Expect(T(1, first, i, second, j))
}

// Expect returns the expectation value of a term of c, c^+ and n by Wick's
// theorem.
func (g *Gaussian) Expect(t Term) complex128 {
	var ops []Op
	for _, op := range t.Ops {
		switch op.Name {
		case "c", "c^+":
			ops = append(ops, op)
		case "n":
			ops = append(ops, Op{Name: "c^+", Site: op.Site}, Op{Name: "c", Site: op.Site})
		default:
			panic(fmt.Sprintf("exact: no free-fermion operator %q", op.Name))
		}
	}
	m := len(ops)
	if m%2 == 1 {
		return 0
	}
	a := make([]complex128, m*m)
	for i := range m {
		for j := i + 1; j < m; j++ {
			a[i*m+j] = g.contract(ops[i], ops[j])
			a[j*m+i] = -a[i*m+j]
		}
	}
	return t.Coef * Pfaffian(m, a)
}

func (g *Gaussian) contract(x, y Op) complex128 {
	i, j := x.Site, y.Site
	switch {
	case x.Name == "c^+" && y.Name == "c":
		return g.hop[i*g.n+j]
	case x.Name == "c" && y.Name == "c^+":
		if i == j {
			return 1 - g.hop[j*g.n+i]
		}
		return -g.hop[j*g.n+i]
	case x.Name == "c":
		return g.pair[i*g.n+j]
	default: // <c_i^+ c_j^+> = conj <c_j c_i>
		return cmplx.Conj(g.pair[j*g.n+i])
	}
}

// Occupations returns the eigenvalues zeta of the correlation matrix of the
// given modes (Peschel 2003), one a mode; with pairing, zeta and 1 - zeta of
// each.
func (g *Gaussian) Occupations(modes []int) ([]float64, error) {
	m := len(modes)
	if !g.paired {
		a := make([]complex128, m*m)
		for i, x := range modes {
			for j, y := range modes {
				a[i*m+j] = g.hop[x*g.n+y]
			}
		}
		values, _, err := eigenHermitian(m, a)
		return values, err
	}
	a := make([]complex128, 4*m*m)
	for i, x := range modes {
		for j, y := range modes { // rows (c^+, c), columns (c, c^+)
			a[i*2*m+j] = g.contract(Op{Name: "c^+", Site: x}, Op{Name: "c", Site: y})
			a[i*2*m+m+j] = g.contract(Op{Name: "c^+", Site: x}, Op{Name: "c^+", Site: y})
			a[(m+i)*2*m+j] = g.contract(Op{Name: "c", Site: x}, Op{Name: "c", Site: y})
			a[(m+i)*2*m+m+j] = g.contract(Op{Name: "c", Site: x}, Op{Name: "c^+", Site: y})
		}
	}
	values, _, err := eigenHermitian(2*m, a)
	return values, err
}

// Entropy returns the entanglement entropy in nats of the given modes. They
// must be neighbours in the order of the fermions, from its start, to agree
// with the entropy of a block of sites.
func (g *Gaussian) Entropy(modes []int) (float64, error) {
	return g.sum(modes, binaryEntropy)
}

// Renyi2 returns the second Renyi entropy of the given modes.
func (g *Gaussian) Renyi2(modes []int) (float64, error) {
	return g.sum(modes, func(z float64) float64 { return -math.Log(z*z + (1-z)*(1-z)) })
}

func (g *Gaussian) sum(modes []int, f func(float64) float64) (float64, error) {
	values, err := g.Occupations(modes)
	if err != nil {
		return 0, err
	}
	var s float64
	for _, z := range values {
		s += f(z)
	}
	return s * float64(len(modes)) / float64(max(1, len(values))), nil
}

// Entropies returns the entropy of every cut of the modes into those before
// and after: perSite modes are added at a time.
func (g *Gaussian) Entropies(perSite int) ([]float64, error) {
	var out []float64
	for last := perSite; last < g.n; last += perSite {
		modes := make([]int, last)
		for i := range modes {
			modes[i] = i
		}
		s, err := g.Entropy(modes)
		if err != nil {
			return nil, err
		}
		out = append(out, s)
	}
	return out, nil
}

// Pfaffian of the antisymmetric row-major n×n matrix, by elimination with
// pivoting (Parlett, Reid 1970; Wimmer 2012). It overwrites a.
func Pfaffian(n int, a []complex128) complex128 {
	if n%2 == 1 {
		return 0
	}
	result := complex128(1)
	for k := 0; k < n; k += 2 {
		pivot := k + 1
		for i := k + 2; i < n; i++ {
			if cmplx.Abs(a[i*n+k]) > cmplx.Abs(a[pivot*n+k]) {
				pivot = i
			}
		}
		if pivot != k+1 {
			exchange(n, a, k+1, pivot)
			result = -result
		}
		p := a[k*n+k+1]
		if p == 0 {
			return 0
		}
		result *= p
		for i := k + 2; i < n; i++ {
			f := a[k*n+i] / p
			g := a[(k+1)*n+i] / p
			for j := k + 2; j < n; j++ {
				a[i*n+j] += g*a[k*n+j] - f*a[(k+1)*n+j]
			}
		}
	}
	return result
}

func exchange(n int, a []complex128, i, j int) {
	for k := range n {
		a[i*n+k], a[j*n+k] = a[j*n+k], a[i*n+k]
	}
	for k := range n {
		a[k*n+i], a[k*n+j] = a[k*n+j], a[k*n+i]
	}
}
