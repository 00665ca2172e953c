package mpo

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps/block"
)

// randomSites makes site tensors of a random state of charge total; all charges that fit appear on every bond.
func randomSites[T dense.Scalar](rng *rand.Rand, g block.Group, phys []block.Axis, total block.Charge) []*block.Tensor[T] {
	n := len(phys)
	reach := make([]map[block.Charge]bool, n+1)
	reach[n] = map[block.Charge]bool{total: true}
	for i := n - 1; i >= 0; i-- {
		reach[i] = map[block.Charge]bool{}
		for q := range reach[i+1] {
			for _, s := range phys[i].Sectors {
				reach[i][g.Sub(q, s.Charge)] = true
			}
		}
	}
	bond := block.NewAxis(block.In, block.Sector{Dim: 1})
	var out []*block.Tensor[T]
	for i, p := range phys {
		var next []block.Sector
		seen := map[block.Charge]bool{}
		for _, l := range bond.Sectors {
			for _, s := range p.Sectors {
				q := g.Add(l.Charge, s.Charge)
				if seen[q] || !reach[i+1][q] {
					continue
				}
				seen[q] = true
				next = append(next, block.Sector{Charge: q, Dim: 1 + rng.IntN(3)})
			}
		}
		if i == n-1 {
			next = []block.Sector{{Charge: total, Dim: 1}}
		}
		right := block.NewAxis(block.In, next...)
		out = append(out, block.Random[T](block.NewStructure(g, []block.Axis{bond, p, right.Reversed()}, block.Charge{}), rng))
		bond = right
	}
	return out
}

// vector contracts site tensors to the full vector, first site slowest.
func vector[T dense.Scalar](sites []*block.Tensor[T]) []complex128 {
	t := sites[0]
	for _, a := range sites[1:] {
		t = block.Contract(t, a, []int{len(t.Axes) - 1}, []int{0})
	}
	return toComplex(t.Dense())
}

func matvec(h, x []complex128) []complex128 {
	n := len(x)
	y := make([]complex128, n)
	for i := range n {
		for j := range n {
			y[i] += h[i*n+j] * x[j]
		}
	}
	return y
}

func braket(x, y []complex128) complex128 {
	var s complex128
	for i := range x {
		s += complex(real(x[i]), -imag(x[i])) * y[i]
	}
	return s
}

// totals names a charge in the middle of what each family can hold.
func middle(g block.Group, phys []block.Axis) block.Charge {
	var q block.Charge
	for i, p := range phys {
		q = g.Add(q, p.Sectors[i%len(p.Sectors)].Charge)
	}
	return q
}

func TestEnvironments(t *testing.T) {
	for name, family := range families() {
		for seed := range uint64(2) {
			t.Run(fmt.Sprintf("%s/seed=%d", name, seed), func(t *testing.T) {
				rng := rand.New(rand.NewPCG(seed, 5))
				g, kinds := family()
				s := newSum(g, kinds...)
				s.addRandom(rng, 30, 3, coupling(rng, seed == 1))
				if seed == 0 && s.Real {
					testEnvironments[float64](t, rng, s)
				} else {
					testEnvironments[complex128](t, rng, s)
				}
			})
		}
	}
}

func testEnvironments[T dense.Scalar](t *testing.T, rng *rand.Rand, s *sum) {
	o, err := Build[T](s.Strings, Options{})
	require.NoError(t, err)
	h := s.dense()
	n := o.Len()
	q := middle(o.Group, o.Phys)
	bra, ket := randomSites[T](rng, o.Group, o.Phys, q), randomSites[T](rng, o.Group, o.Phys, q)
	x, y := vector(bra), vector(ket)
	want := braket(x, matvec(h, y))

	var ws Workspace[T]
	pool := task.New(2)
	left, right := make([]*block.Tensor[T], n+1), make([]*block.Tensor[T], n+1)
	left[0], right[n] = LeftEdge(o), RightEdge(o, q, q)
	for i := range n {
		left[i+1] = GrowLeft(o, i, left[i], bra[i], ket[i], &ws, pool)
	}
	for i := n - 1; i >= 0; i-- {
		right[i] = GrowRight(o, i, right[i+1], bra[i], ket[i], &ws, pool)
	}
	size := abs(want) + dense.Norm(x)*dense.Norm(y)
	for _, got := range []T{left[n].Data[0], right[0].Data[0]} {
		require.InDelta(t, 0, abs(dense.ToComplex(got)-want)/size, 1e-13)
	}

	// Between different chains the image of each site of the ket, seen by the bra.
	for i := range n {
		m := NewPlanner(o).Image(i, left[i].Structure, right[i+1].Structure, ket[i].Structure)
		got := block.Dot(bra[i], m.Run(left[i], right[i+1], ket[i], &ws, pool))
		require.InDelta(t, 0, abs(dense.ToComplex(got)-want)/size, 1e-13, "image of site %d", i)
	}

	// The projected Hamiltonian between equal chains: <phi|H|psi> with phi differing from psi on the projected sites only.
	for i := range n {
		left[i] = LeftEdge(o)
		for k := range i {
			left[i] = GrowLeft(o, k, left[i], ket[k], ket[k], &ws, nil)
		}
		right[i+1] = RightEdge(o, q, q)
		for k := n - 1; k > i; k-- {
			right[i+1] = GrowRight(o, k, right[i+1], ket[k], ket[k], &ws, nil)
		}
	}
	left[0], right[n] = LeftEdge(o), RightEdge(o, q, q)
	for count := 1; count <= 2; count++ {
		for i := 0; i+count <= n; i++ {
			theta := ket[i]
			if count == 2 {
				theta = block.Contract(ket[i], ket[i+1], []int{2}, []int{0})
			}
			p := Project(o, i, count, left[i], right[i+count], theta.Structure)
			probe := block.Random[T](theta.Structure, rng)
			out := block.New[T](theta.Structure)
			p.Apply(out.Data, theta.Data, &ws, pool)
			sites := append(append([]*block.Tensor[T]{}, ket[:i]...), probe)
			sites = append(sites, ket[i+count:]...)
			v := vector(sites)
			want := braket(v, matvec(h, y))
			got := dense.ToComplex(block.Dot(probe, out))
			require.InDelta(t, 0, abs(want-got)/(dense.Norm(v)*dense.Norm(y)), 1e-13, "sites %d..%d", i, i+count-1)
			require.Positive(t, p.Flops())
			if count == 2 {
				testPerturbation(t, o, p, theta, left[i], right[i+2], &ws)
			}
		}
	}
}

