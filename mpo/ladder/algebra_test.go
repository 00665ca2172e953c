package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// kinds are the sites that the property tests run on.
var kinds = map[string]func() Site{
	"fermion":         Fermion,
	"electron":        func() Site { return Electron() },
	"electron single": func() Site { return Electron(Double(false)) },
	"boson":           func() Site { return Boson(9) },
	"spin 1/2":        func() Site { return Spin(1) },
	"spin 1":          func() Site { return Spin(2) },
	"spin 2":          func() Site { return Spin(4) },
	"spin 7/2":        func() Site { return Spin(7) },
	"spin 10":         func() Site { return Spin(20) },
	"clock 2":         func() Site { return Clock(2) },
	"clock 3":         func() Site { return Clock(3) },
	"clock 8":         func() Site { return Clock(8) },
	"clock 12":        func() Site { return Clock(12) },
}

// bosonElement draws a low element, with an exponential now and then.
func bosonElement(t *rapid.T, s Site, label string) OpID {
	p := rapid.IntRange(0, 2).Draw(t, label+" p")
	q := rapid.IntRange(0, 2).Draw(t, label+" q")
	f := 0
	if angle := rapid.SampledFrom([]float64{0, 0.7, math.Pi, -2.1}).Draw(t, label+" angle"); angle != 0 {
		w, err := s.ops.exponentiate([]Weighted{{complex(0, angle), bosonOp(1, 1, 0)}, {complex(0.1, angle/3), bosonOp(2, 2, 0)}})
		require.NoError(t, err)
		_, _, f = bosonParts(w[0].Op)
	}
	return bosonOp(p, q, f)
}

func element(t *rapid.T, s Site, label string) OpID {
	switch s.kind {
	case KindFermion:
		return OpID(rapid.IntRange(0, 3).Draw(t, label))
	case KindElectron:
		return OpID(rapid.IntRange(0, 15).Draw(t, label))
	case KindBoson:
		return bosonElement(t, s, label)
	case KindSpin:
		return OpID(rapid.IntRange(0, (s.size+1)*(s.size+1)-1).Draw(t, label))
	}
	return OpID(rapid.IntRange(0, s.size*s.size-1).Draw(t, label))
}

// full is the site whose matrices multiply: without double occupation they are cut, so there the test looks at the full ones.
func full(s Site) Site {
	if s.single {
		return Electron()
	}
	return s
}

func times(s Site, a, b []Weighted) []Weighted {
	var out []Weighted
	for _, x := range a {
		for _, y := range b {
			for _, z := range s.Mul(x.Op, y.Op) {
				out = append(out, Weighted{x.Coef * y.Coef * z.Coef, z.Op})
			}
		}
	}
	return mergeWeighted(out)
}

func adjointOf(s Site, a []Weighted) []Weighted {
	var out []Weighted
	for _, x := range a {
		for _, y := range s.Adjoint(x.Op) {
			out = append(out, Weighted{cmplx.Conj(x.Coef) * y.Coef, y.Op})
		}
	}
	return mergeWeighted(out)
}

func matrixOf(s Site, a []Weighted) []complex128 {
	m := make([]complex128, s.Dim()*s.Dim())
	for _, x := range a {
		for i, v := range s.Matrix(x.Op) {
			m[i] += x.Coef * v
		}
	}
	return m
}

func matMul(n int, a, b []complex128) []complex128 {
	c := make([]complex128, n*n)
	for i := range n {
		for k := range n {
			if a[i*n+k] == 0 {
				continue
			}
			for j := range n {
				c[i*n+j] += a[i*n+k] * b[k*n+j]
			}
		}
	}
	return c
}

func conjugateTranspose(n int, m []complex128) []complex128 {
	out := make([]complex128, n*n)
	for i := range n {
		for j := range n {
			out[j*n+i] = cmplx.Conj(m[i*n+j])
		}
	}
	return out
}

func largest(m []complex128) float64 {
	v := 0.0
	for _, z := range m {
		v = max(v, cmplx.Abs(z))
	}
	return v
}

// near compares matrices on the first n columns, relative to size.
func near(t require.TestingT, dim, n int, a, b []complex128, size float64, what string) {
	for i := range dim {
		for j := range n {
			if d := cmplx.Abs(a[i*dim+j] - b[i*dim+j]); !(d <= 1e-11*size) {
				require.Failf(t, what, "element %d,%d: %v and %v", i, j, a[i*dim+j], b[i*dim+j])
			}
		}
	}
}

