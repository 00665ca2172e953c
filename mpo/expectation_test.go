package mpo

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// stateCharges lists the charge of every product state, the last site running fastest.
func stateCharges(g block.Group, axes []block.Axis) []block.Charge {
	all := []block.Charge{{}}
	for _, a := range axes {
		var next []block.Charge
		for _, q := range all {
			for _, s := range a.Sectors {
				for range s.Dim {
					next = append(next, g.Add(q, s.Charge))
				}
			}
		}
		all = next
	}
	return all
}

// vectorOf contracts a chain into a dense vector.
func vectorOf[T dense.Scalar](c *mps.Chain[T]) []complex128 {
	v, bond := []complex128{1}, 1
	for _, t := range c.Sites {
		l, d, r := t.Axes[0].Dim(), t.Axes[1].Dim(), t.Axes[2].Dim()
		a := t.Dense()
		next := make([]complex128, len(v)/bond*d*r)
		for x := range len(v) / bond {
			for i := range l {
				for s := range d {
					for j := range r {
						next[(x*d+s)*r+j] += v[x*bond+i] * dense.ToComplex(a[(i*d+s)*r+j])
					}
				}
			}
		}
		v, bond = next, r
	}
	return v
}

// chainOfVector writes a dense vector of one total charge as a chain whose bonds hold all configurations of the sites on the left.
func chainOfVector[T dense.Scalar](t *testing.T, g block.Group, axes []block.Axis, v []T, total block.Charge) *mps.Chain[T] {
	t.Helper()
	left := block.NewAxis(block.In, block.Sector{Dim: 1})
	at := []int{0} // place on the bond of each left configuration
	var sites []*block.Tensor[T]
	for k, a := range axes {
		charges := stateCharges(g, axes[:k+1])
		place := make([]int, len(charges))
		right := block.NewAxis(block.Out, block.Sector{Charge: total, Dim: 1})
		if k < len(axes)-1 {
			order := make([]int, len(charges))
			var sectors []block.Sector
			for i, q := range charges {
				order[i] = i
				sectors = append(sectors, block.Sector{Charge: q, Dim: 1})
			}
			slices.SortStableFunc(order, func(i, j int) int { return charges[i].Compare(charges[j]) })
			for to, from := range order {
				place[from] = to
			}
			right = block.NewAxis(block.Out, sectors...)
		}
		l, d, r := left.Dim(), a.Dim(), right.Dim()
		data := make([]T, l*d*r)
		for x := range at {
			for s := range d {
				value := dense.FromFloat[T](1)
				if k == len(axes)-1 {
					value = v[x*d+s]
				}
				data[(at[x]*d+s)*r+place[x*d+s]] = value
			}
		}
		site, err := block.FromDense(block.NewStructure(g, []block.Axis{left, a, right}, block.Charge{}), data, 0)
		require.NoError(t, err)
		sites = append(sites, site)
		left, at = right.Reversed(), place
	}
	c, err := mps.NewChain(g, sites)
	require.NoError(t, err)
	return c
}

// sandwich returns <a|h|b>.
func sandwich(a, h, b []complex128) complex128 {
	var sum complex128
	for i, x := range a {
		for j, y := range b {
			sum += complex(real(x), -imag(x)) * h[i*len(b)+j] * y
		}
	}
	return sum
}

func norm2(a []complex128) float64 {
	n := matrixNorm(a)
	return n * n
}

func randomState[T dense.Scalar](t *testing.T, rng *rand.Rand, g block.Group, axes []block.Axis, total block.Charge) *mps.Chain[T] {
	t.Helper()
	c, err := mps.Random[T](g, axes, total, 6, rng)
	require.NoError(t, err)
	return c
}