// testPerturbation compares the density matrices with a network of full arrays.
func testPerturbation[T dense.Scalar](t *testing.T, o *Operator[T], p *Projected[T], theta, left, right *block.Tensor[T], ws *Workspace[T]) {
	for _, side := range []bool{true, false} {
		z, rows, inner := reachedLeft(o, p, theta, left), theta.Axes[0], theta.Axes[1]
		if !side {
			z, rows, inner = reachedRight(o, p, theta, right), theta.Axes[3], theta.Axes[2]
		}
		seen, unit := 0.0, 4.0
		plan := p.PlanPerturbation(side)
		for i, rho := range plan.Densities(p, theta.Data, unit, ws, task.New(2)) {
			b := plan.Blocks[i]
			// The states of each row, counted along the whole axes.
			type pair struct{ bond, site int }
			states := make([]pair, b.Rows)
			for _, s := range b.Segments {
				d := inner.Sectors[s.Site].Dim
				for k := range s.Dim {
					at := pair{rows.Offset(s.Outer) + k/d, inner.Offset(s.Site) + k%d}
					if !side {
						n := rows.Sectors[s.Outer].Dim
						at = pair{rows.Offset(s.Outer) + k%n, inner.Offset(s.Site) + k/n}
					}
					states[s.Start+k] = at
					q := o.Group.Add(chargeOf(rows, at.bond), chargeOf(inner, at.site))
					if !side {
						q = o.Group.Sub(chargeOf(rows, at.bond), chargeOf(inner, at.site))
					}
					require.Equal(t, b.Charge, q)
				}
			}
			for x, s := range states {
				for y, v := range states {
					want := braket(z[v.bond*inner.Dim()+v.site], z[s.bond*inner.Dim()+s.site])
					got := 16 * dense.ToComplex(rho[x*b.Rows+y])
					require.InDelta(t, 0, abs(got-want), 1e-11*(1+abs(want)), "left %v, charge %v, element %d, %d", side, b.Charge, x, y)
				}
				seen += 16 * dense.Real(rho[x*b.Rows+x])
			}
		}
		all := 0.0
		for _, row := range z {
			all += real(braket(row, row))
		}
		require.InDelta(t, all, seen, 1e-11*(1+all), "nothing may be missing")
	}
}

// reachedLeft applies the terms that cross the bond to the left of theta: z[l' * d1 + s1'], over all w, s2, r.
func reachedLeft[T dense.Scalar](o *Operator[T], p *Projected[T], theta, left *block.Tensor[T]) [][]complex128 {
	d, full, env := theta.Dims(), toComplex(theta.Dense()), toComplex(left.Dense()) // env: l' a l
	nl, d1, rest, na, nw := d[0], d[1], d[2]*d[3], left.Dims()[1], o.Bonds[p.first+1].Dim()
	z := make([][]complex128, nl*d1)
	for i := range z {
		z[i] = make([]complex128, nw*rest)
	}
	for _, e := range o.Sites[p.first] {
		if !o.Bonds[p.first+1].crosses(e.Right) {
			continue
		}
		for lp := range nl {
			for l := range nl {
				c := dense.ToComplex(e.Value) * env[(lp*na+int(e.Left))*nl+l]
				for k := range rest {
					z[lp*d1+int(e.Out)][int(e.Right)*rest+k] += c * full[(l*d1+int(e.In))*rest+k]
				}
			}
		}
	}
	return z
}

// reachedRight applies them to the right: z[r' * d2 + s2'], over all w, l, s1.
func reachedRight[T dense.Scalar](o *Operator[T], p *Projected[T], theta, right *block.Tensor[T]) [][]complex128 {
	d, full, env := theta.Dims(), toComplex(theta.Dense()), toComplex(right.Dense()) // env: c r r'
	rest, d2, nr, nw := d[0]*d[1], d[2], d[3], o.Bonds[p.first+1].Dim()
	z := make([][]complex128, nr*d2)
	for i := range z {
		z[i] = make([]complex128, nw*rest)
	}
	for _, e := range o.Sites[p.first+1] {
		if !o.Bonds[p.first+1].crosses(e.Left) {
			continue
		}
		for rp := range nr {
			for r := range nr {
				c := dense.ToComplex(e.Value) * env[(int(e.Right)*nr+r)*nr+rp]
				for k := range rest {
					z[rp*d2+int(e.Out)][int(e.Left)*rest+k] += c * full[(k*d2+int(e.In))*nr+r]
				}
			}
		}
	}
	return z
}

func chargeOf(a block.Axis, state int) block.Charge {
	for _, s := range a.Sectors {
		if state < s.Dim {
			return s.Charge
		}
		state -= s.Dim
	}
	panic("no such state")
}