func TestAlgebraOfSites(t *testing.T) {
	for name, make := range kinds {
		t.Run(name, func(t *testing.T) {
			s := make()
			rapid.Check(t, func(t *rapid.T) {
				a, b, c := element(t, s, "a"), element(t, s, "b"), element(t, s, "c")
				one := func(x OpID) []Weighted { return []Weighted{{1, x}} }
				m := full(s)
				dim := m.Dim()
				columns := dim
				if s.kind == KindBoson {
					columns = dim - 6 // products of three raise by at most six
				}
				A, B, C := m.Matrix(a), m.Matrix(b), m.Matrix(c)
				size := math.Max(1, largest(A)) * math.Max(1, largest(B)) * math.Max(1, largest(C)) * float64(dim)

				ab := times(s, one(a), one(b))
				near(t, dim, columns, matrixOf(m, ab), matMul(dim, A, B), size, "matrix of a product")
				left, right := times(s, ab, one(c)), times(s, one(a), times(s, one(b), one(c)))
				near(t, dim, columns, matrixOf(m, left), matrixOf(m, right), size, "associativity")
				adj := adjointOf(s, ab)
				near(t, dim, dim, matrixOf(m, adj), matrixOf(m, times(s, adjointOf(s, one(b)), adjointOf(s, one(a)))), size, "adjoint of a product")

				require.Len(t, s.Adjoint(a), 1, "the adjoint of an element is an element")
				require.Equal(t, one(a), s.Mul(a, Identity))
				require.Equal(t, one(a), s.Mul(Identity, a))
				adjoint := matrixOf(m, s.Adjoint(a))
				near(t, dim, dim, adjoint, conjugateTranspose(dim, A), largest(A), "adjoint of an element")
				checkLabels(t, s, a)
			})
		})
	}
}

// checkLabels compares Raise and Odd with where the matrix has entries.
func checkLabels(t *rapid.T, s Site, op OpID) {
	m, n := s.Matrix(op), s.Dim()
	raise := s.Raise(op)
	require.Len(t, raise, len(s.Labels()))
	diagonal := true
	for out := range n {
		for in := range n {
			if m[out*n+in] == 0 {
				continue
			}
			diagonal = diagonal && out == in
			p, q := s.StateLabels(out), s.StateLabels(in)
			for k, label := range s.Labels() {
				change := p[k] - q[k]
				if label.Modulus > 0 {
					change = mod(change, label.Modulus)
				}
				require.Equal(t, raise[k], change, "label %s of %s", label.Name, s.Format(op, "a", 0))
			}
		}
	}
	if s.Diagonal(op) {
		require.True(t, diagonal)
	}
}

func TestBasisIsIndependent(t *testing.T) {
	// As many elements as matrix units, and each matrix unit is a combination: the Gram matrix of the elements is regular.
	for _, name := range []string{"fermion", "electron", "spin 1/2", "spin 1", "spin 2", "spin 7/2", "clock 2", "clock 3", "clock 8"} {
		t.Run(name, func(t *testing.T) {
			s := kinds[name]()
			n := s.Dim()
			rows := make([][]complex128, n*n)
			for op := range rows {
				m := s.Matrix(OpID(op))
				scale := complex(1/largest(m), 0)
				rows[op] = make([]complex128, n*n)
				for i, v := range m {
					rows[op][i] = v * scale
				}
			}
			require.Equal(t, n*n, rank(rows))
		})
	}
}

func rank(rows [][]complex128) int {
	r := 0
	for c := range rows[0] {
		p := r
		for i := r; i < len(rows); i++ {
			if cmplx.Abs(rows[i][c]) > cmplx.Abs(rows[p][c]) {
				p = i
			}
		}
		if p == len(rows) || cmplx.Abs(rows[p][c]) < 1e-10 {
			continue
		}
		rows[r], rows[p] = rows[p], rows[r]
		for i := r + 1; i < len(rows); i++ {
			f := rows[i][c] / rows[r][c]
			for k := range rows[i] {
				rows[i][k] -= f * rows[r][k]
			}
		}
		if r++; r == len(rows) {
			break
		}
	}
	return r
}

