package exact

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"
)

func randomHermitian(n int, rng *rand.Rand, complexValued bool) []complex128 {
	a := make([]complex128, n*n)
	for i := range n {
		for j := range i + 1 {
			z := complex(rng.NormFloat64(), 0)
			if complexValued && i != j {
				z += complex(0, rng.NormFloat64())
			}
			a[i*n+j], a[j*n+i] = z, cmplx.Conj(z)
		}
	}
	return a
}

// TestEigenHermitian compares with gonum on the real matrix of twice the size.
func TestEigenHermitian(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for _, n := range []int{1, 2, 3, 8, 33} {
		for _, complexValued := range []bool{false, true} {
			a := randomHermitian(n, rng, complexValued)
			if n == 8 { // degenerate, with vanishing columns
				a = make([]complex128, n*n)
				a[1*n+2], a[2*n+1], a[4*n+7], a[7*n+4] = 1i, -1i, 1i, -1i
			}
			values, vectors, err := eigenHermitian(n, a)
			require.NoError(t, err)
			double := mat.NewSymDense(2*n, nil)
			for i := range n {
				for j := range n {
					z := a[i*n+j]
					double.SetSym(i, n+j, -imag(z))
					if j >= i {
						double.SetSym(i, j, real(z))
						double.SetSym(n+i, n+j, real(z))
					}
				}
			}
			want, _, err := eigenSymmetric(double)
			require.NoError(t, err)
			for k, e := range values {
				assert.InDelta(t, want[2*k], e, 1e-13*float64(n))
				x := vectors[k*n : (k+1)*n]
				for i := range n {
					var y complex128
					for j := range n {
						y += a[i*n+j] * x[j]
					}
					assert.InDelta(t, 0, cmplx.Abs(y-complex(e, 0)*x[i]), 1e-13*float64(n))
				}
				for l := range k + 1 {
					want := 0.0
					if l == k {
						want = 1
					}
					assert.InDelta(t, want, cmplx.Abs(Overlap(vectors[l*n:(l+1)*n], x)), 1e-13)
				}
			}
		}
	}
}

// TestLanczosAgainstDense solves sectors both ways.
func TestLanczosAgainstDense(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 1))
	sites := repeat(Spin(1), 10)
	for _, row := range []struct {
		name  string
		phase float64
	}{{"real", 0}, {"complex", 0.7}} {
		t.Run(row.name, func(t *testing.T) {
			b := basis(t, sites, []Number{TwiceSz(sites)}, 0)
			var terms []Term
			for i := range sites {
				for j := range i {
					v := rng.NormFloat64()
					phase := cmplx.Exp(complex(0, row.phase*rng.NormFloat64()))
					terms = append(terms, T(complex(v, 0), "S^z", i, "S^z", j))
					terms = append(terms, WithAdjoints(T(complex(rng.NormFloat64(), 0)*phase, "S^+", i, "S^-", j))...)
				}
			}
			m, err := b.Matrix(terms...)
			require.NoError(t, err)
			assert.Equal(t, row.phase == 0, m.Real())
			want, err := m.Spectrum()
			require.NoError(t, err)
			var got []Level
			if m.Real() {
				got, err = lowestLevels(4, m.Dim(), multiply(m, m.real))
			} else {
				got, err = lowestLevels(4, m.Dim(), multiply(m, m.val))
			}
			require.NoError(t, err)
			for k, l := range got {
				assert.InDelta(t, want[k], l.Energy, 1e-12)
				assert.Less(t, l.Residual, 1e-11)
				assert.InDelta(t, 1, real(Overlap(l.Vector, l.Vector)), 1e-13)
			}
		})
	}
}

func heisenberg(i, j int) []Term {
	return append(WithAdjoints(T(0.5, "S^+", i, "S^-", j)), T(1, "S^z", i, "S^z", j))
}

func chain(sites int, ring bool, link func(i, j int) []Term) []Term {
	var out []Term
	for j := range sites - 1 {
		out = append(out, link(j, j+1)...)
	}
	if ring {
		out = append(out, link(sites-1, 0)...)
	}
	return out
}

// TestMultiplet finds the ninefold multiplet of two free spins 1 behind a
// Lanczos that sees one state of it at a time, and a spin-1/2 chain's triplet.
func TestMultiplet(t *testing.T) {
	sites := append(repeat(Spin(1), 8), Spin(2), Spin(2))
	b := basis(t, sites, nil)
	require.Greater(t, b.Dim(), denseLimit)
	m, err := b.Matrix(chain(8, false, heisenberg)...)
	require.NoError(t, err)
	levels, err := m.Lowest(10)
	require.NoError(t, err)
	e, err := HeisenbergChain(8, 4)
	require.NoError(t, err)
	for _, l := range levels[:9] {
		assert.InDelta(t, e, l.Energy, 1e-12)
	}
	assert.Greater(t, levels[9].Energy, e+0.1)
	assert.True(t, slices.IsSortedFunc(levels, func(a, b Level) int {
		if a.Energy < b.Energy {
			return -1
		}
		return 1
	}))
}

