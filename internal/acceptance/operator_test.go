package acceptance

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"

	"rundle/internal/modelfile"
	"rundle/mpo"
	"rundle/mpo/ladder"
)

// side holds the parts of terms on one side of a cut.
type side struct {
	index   map[string]int
	strings [][]ladder.Factor
}

func (s *side) number(f []ladder.Factor) int {
	key := fmt.Sprint(f)
	i, ok := s.index[key]
	if !ok {
		i = len(s.strings)
		s.index[key] = i
		s.strings = append(s.strings, f)
	}
	return i
}

// coordinates returns vectors, one a column, with the Hilbert-Schmidt products tr(A^+ B)/dim of the strings; without, the part
// along the identity is taken off. Fermion signs drop out: products of strings differ from zero only where the odd factors stand on
// the same sites, and then the signs square to one. (Pivoted Cholesky factorization.)
func (s *side) coordinates(l *ladder.Ladder, without bool) [][]complex128 {
	n := len(s.strings)
	var rows [][]complex128
	left := make([]float64, n) // what the rows so far leave of the squared lengths
	for i, f := range s.strings {
		left[i] = real(product(l, f, f, without))
	}
	var top float64
	for _, x := range left {
		top = max(top, x)
	}
	for len(rows) < n {
		pivot := 0
		for i, x := range left {
			if x > left[pivot] {
				pivot = i
			}
		}
		if left[pivot] <= 1e-12*top {
			break
		}
		row := make([]complex128, n)
		for i, f := range s.strings {
			row[i] = product(l, s.strings[pivot], f, without)
			for _, r := range rows {
				row[i] -= cmplx.Conj(r[pivot]) * r[i]
			}
		}
		root := complex(math.Sqrt(left[pivot]), 0)
		for i := range row {
			row[i] /= root
			left[i] -= real(row[i])*real(row[i]) + imag(row[i])*imag(row[i])
		}
		left[pivot] = 0
		rows = append(rows, row)
	}
	return rows
}

// product is tr(A^+ B)/dim for two strings, less tr(A)^* tr(B)/dim^2 where the identity is taken off.
func product(l *ladder.Ladder, a, b []ladder.Factor, without bool) complex128 {
	p := complex128(1)
	i, j := 0, 0
	for i < len(a) || j < len(b) {
		switch {
		case j == len(b) || i < len(a) && a[i].Site < b[j].Site:
			p *= localProduct(l.Site(int(a[i].Site)), a[i].Op, ladder.Identity)
			i++
		case i == len(a) || b[j].Site < a[i].Site:
			p *= localProduct(l.Site(int(b[j].Site)), ladder.Identity, b[j].Op)
			j++
		default:
			p *= localProduct(l.Site(int(a[i].Site)), a[i].Op, b[j].Op)
			i++
			j++
		}
	}
	if without {
		p -= product(l, a, nil, false) * product(l, nil, b, false)
	}
	return p
}

func localProduct(s ladder.Site, a, b ladder.OpID) complex128 {
	x, y := s.Matrix(a), s.Matrix(b)
	var sum complex128
	for i := range x {
		sum += cmplx.Conj(x[i]) * y[i]
	}
	return sum / complex(float64(s.Dim()), 0)
}

// operatorBond counts what a bond of the operator must hold: the Schmidt rank of the terms that cross the cut, one index for
// what has yet to begin and one for what is done. It knows only the polynomial and the matrices of single sites.
func operatorBond(p *ladder.Polynomial, cut int) int {
	left, right := &side{index: map[string]int{}}, &side{index: map[string]int{}}
	type entry struct {
		l, r int
		z    complex128
	}
	var crossing []entry
	vacant, done := 0, 0
	for k := range p.NumTerms() {
		z, f := p.Term(k)
		at := 0
		for at < len(f) && int(f[at].Site) < cut {
			at++
		}
		switch {
		case len(f) == 0:
		case at == 0:
			vacant = 1
		case at == len(f):
			done = 1
		default:
			crossing = append(crossing, entry{left.number(f[:at]), right.number(f[at:]), z})
		}
	}
	x, y := left.coordinates(p.Ladder(), vacant == 1), right.coordinates(p.Ladder(), done == 1)
	c := make([][]complex128, len(x))
	for a := range x {
		c[a] = make([]complex128, len(y))
		for b := range y {
			for _, e := range crossing {
				c[a][b] += x[a][e.l] * e.z * y[b][e.r]
			}
		}
	}
	return rank(c, 1e-10) + vacant + done
}

// rank counts the singular values above the given part of the largest.
func rank(c [][]complex128, floor float64) int {
	m := len(c)
	if m == 0 || len(c[0]) == 0 {
		return 0
	}
	n := len(c[0])
	double := mat.NewDense(2*m, 2*n, nil) // its singular values are those of c, twice
	for i, row := range c {
		for j, z := range row {
			double.Set(i, j, real(z))
			double.Set(m+i, n+j, real(z))
			double.Set(i, n+j, -imag(z))
			double.Set(m+i, j, imag(z))
		}
	}
	var f mat.SVD
	if !f.Factorize(double, mat.SVDNone) {
		panic("singular values do not converge")
	}
	values := f.Values(nil)
	count := 0
	for _, v := range values {
		if v > floor*values[0] {
			count++
		}
	}
	return count / 2
}