func TestRelationsOfOperators(t *testing.T) {
	s := func(site Site, name, super string) []Weighted {
		w, ok := site.Symbol(name, super)
		require.True(t, ok, "%s^%s", name, super)
		return w
	}
	plus := func(a, b []Weighted, c complex128) []Weighted {
		out := append([]Weighted{}, a...)
		for _, x := range b {
			out = append(out, Weighted{c * x.Coef, x.Op})
		}
		return mergeWeighted(out)
	}
	one := []Weighted{{1, 0}}
	f, e, b := Fermion(), Electron(), Boson(2)
	require.Equal(t, one, plus(times(f, s(f, "c", ""), s(f, "c", "+")), times(f, s(f, "c", "+"), s(f, "c", "")), 1))
	require.Empty(t, plus(times(e, s(e, "c_up", ""), s(e, "c_down", "+")), times(e, s(e, "c_down", "+"), s(e, "c_up", "")), 1))
	require.Equal(t, one, plus(times(e, s(e, "c_down", ""), s(e, "c_down", "+")), times(e, s(e, "c_down", "+"), s(e, "c_down", "")), 1))
	require.Equal(t, one, plus(times(b, s(b, "b", ""), s(b, "b", "+")), times(b, s(b, "b", "+"), s(b, "b", "")), -1))
	for twoS := 1; twoS <= MaxTwoS; twoS++ {
		p := Spin(twoS)
		z, up, down := s(p, "S", "z"), s(p, "S", "+"), s(p, "S", "-")
		require.Equal(t, len(z), len(plus(times(p, up, down), times(p, down, up), -1)), "[S+,S-] = 2 S^z, 2s = %d", twoS)
		casimir := plus(times(p, z, z), plus(times(p, up, down), times(p, down, up), 1), 0.5)
		require.Len(t, casimir, 1, "2s = %d", twoS)
		require.InDelta(t, float64(twoS*(twoS+2))/4, real(casimir[0].Coef), 1e-10)
		require.Equal(t, Identity, casimir[0].Op)
		x, y := s(p, "S", "x"), s(p, "S", "y")
		commutator := plus(times(p, x, y), times(p, y, x), -1)
		require.Len(t, commutator, 1)
		require.InDelta(t, 0, cmplx.Abs(commutator[0].Coef-1i), 1e-12)
	}
	for q := 2; q <= MaxClock; q++ {
		c := Clock(q)
		zx, xz := times(c, s(c, "Z", ""), s(c, "X", "")), times(c, s(c, "X", ""), s(c, "Z", ""))
		require.InDelta(t, 0, cmplx.Abs(zx[0].Coef-xz[0].Coef*turn(1, q)), 1e-14)
	}
	// The electron's spin operators obey the algebra of spins.
	z, up, down := s(e, "S", "z"), s(e, "S", "+"), s(e, "S", "-")
	require.Equal(t, plus(z, z, 1), plus(times(e, up, down), times(e, down, up), -1))
	require.Equal(t, up, plus(times(e, z, up), times(e, up, z), -1))
}

func TestBosonsAreCutAfterOrdering(t *testing.T) {
	b := Boson(2)
	w := b.Mul(bosonOp(0, 1, 0), bosonOp(1, 0, 0)) // b b^+
	require.Equal(t, []complex128{1, 0, 0, 0, 2, 0, 0, 0, 3}, matrixOf(b, w))
	w = b.Mul(bosonOp(2, 2, 0), bosonOp(1, 1, 0)) // n(n-1) n = 2 n(n-1) + n(n-1)(n-2)
	require.Equal(t, []Weighted{{2, bosonOp(2, 2, 0)}, {1, bosonOp(3, 3, 0)}}, w)
	require.True(t, b.Vanishes(bosonOp(3, 3, 0)))
	_, err := b.ops.multiply(bosonOp(MaxPower, 0, 0), bosonOp(1, 0, 0))
	require.ErrorIs(t, err, errPower)
}

func TestSingleOccupationIsCutAfterOrdering(t *testing.T) {
	s := Electron(Double(false))
	up, _ := s.Symbol("c_up", "")
	raise, _ := s.Symbol("c_up", "+")
	down, _ := s.Symbol("c_down", "+")
	require.Equal(t, []complex128{1, 0, 0, 0, 0, 0, 0, 0, 1}, matrixOf(s, times(s, up, raise)), "c_up c_up^+ is 1 - n_up")
	require.Equal(t, make([]complex128, 9), matrixOf(s, times(s, raise, down)))
	require.Equal(t, 3, s.Dim())
}

func TestExponentials(t *testing.T) {
	for name, make := range kinds {
		t.Run(name, func(t *testing.T) {
			s := make()
			var x []Weighted
			switch s.kind {
			case KindClock:
				x = []Weighted{{0.3i, 1}, {0.3i, OpID(s.size - 1)}}
			default:
				symbol := map[Kind][2]string{KindFermion: {"n", ""}, KindElectron: {"n_up", ""}, KindBoson: {"n", ""}, KindSpin: {"S", "z"}}[s.kind]
				x, _ = s.Symbol(symbol[0], symbol[1])
				x = mergeWeighted(append([]Weighted{{0.2i, 0}}, Weighted{0.8i, x[0].Op}))
			}
			w, err := s.ops.exponentiate(x)
			require.NoError(t, err)
			d, e, n := matrixOf(s, x), matrixOf(s, w), s.Dim()
			for i := range n {
				require.InDelta(t, 0, cmplx.Abs(e[i*n+i]-cmplx.Exp(d[i*n+i])), 1e-12)
			}
		})
	}
}