func testExpectation[T dense.Scalar](t *testing.T, name string) {
	if name == "clocks" && !dense.IsComplex[T]() {
		return
	}
	for seed := range uint64(4) {
		rng := rand.New(rand.NewPCG(seed, 9))
		g, kinds := families()[name]()
		var axes []block.Axis
		for _, k := range kinds {
			axes = append(axes, k.axis)
		}
		charges := stateCharges(g, axes)
		total := charges[rng.IntN(len(charges))]
		psi := randomState[T](t, rng, g, axes, total)
		psi.Scale(dense.FromFloat[T](1.7))
		if seed == 3 {
			psi = mps.Add(dense.FromFloat[T](1), psi, dense.FromFloat[T](-0.3), randomState[T](t, rng, g, axes, total)) // centre unknown
		}
		before := psi.Clone()
		v := vectorOf(psi)

		o, h := randomOperator[T](t, rng, g, kinds, block.Charge{}, 8)
		top := biggest(h)
		want := sandwich(v, h, v) / complex(norm2(v), 0)
		pool := task.New(2)
		require.InDelta(t, 0, abs(want-dense.ToComplex(Expectation(psi, o, pool))), 1e-13*top)

		var residual float64 // ||(h - E) v||²
		for i := range v {
			var x complex128
			for j, y := range v {
				x += h[i*len(v)+j] * y
			}
			x -= want * v[i]
			residual += real(x)*real(x) + imag(x)*imag(x)
		}
		variance, rounding := Variance(psi, o, pool)
		require.InDelta(t, residual/norm2(v), variance, max(rounding, 1e-13*top*top))
		require.Less(t, rounding, 1e-11*max(top*top, 1))
		require.Equal(t, before, psi, "states are left alone")

		moved := kinds[0].Charges[2]
		bra := g.Add(total, moved)
		p, hp := randomOperator[T](t, rng, g, kinds, moved, 5)
		require.Equal(t, dense.FromFloat[T](0), MatrixElement(psi, psi, p, pool), "an operator that moves charge")
		require.Equal(t, dense.FromFloat[T](0), Expectation(psi, p, pool))
		if slices.Contains(charges, bra) {
			phi := randomState[T](t, rng, g, axes, bra)
			want := sandwich(vectorOf(phi), hp, v)
			require.InDelta(t, 0, abs(want-dense.ToComplex(MatrixElement(phi, psi, p, pool))), 1e-13*biggest(hp)*math.Sqrt(norm2(v)))
			require.InDelta(t, 0, abs(want-complexConj(dense.ToComplex(MatrixElement(psi, phi, Adjoint(p), nil)))), 1e-13*biggest(hp)*math.Sqrt(norm2(v)))
		}
	}
}

func complexConj(x complex128) complex128 { return complex(real(x), -imag(x)) }

func TestExpectation(t *testing.T) {
	for name := range families() {
		t.Run(name+"/real", func(t *testing.T) { testExpectation[float64](t, name) })
		t.Run(name+"/complex", func(t *testing.T) { testExpectation[complex128](t, name) })
	}
}

// Scales far from one neither overflow nor vanish.
func TestMatrixElementScales(t *testing.T) {
	g := testGroup(0)
	s := chainOf(func(g block.Group) kindTable { return spinKind(g, 1) }, 4)
	s.add(3, 1, 1, 2, 1)
	o, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	psi, err := mps.Product[float64](g, s.Axes, []int{1, 1, 1, 0})
	require.NoError(t, err)
	for _, site := range psi.Sites {
		site.Scale(1e60)
	}
	psi.Center = -1
	phi := psi.Clone()
	for _, site := range phi.Sites {
		site.Scale(1e-120)
	}
	require.InEpsilon(t, 0.75, MatrixElement(phi, psi, o, nil), 1e-14)
	require.InEpsilon(t, 0.75, Expectation(psi, o, nil), 1e-14)
	phi.Scale(0)
	require.True(t, math.IsNaN(Expectation(phi, o, nil)))
}

// lowestIn returns the index-th eigenvector of a real matrix in a charge sector, and its eigenvalue.
func lowestIn(h []complex128, charges []block.Charge, total block.Charge, index int) (v []float64, e float64) {
	var in []int
	for i, q := range charges {
		if q == total {
			in = append(in, i)
		}
	}
	n := len(in)
	a, values, vectors := make([]float64, n*n), make([]float64, n), make([]float64, n*n)
	for i, x := range in {
		for j, y := range in {
			a[i*n+j] = real(h[x*len(charges)+y])
		}
	}
	if err := dense.Eigen(n, a, n, values, vectors, n, nil); err != nil {
		panic(err)
	}
	v = make([]float64, len(charges))
	for i, x := range in {
		v[x] = vectors[i*n+index]
	}
	return v, values[index]
}

