package mps

import (
	"cmp"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// The oracle: state vectors as plain arrays of complex numbers, first site slowest, and loops over all elements.

// vector contracts a chain.
func vector[T dense.Scalar](c *Chain[T]) []complex128 {
	psi, width := []complex128{1}, 1
	for _, t := range c.Sites {
		a, d := t.Dense(), t.Dims()
		next := make([]complex128, len(psi)/width*d[1]*d[2])
		for row := 0; row < len(psi)/width; row++ {
			for l := range d[0] {
				for s := range d[1] {
					for r := range d[2] {
						next[(row*d[1]+s)*d[2]+r] += psi[row*width+l] * dense.ToComplex(a[(l*d[1]+s)*d[2]+r])
					}
				}
			}
		}
		psi, width = next, d[2]
	}
	return psi
}

func inner(a, b []complex128) (sum complex128) {
	for i := range a {
		sum += cmplx.Conj(a[i]) * b[i]
	}
	return sum
}

func norm(a []complex128) float64 { return math.Sqrt(real(inner(a, a))) }

func minus(a, b []complex128) []complex128 {
	d := slices.Clone(a)
	for i := range d {
		d[i] -= b[i]
	}
	return d
}

func requireClose(t require.TestingT, want, got []complex128, tol float64) {
	require.Equal(t, len(want), len(got))
	require.LessOrEqual(t, norm(minus(want, got)), tol*max(norm(want), 1e-300), "state vectors differ")
}

// stateCharges returns the charge of each configuration of some axes, in the order of a vector.
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

// level is a Schmidt value with the charge of the left side.
type level struct {
	charge block.Charge
	value  float64
}

// schmidt decomposes the vector across a cut, one matrix a charge of the left sites, in real arithmetic: a complex matrix X+iY is
// replaced by [X -Y; Y X], which has each singular value twice.
func schmidt(g block.Group, axes []block.Axis, psi []complex128, cut int) []level {
	rows := stateCharges(g, axes[:cut+1])
	cols := len(psi) / len(rows)
	byCharge := make(map[block.Charge][]int)
	for i, q := range rows {
		byCharge[q] = append(byCharge[q], i)
	}
	var all []level
	for q, list := range byCharge {
		m := mat.NewDense(2*len(list), 2*cols, nil)
		for i, row := range list {
			for j := range cols {
				z := psi[row*cols+j]
				m.Set(i, j, real(z))
				m.Set(i, cols+j, -imag(z))
				m.Set(len(list)+i, j, imag(z))
				m.Set(len(list)+i, cols+j, real(z))
			}
		}
		var f mat.SVD
		if !f.Factorize(m, mat.SVDNone) {
			panic("no convergence")
		}
		for k, v := range f.Values(nil) {
			if k%2 == 0 {
				all = append(all, level{q, v})
			}
		}
	}
	return all
}

// compareLevels sorts by charge, then by decreasing value.
func compareLevels(a, b level) int {
	return cmp.Or(a.charge.Compare(b.charge), cmp.Compare(b.value, a.value))
}

// random cases

var groups = func() []block.Group {
	var all []block.Group
	for _, rules := range [][]block.Rule{
		{}, {{Name: "N"}}, {{Name: "P", Modulus: 2}}, {{Name: "N"}, {Name: "Q", Modulus: 3}}, {{Name: "A"}, {Name: "B"}},
	} {
		g, err := block.NewGroup(rules...)
		if err != nil {
			panic(err)
		}
		all = append(all, g)
	}
	return all
}()

// drawAxes draws a group and the axes of a few sites.
func drawAxes(t *rapid.T) (block.Group, []block.Axis) {
	g := rapid.SampledFrom(groups).Draw(t, "group")
	return g, drawSites(t, g, 6)
}

func drawSites(t *rapid.T, g block.Group, most int) []block.Axis {
	axes := make([]block.Axis, rapid.IntRange(1, most).Draw(t, "sites"))
	for i := range axes {
		var sectors []block.Sector
		for range rapid.IntRange(1, 3).Draw(t, "sectors") {
			var q block.Charge
			for k := range g.Len() {
				q[k] = int32(rapid.IntRange(-1, 2).Draw(t, "charge"))
			}
			sectors = append(sectors, block.Sector{Charge: g.Normalize(q), Dim: rapid.IntRange(1, 2).Draw(t, "dim")})
		}
		axes[i] = block.NewAxis(block.In, sectors...)
		if axes[i].Dim() > 3 {
			axes[i] = block.NewAxis(block.In, sectors[0])
		}
	}
	return axes
}

// drawTotal draws a charge that the sites can have.
func drawTotal(t *rapid.T, g block.Group, axes []block.Axis) block.Charge {
	var q block.Charge
	for _, a := range axes {
		q = g.Add(q, rapid.SampledFrom(a.Sectors).Draw(t, "site charge").Charge)
	}
	return q
}

func drawRng(t *rapid.T) *rand.Rand {
	return rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
}

// drawChain draws a state on the axes with elements of any size, of known or unknown centre.
func drawChain[T dense.Scalar](t *rapid.T, g block.Group, axes []block.Axis, total block.Charge) *Chain[T] {
	rng := drawRng(t)
	bond := rapid.IntRange(1, 7).Draw(t, "bond")
	c, err := Random[T](g, axes, total, bond, rng)
	require.NoError(t, err)
	if rapid.Bool().Draw(t, "raw") { // fresh elements in wider bonds
		layers, err := sectorLayers(g, axes, total, 4, 1000)
		require.NoError(t, err)
		bonds := bondSectors(g, axes, layers, bond+2)
		for i := range c.Sites {
			s := block.NewStructure(g, []block.Axis{bonds[i], axes[i], bonds[i+1].Reversed()}, block.Charge{})
			c.Sites[i] = block.Random[T](s, rng)
		}
		c.Center = -1
		return c
	}
	c.MoveCenter(rapid.IntRange(0, c.Len()-1).Draw(t, "centre"), nil)
	c.Scale(dense.FromFloat[T](rapid.Float64Range(0.1, 10).Draw(t, "norm")))
	return c
}

// both runs a property for either arithmetic.
func both(t *testing.T, real, complex func(*rapid.T)) {
	t.Run("real", func(t *testing.T) { rapid.Check(t, real) })
	t.Run("complex", func(t *testing.T) { rapid.Check(t, complex) })
}

// requireCanonical checks the isometries on both sides of the centre and the chain's invariants.
func requireCanonical[T dense.Scalar](t require.TestingT, c *Chain[T]) {
	_, err := NewChain(c.Group, c.Sites)
	require.NoError(t, err)
	for i, a := range c.Sites {
		var product *block.Tensor[T]
		switch {
		case i < c.Center:
			product = block.Contract(a.Conj(), a, []int{0, 1}, []int{0, 1})
		case i > c.Center:
			product = block.Contract(a, a.Conj(), []int{1, 2}, []int{1, 2})
		default:
			continue
		}
		product.Axpy(dense.FromFloat[T](-1), block.Identity[T](c.Group, product.Axes[0]))
		require.Less(t, product.Norm(), 1e-12, "site %d with centre %d is no isometry", i, c.Center)
	}
}

func number[T dense.Scalar](re, im float64) T {
	if dense.IsComplex[T]() {
		return dense.FromComplex[T](complex(re, im))
	}
	return dense.FromFloat[T](re)
}

func name(i int) string { return fmt.Sprintf("site %d", i) }
