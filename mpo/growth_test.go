package mpo

import (
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// TestGrowthAcrossIsometries compares growth that knows the identity with growth that multiplies everything.
func TestGrowthAcrossIsometries(t *testing.T) {
	for name := range families() {
		for _, factors := range []int{1, 2, 3} {
			rng := rand.New(rand.NewPCG(uint64(factors), 35))
			g, kinds := families()[name]()
			s := newSum(g, kinds...)
			s.addRandom(rng, 20, factors, coupling(rng, name == "bosons"))
			t.Run(name, func(t *testing.T) {
				if s.Real {
					testAcrossIsometries[float64](t, rng, s)
				}
				testAcrossIsometries[complex128](t, rng, s)
			})
		}
	}
}

func testAcrossIsometries[T dense.Scalar](t *testing.T, rng *rand.Rand, s *sum) {
	o, err := Build[T](s.Strings, Options{})
	require.NoError(t, err)
	n := o.Len()
	psi := randomState[T](t, rng, o.Group, o.Phys, middle(o.Group, o.Phys))
	p := NewPlanner(o)
	var ws Workspace[T]
	psi.Canonicalize(n-1, nil)
	left, plain := LeftEdge(o), LeftEdge(o)
	for i := range n - 1 {
		a := psi.Sites[i]
		left, plain = canonicalStep(p, i, true, left, a, &ws), GrowLeft(o, i, plain, a, a, &ws, nil)
		requireSameGrowth(t, left, plain)
		require.Equal(t, o.Bonds[i+1].Vacant >= 0, isIdentity(left, true, placeOf(left.Axes[1], o.Bonds[i+1].Vacant)))
	}
	psi.Canonicalize(0, nil)
	right, plain := RightEdge(o, psi.Charge(), psi.Charge()), RightEdge(o, psi.Charge(), psi.Charge())
	for i := n - 1; i > 0; i-- {
		a := psi.Sites[i]
		right, plain = canonicalStep(p, i, false, right, a, &ws), GrowRight(o, i, plain, a, a, &ws, nil)
		requireSameGrowth(t, right, plain)
		require.Equal(t, o.Bonds[i].Done >= 0, isIdentity(right, false, placeOf(right.Axes[0], o.Bonds[i].Done)))
	}
}

func requireSameGrowth[T dense.Scalar](t *testing.T, got, plain *block.Tensor[T]) {
	t.Helper()
	requireGaps(t, got)
	diff := got.Clone()
	diff.Axpy(-1, plain)
	require.LessOrEqual(t, diff.Norm(), 1e-14*(1+plain.Norm()))
}

// TestGrowthInBands grows wide environments, whose plans have several bands a sector, against full arrays.
func TestGrowthInBands(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 36))
	o := randomSum(t, "spins", 8)
	const site = 3
	wide := func(near block.Axis, f block.Flow) block.Axis {
		var sectors []block.Sector
		for _, s := range near.Sectors {
			sectors = append(sectors, block.Sector{Charge: s.Charge, Dim: 150 + 10*len(sectors)})
		}
		return block.NewAxis(f, sectors...)
	}
	phys := o.Phys[site]
	random := func(axes ...block.Axis) *block.Tensor[complex128] {
		return block.Random[complex128](block.NewStructure(o.Group, axes, block.Charge{}), rng)
	}
	near := wide(phys, block.In)
	far := block.NewFusion(o.Group, []block.Axis{near, phys}, block.In).Fused
	far = wide(block.NewAxis(block.In, far.Sectors[:min(3, len(far.Sectors))]...), block.In)
	ket, bra := random(near, phys, far.Reversed()), random(near, phys, far.Reversed())
	left := random(near.Reversed(), o.Bonds[site].Axis(block.In), near)
	right := random(o.Bonds[site+1].Axis(block.In), far, far.Reversed())
	var ws Workspace[complex128]
	k, b := toComplex(ket.Dense()), toComplex(bra.Dense())
	d := ket.Dims()
	for _, isLeft := range []bool{true, false} {
		var got *block.Tensor[complex128]
		p := NewPlanner(o)
		if isLeft {
			g := p.Left(site, left.Structure, bra.Structure, ket.Structure)
			require.Greater(t, len(g.bands), len(far.Sectors))
			got = GrowLeft(o, site, left, bra, ket, &ws, nil)
		} else {
			g := p.Right(site, right.Structure, bra.Structure, ket.Structure)
			require.Greater(t, len(g.bands), len(near.Sectors))
			got = GrowRight(o, site, right, bra, ket, &ws, nil)
		}
		full := toComplex(got.Dense())
		env := toComplex(left.Dense())
		if !isLeft {
			env = toComplex(right.Dense())
		}
		nl, nr, na, nw := d[0], d[2], o.Bonds[site].Dim(), o.Bonds[site+1].Dim()
		for range 20 {
			var want, size complex128
			var at int
			if isLeft { // a random element (r', w, r)
				rp, w, r := rng.IntN(nr), rng.IntN(nw), rng.IntN(nr)
				at = (rp*nw+w)*nr + r
				for _, e := range o.Sites[site] {
					if int(e.Right) != w {
						continue
					}
					for lp := range nl {
						for l := range nl {
							x := cmplx.Conj(b[(lp*d[1]+int(e.Out))*nr+rp]) * e.Value * env[(lp*na+int(e.Left))*nl+l] * k[(l*d[1]+int(e.In))*nr+r]
							want, size = want+x, size+complex(abs(x), 0)
						}
					}
				}
			} else { // (a, l, l')
				a, l, lp := rng.IntN(na), rng.IntN(nl), rng.IntN(nl)
				at = (a*nl+l)*nl + lp
				for _, e := range o.Sites[site] {
					if int(e.Left) != a {
						continue
					}
					for rp := range nr {
						for r := range nr {
							x := cmplx.Conj(b[(lp*d[1]+int(e.Out))*nr+rp]) * e.Value * env[(int(e.Right)*nr+r)*nr+rp] * k[(l*d[1]+int(e.In))*nr+r]
							want, size = want+x, size+complex(abs(x), 0)
						}
					}
				}
			}
			require.InDelta(t, 0, abs(want-full[at]), 1e-14*(1+real(size)))
		}
	}
}

// TestGrowthPlansAreKept asks twice for the same step, and after a change of structure.
func TestGrowthPlansAreKept(t *testing.T) {
	rng := rand.New(rand.NewPCG(13, 12))
	o := randomSum(t, "fermions", 3)
	p := NewPlanner(o)
	edge := LeftEdge(o)
	a, b := randomSites[complex128](rng, o.Group, o.Phys, middle(o.Group, o.Phys))[0], randomSites[complex128](rng, o.Group, o.Phys, middle(o.Group, o.Phys))[0]
	first := p.LeftIsometry(0, edge, a.Structure)
	require.Same(t, first, p.LeftIsometry(0, edge, a.Structure))
	require.NotSame(t, first, p.Left(0, edge.Structure, a.Structure, a.Structure), "all is multiplied there")
	require.Same(t, first, p.LeftIsometry(0, edge, a.Structure))
	require.Equal(t, b.Structure.Equal(a.Structure), first == p.LeftIsometry(0, edge, b.Structure))
}