// requireOperatorRank builds the operator in the frames of the Hamiltonian, real where it may be, and compares all its bonds.
func requireOperatorRank(t *testing.T, h *ladder.Hamiltonian) {
	t.Helper()
	frames, err := h.Frames(ladder.FrameOptions{})
	require.NoError(t, err)
	s, err := frames.Strings(h.Poly)
	require.NoError(t, err)
	var bonds []int
	if s.Real {
		o, err := mpo.Build[float64](s, mpo.Options{})
		require.NoError(t, err)
		bonds = o.BondDims()
	} else {
		o, err := mpo.Build[complex128](s, mpo.Options{})
		require.NoError(t, err)
		bonds = o.BondDims()
	}
	want := []int{1}
	for cut := 1; cut < h.Ladder().Sites(); cut++ {
		want = append(want, operatorBond(h.Poly, cut))
	}
	require.Equal(t, append(want, 1), bonds)
	t.Log(bonds)
}

func TestOperatorRankOfModels(t *testing.T) {
	files, err := filepath.Glob("../../examples/*/model.toml")
	require.NoError(t, err)
	require.GreaterOrEqual(t, len(files), 3)
	for _, file := range files {
		t.Run(filepath.Base(filepath.Dir(file)), func(t *testing.T) {
			m, err := modelfile.Load(file)
			require.NoError(t, err)
			requireOperatorRank(t, m.Hamiltonian)
		})
	}
}

// TestOperatorRankOfRandomLadders takes the random ladders of TestRandomLadders, a bit longer: neighbours, diagonals and pairs.
func TestOperatorRankOfRandomLadders(t *testing.T) {
	for i, k := range kinds() {
		for b, boundary := range []string{"open", "ring", "tube"} {
			t.Run(fmt.Sprintf("%s/%s", k.name, boundary), func(t *testing.T) {
				c := &cell{rng: rand.New(rand.NewPCG(uint64(i), uint64(b))), rungs: 5 + i%2, legs: []string{"a", "b", "d"}[:2+b%2],
					ring: boundary != "open", tube: boundary == "tube"}
				k.fill(c)
				_, h := c.hamiltonian(t, k)
				requireOperatorRank(t, h)
			})
		}
	}
}

// TestOperatorRankOfRandomTerms scatters terms of two to four factors over the ladder, with few left parts and many right ones, so
// that covers and ranks differ from the number of terms.
func TestOperatorRankOfRandomTerms(t *testing.T) {
	kinds := []struct {
		name string
		site ladder.Site
		ops  []string // even products of these
		odd  bool     // factors come in pairs
	}{
		{"fermions", ladder.Fermion(), []string{"c^+", "c"}, true},
		{"bosons", ladder.Boson(2), []string{"b^+", "b", "n"}, false},
		{"spins one-half", ladder.Spin(1), []string{"S^+", "S^-", "S^z"}, false},
		{"spins one", ladder.Spin(2), []string{"S^+", "S^z"}, false},
		{"electrons", ladder.Electron(), []string{"c_up^+", "c_down", "c_down^+"}, true},
	}
	for i, k := range kinds {
		for _, size := range []int{8, 40, 120} {
			t.Run(fmt.Sprintf("%s/terms=%d", k.name, size), func(t *testing.T) {
				rng := rand.New(rand.NewPCG(uint64(i), uint64(size)))
				w := newTwice(2, 5)
				for range size {
					count := 2 + rng.IntN(3)
					if k.odd {
						count = 2 + 2*rng.IntN(2)
					}
					var ops []any
					z := complex((0.1+0.9*rng.Float64())*float64(1-2*rng.IntN(2)), 0)
					for _, site := range rng.Perm(w.sites())[:count] {
						op := k.ops[rng.IntN(len(k.ops))]
						if !diagonal(op) && imag(z) == 0 {
							z += complex(0, 0.1+0.9*rng.Float64())
						}
						ops = append(ops, op, site)
					}
					w.add(z, ops...)
				}
				requireOperatorRank(t, w.hamiltonian(t, k.site))
			})
		}
	}
}

// TestOperatorRankOfTunedTerms couples all pairs of sites by numbers of low rank: the covers of strings are far larger.
func TestOperatorRankOfTunedTerms(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	draw := func() complex128 { return complex(0.1+0.9*rng.Float64(), 0) }
	w := newTwice(2, 6)
	first, second, third := make([]complex128, w.sites()), make([]complex128, w.sites()), make([]complex128, w.sites())
	for x := range w.sites() {
		first[x], second[x], third[x] = draw(), draw(), draw()
	}
	for x := range w.sites() {
		for y := x + 1; y < w.sites(); y++ {
			w.add(first[x]*second[y], "n", x, "n", y)                        // rank one
			w.add(first[x]*second[y]+second[x]*third[y], "c^+", x, "c", y)   // rank two, and as much for the conjugate
			w.add(complex(math.Pow(0.8, float64(y-x)), 0), "c^+", x, "c", y) // decays: one more
		}
	}
	h := w.hamiltonian(t, ladder.Fermion())
	requireOperatorRank(t, h)
	require.Equal(t, 1+2*3+2, operatorBond(h.Poly, w.sites()/2))
}