func TestBosonExponentialsAreCanonical(t *testing.T) {
	b := Boson(20)
	exp := func(linear, pairs complex128) OpID {
		w, err := b.ops.exponentiate([]Weighted{{linear, bosonOp(1, 1, 0)}, {pairs, bosonOp(2, 2, 0)}})
		require.NoError(t, err)
		require.Equal(t, complex128(1), w[0].Coef)
		return w[0].Op
	}
	pi := complex(0, math.Pi)
	require.Equal(t, exp(pi, 0), exp(-pi, 0))
	require.Equal(t, exp(pi, 0), exp(3*pi, 0))
	require.Equal(t, Identity, exp(2*pi, 0))
	require.Equal(t, exp(pi, 0), exp(pi, pi), "n(n-1) is even")
	require.NotEqual(t, exp(pi, 0), exp(pi+1e-9i, 0))
	sign := exp(pi, 0)
	require.Equal(t, []Weighted{{1, Identity}}, b.Mul(sign, sign))
	require.Equal(t, "exp(3.141592653589793*i n[a,2])", b.Format(sign, "a", 2))
	for n := range 21 {
		require.Equal(t, complex(math.Pow(-1, float64(n)), 0), b.Matrix(sign)[n*22])
	}
}

func TestCompoundsAreSums(t *testing.T) {
	s := Fermion()
	w, err := s.ops.condense([]Weighted{{2, modeOne}, {-4, modeNumber}})
	require.NoError(t, err)
	require.Len(t, w, 1)
	p := w[0].Op
	require.Equal(t, complex128(2), w[0].Coef)
	again, err := s.ops.condense([]Weighted{{1, modeOne}, {-2, modeNumber}})
	require.NoError(t, err)
	require.Equal(t, []Weighted{{1, p}}, again)
	require.Equal(t, []Weighted{{1, Identity}}, s.Mul(p, p))
	require.Equal(t, []Weighted{{-1, modeLower}}, s.Mul(modeLower, p))
	require.Equal(t, []Weighted{{1, p}}, s.Adjoint(p))
	require.Equal(t, []complex128{1, 0, 0, -1}, s.Matrix(p))
	require.Equal(t, "(1 + -2 n[a,0])", s.Format(p, "a", 0))
	require.False(t, s.Odd(p))
	require.True(t, s.Diagonal(p))
	majorana, err := s.ops.condense([]Weighted{{1, modeLower}, {1, modeRaise}})
	require.NoError(t, err)
	require.Len(t, majorana, 1)
	require.True(t, s.Odd(majorana[0].Op))
	require.False(t, s.Diagonal(majorana[0].Op))
	require.Equal(t, []Weighted{{1, modeLower}, {1, modeRaise}}, s.Parts(majorana[0].Op))
	mixed, err := s.ops.condense([]Weighted{{1, modeLower}, {1, modeOne}})
	require.NoError(t, err)
	require.Len(t, mixed, 2, "even and odd elements stay apart")
}

func TestSitesOutOfBounds(t *testing.T) {
	for _, c := range []struct {
		site Site
		want string
	}{
		{Boson(0), "largest occupation 0; expected 1 to 255"},
		{Boson(1 << 40), "largest occupation 1099511627776; expected 1 to 255"},
		{Spin(0), "spin 0; expected s = 1/2, 1, ... up to 25"},
		{Spin(-1), "spin -1/2; expected s = 1/2, 1, ... up to 25"},
		{Clock(1), "clock with q = 1; expected 2 to 64"},
		{Site{}, "a site of no kind; use Fermion, Electron, Boson, Spin or Clock"},
	} {
		_, err := New(3, Open, Leg("a", c.site))
		require.EqualError(t, err, fmt.Sprintf("leg %q: %s", "a", c.want))
	}
}

func TestFormatOfElements(t *testing.T) {
	for _, c := range []struct {
		site Site
		op   OpID
		want string
	}{
		{Fermion(), modeRaise, "c^+[a,3]"},
		{Electron(), 1 + 4*2, "c_up[a,3] c_down^+[a,3]"},
		{Boson(3), bosonOp(2, 1, 0), "b^+[a,3]^2 b[a,3]"},
		{Spin(2), 2, "S^z[a,3]^2"},
		{Spin(2), 3, "S^+[a,3]"},
		{Spin(2), 4, "(S^z[a,3] - 1/2) S^+[a,3]"},
		{Spin(2), 6, "(S^z[a,3] + 1/2) S^-[a,3]"},
		{Spin(2), 7, "S^+[a,3]^2"},
		{Spin(9), 3, "P3(S^z[a,3])"},
		{Clock(5), 1 + 5*3, "Z[a,3] X^+[a,3]^2"},
		{Clock(2), 2, "X[a,3]"},
	} {
		require.Equal(t, c.want, c.site.Format(c.op, "a", 3))
	}
}