// The variance of an eigenstate is zero to the reported rounding, and the report is no wild guess.
func TestVarianceOfEigenstates(t *testing.T) {
	for _, scale := range []float64{1, 1e3, 1e-3} {
		t.Run(fmt.Sprint(scale), func(t *testing.T) {
			s := chainOf(func(g block.Group) kindTable { return spinKind(g, 1) }, 8)
			rng := rand.New(rand.NewPCG(4, 4))
			for i := range int32(8) {
				for j := i + 1; j < min(8, i+4); j++ {
					c := complex(scale*(0.1+rng.Float64()), 0)
					s.add(c, i, 2, j, 3)
					s.add(c, i, 3, j, 2)
					s.add(complex(scale*rng.Float64(), 0), i, 1, j, 1)
				}
				s.add(complex(100*scale, 0), i, 4) // (S^z)^2: a constant 25 a site that must not cost digits
			}
			o, err := Build[float64](s.Strings, Options{})
			require.NoError(t, err)
			charges := stateCharges(s.Group, s.Axes)
			for _, index := range []int{0, 5} {
				v, e := lowestIn(s.dense(), charges, block.Charge{8}, index)
				psi := chainOfVector(t, s.Group, s.Axes, v, block.Charge{8})
				require.InEpsilon(t, e, Expectation(psi, o, nil), 1e-13)
				variance, rounding := Variance(psi, o, nil)
				t.Log(variance, rounding)
				require.LessOrEqual(t, math.Abs(variance), rounding)
				require.Less(t, rounding, 1e-10*scale*scale)

				// A small admixture is seen above the rounding.
				w, f := lowestIn(s.dense(), charges, block.Charge{8}, index+1)
				const mix = 1e-5
				for i := range v {
					v[i] = v[i]*math.Sqrt(1-mix*mix) + mix*w[i]
				}
				want := mix * mix * (1 - mix*mix) * (e - f) * (e - f)
				variance, rounding = Variance(chainOfVector(t, s.Group, s.Axes, v, block.Charge{8}), o, nil)
				require.InDelta(t, want, variance, rounding+1e-15*scale*scale)
				require.Less(t, rounding, want)
			}
		})
	}
}

// One particle on a long chain: the exact eigenstate sin(k(j+1)) of hopping, as a chain of bond two; energies of 1e3 a particle shift
// it, and the digits of the variance survive.
func TestVarianceOfAPlaneWave(t *testing.T) {
	const n = 100
	s := chainOf(func(g block.Group) kindTable { return bosonKind(g, 1) }, n)
	for j := range int32(n) {
		s.add(1e3, j, 3)
		if j+1 < n {
			s.add(-1, j, 2, j+1, 1)
			s.add(-1, j, 1, j+1, 2)
		}
	}
	s.Tables[0].Matrices[6] = diagonal(2, unity) // b^2 is not used
	o, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	k := 3 * math.Pi / (n + 1)
	var psi *mps.Chain[float64]
	for j := range n {
		states := make([]int, n)
		states[j] = 1
		p, err := mps.Product[float64](s.Group, s.Axes, states)
		require.NoError(t, err)
		if psi == nil {
			psi = p
			psi.Scale(math.Sin(k))
			continue
		}
		psi = mps.Add(1, psi, math.Sin(k*float64(j+1)), p)
		if psi.MaxBond() > 8 || j == n-1 {
			_, err = psi.Truncate(block.Cut{Weight: 1e-32}, nil)
			require.NoError(t, err)
		}
	}
	require.InEpsilon(t, 1e3-2*math.Cos(k), Expectation(psi, o, nil), 1e-14)
	variance, rounding := Variance(psi, o, nil)
	t.Log(variance, rounding)
	require.LessOrEqual(t, math.Abs(variance), rounding)
	require.Less(t, rounding, 1e-7)
}

func TestExpectationMisuse(t *testing.T) {
	g := testGroup(0)
	s := chainOf(func(g block.Group) kindTable { return spinKind(g, 1) }, 3)
	o, err := Build[float64](s.Strings, Options{})
	require.NoError(t, err)
	psi, err := mps.Product[float64](g, s.Axes[:2], []int{0, 0})
	require.NoError(t, err)
	message := fmt.Sprintf("mpo: expectation value of an operator over %v with local dimensions [2 2 2] in a state over %v with [2 2]", g, g)
	require.PanicsWithValue(t, message, func() { Expectation(psi, o, nil) })
	require.Panics(t, func() { Variance(psi, o, nil) })
	require.Panics(t, func() { MatrixElement(psi, psi, o, nil) })
}