func TestKnownEnergies(t *testing.T) {
	third := complex(1.0/3, 0)
	spin1 := func(i, j int) []Term {
		link := heisenberg(i, j)
		out := slices.Clone(link)
		for _, x := range link {
			for _, y := range link {
				out = append(out, Term{third * x.Coef * y.Coef, append(slices.Clone(x.Ops), y.Ops...)})
			}
		}
		return out
	}
	majumdarGhosh := chain(12, false, heisenberg)
	for j := range 10 {
		for _, term := range heisenberg(j, j+2) {
			term.Coef /= 2
			majumdarGhosh = append(majumdarGhosh, term)
		}
	}
	ising := func(name, field string) (terms []Term) {
		for j := range 9 {
			terms = append(terms, T(-4, name, j, name, j+1))
		}
		for j := range 10 {
			terms = append(terms, T(-2, field, j))
		}
		return terms
	}
	xx := chain(10, false, func(i, j int) []Term { return WithAdjoints(T(0.5, "S^+", i, "S^-", j)) })
	pairing := chain(8, false, func(i, j int) []Term {
		return WithAdjoints(T(-1.5, "c^+", i, "c", j), T(1.5, "c", i, "c", j))
	})
	half, one, fermions := repeat(Spin(1), 10), repeat(Spin(2), 6), repeat(Fermion(), 8)
	twelve, clocks := repeat(Spin(1), 12), repeat(Clock(2), 10)
	clockIsing := chain(10, false, func(i, j int) []Term { return []Term{T(-1, "X", i, "X", j)} })
	for j := range clocks {
		clockIsing = append(clockIsing, T(-1, "Z", j))
	}
	for _, row := range []struct {
		name    string
		sites   []Site
		numbers []Number
		values  []int
		terms   []Term
		want    float64
	}{
		{"critical Ising, field diagonal", half, nil, nil, ising("S^x", "S^z"), IsingChain(10)},
		{"critical Ising, field off-diagonal", half, nil, nil, ising("S^z", "S^x"), IsingChain(10)},
		{"critical Ising of clocks", clocks, []Number{ClockCharge(clocks, 2)}, []int{0}, clockIsing, IsingChain(10)},
		{"XX", half, []Number{TwiceSz(half)}, []int{0}, xx, XXChain(10)},
		{"Majumdar-Ghosh", twelve, []Number{TwiceSz(twelve)}, []int{0}, majumdarGhosh, MajumdarGhoshChain(12)},
		{"AKLT", one, []Number{TwiceSz(one)}, []int{0}, chain(6, false, spin1), AKLTChain(6)},
		{"AKLT, edge spins up", one, []Number{TwiceSz(one)}, []int{2}, chain(6, false, spin1), AKLTChain(6)},
		{"pairing, even", fermions, []Number{Particles(fermions).Modulo(2)}, []int{0}, pairing, PairingChain(8, 1.5)},
		{"pairing, odd", fermions, []Number{Particles(fermions).Modulo(2)}, []int{1}, pairing, PairingChain(8, 1.5)},
	} {
		t.Run(row.name, func(t *testing.T) {
			level, _ := ground(t, basis(t, row.sites, row.numbers, row.values...), row.terms...)
			assert.InDelta(t, row.want, level.Energy, 1e-12)
		})
	}
}

// TestClockDensity bounds the closed form of the infinite clock chain: an open
// chain lies above it by an amount that falls as it grows.
func TestClockDensity(t *testing.T) {
	var excess []float64
	for _, n := range []int{4, 7} {
		sites := repeat(Clock(3), n)
		var terms []Term
		for j := range n {
			terms = append(terms, WithAdjoints(T(-1, "X", j))...)
			terms = append(terms, WithAdjoints(T(-1, "Z^+", j, "Z", (j+1)%n))...)
		}
		b := basis(t, sites, []Number{ClockCharge(sites, 3)}, 0)
		_ = b
		full := basis(t, sites, nil)
		level, _ := ground(t, full, terms...)
		excess = append(excess, (ClockDensity-level.Energy/float64(n))*float64(n*n))
	}
	// e - E/n = pi c v / (6 n^2) on a ring, c = 4/5: the product is constant.
	assert.InDelta(t, excess[0], excess[1], 0.03*excess[1])
	assert.Greater(t, excess[1], 0.0)
}

func TestMeissnerThreshold(t *testing.T) {
	// The lower band of cos-like legs and rung K has its minimum at zero
	// momentum exactly above the threshold.
	const phi = 0.6 * math.Pi
	minimumAt := func(k float64) float64 {
		best, at := math.Inf(1), 0.0
		for i := range 20001 {
			p := math.Pi * (float64(i)/10000 - 1)
			e := -2*math.Cos(p)*math.Cos(phi/2) - math.Hypot(k, 2*math.Sin(p)*math.Sin(phi/2))
			if e < best {
				best, at = e, math.Abs(p)
			}
		}
		return at
	}
	k := MeissnerThreshold(1, phi)
	assert.Less(t, minimumAt(1.001*k), 1e-3)
	assert.Greater(t, minimumAt(0.999*k), 1e-3)
}
