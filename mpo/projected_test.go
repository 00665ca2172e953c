package mpo

import (
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mps"
	"rundle/mps/block"
)

// TestProjectedBetweenCanonical compares applications between canonical sites, where one environment of each side is the identity, with the full
// matrix, and with the general way that takes no identity for granted.
func TestProjectedBetweenCanonical(t *testing.T) {
	for name := range families() {
		for _, factors := range []int{1, 2, 3} {
			rng := rand.New(rand.NewPCG(uint64(factors), 33))
			g, kinds := families()[name]()
			s := newSum(g, kinds...)
			s.addRandom(rng, 20, factors, coupling(rng, name == "bosons"))
			t.Run(name, func(t *testing.T) {
				if s.Real {
					testBetweenCanonical[float64](t, rng, s)
				}
				testBetweenCanonical[complex128](t, rng, s)
			})
		}
	}
}

func testBetweenCanonical[T dense.Scalar](t *testing.T, rng *rand.Rand, s *sum) {
	o, err := Build[T](s.Strings, Options{})
	require.NoError(t, err)
	h, n := s.dense(), o.Len()
	psi := randomState[T](t, rng, o.Group, o.Phys, middle(o.Group, o.Phys))
	p := NewPlanner(o)
	var ws Workspace[T]
	for count := 1; count <= 2; count++ {
		for i := 0; i+count <= n; i++ {
			psi.Canonicalize(i, nil)
			if count == 2 {
				psi.Normalize()
			}
			left, right := around(o, psi, i, count, &ws)
			theta := psi.Sites[i]
			if count == 2 {
				// The second site is right-canonical already: the pair is the centre.
				theta = block.Contract(psi.Sites[i], psi.Sites[i+1], []int{2}, []int{0})
			}
			out, probe := block.New[T](theta.Structure), block.Random[T](theta.Structure, rng)
			for k := range out.Data {
				out.Data[k] = 7 // must not be read
			}
			pr := p.Project(i, count, left, right, theta.Structure)
			require.Equal(t, o.Bonds[i].Vacant >= 0, pr.plan.key.vacant != nowhere)
			require.Equal(t, o.Bonds[i+count].Done >= 0, pr.plan.key.done != nowhere)
			pr.Apply(out.Data, theta.Data, &ws, task.New(2))
			requireGaps(t, out)
			v := vector(append(append(append([]*block.Tensor[T]{}, psi.Sites[:i]...), probe), psi.Sites[i+count:]...))
			y := vector(append(append(append([]*block.Tensor[T]{}, psi.Sites[:i]...), theta), psi.Sites[i+count:]...))
			size := dense.Norm(v) * dense.Norm(y) * (1 + biggest(h))
			require.InDelta(t, 0, abs(braket(v, matvec(h, y))-dense.ToComplex(block.Dot(probe, out)))/size, 1e-13, "sites %d..%d", i, i+count-1)
			requireGeneral(t, p, pr, theta, out)
			if count == 2 {
				testPerturbation(t, o, pr, theta, left, right, &ws)
			}
		}
	}
}

// around returns the environments of count sites from i on, of which the centre of psi is one.
func around[T dense.Scalar](o *Operator[T], psi *mps.Chain[T], i, count int, ws *Workspace[T]) (left, right *block.Tensor[T]) {
	p := NewPlanner(o)
	left, right = LeftEdge(o), RightEdge(o, psi.Charge(), psi.Charge())
	for k := range i {
		left = canonicalStep(p, k, true, left, psi.Sites[k], ws)
	}
	for k := o.Len() - 1; k >= i+count; k-- {
		right = canonicalStep(p, k, false, right, psi.Sites[k], ws)
	}
	return left, right
}

// canonicalStep grows an environment across a canonical site.
func canonicalStep[T dense.Scalar](p *Planner[T], site int, left bool, env, a *block.Tensor[T], ws *Workspace[T]) *block.Tensor[T] {
	plan := p.RightIsometry
	if left {
		plan = p.LeftIsometry
	}
	g := plan(site, env, a.Structure)
	out := block.New[T](g.Out)
	for i := range out.Data {
		out.Data[i] = 7 // must not be read
	}
	g.Run(out, env, a, a, ws, task.New(2))
	return out
}

// requireGeneral compares what pr made of theta with plans that use fewer identities or none.
func requireGeneral[T dense.Scalar](t *testing.T, p *Planner[T], pr *Projected[T], theta, want *block.Tensor[T]) {
	t.Helper()
	w := p.site(pr.first)
	if len(theta.Axes) == 4 {
		w = p.pair(pr.first)
	}
	var ws Workspace[T]
	for _, drop := range [][2]bool{{true, false}, {false, true}, {true, true}} {
		key := pr.plan.key
		if drop[0] {
			key.vacant = nowhere
		}
		if drop[1] {
			key.done = nowhere
		}
		other := &Projected[T]{Theta: pr.Theta, left: pr.left, right: pr.right, planner: p, plan: p.draw(w, key)}
		for k, m := range []*mixtures[T]{other.plan.lefts, other.plan.rights} {
			other.mixed[k] = make([]T, m.size)
			m.fill(other.mixed[k], []*block.Tensor[T]{pr.left, pr.right}[k].Data)
		}
		got := block.New[T](theta.Structure)
		other.Apply(got.Data, theta.Data, &ws, nil)
		got.Axpy(-1, want)
		require.Less(t, got.Norm(), 1e-12*(1+want.Norm()))
	}
}

// requireGaps wants zeros between the blocks.
func requireGaps[T dense.Scalar](t *testing.T, x *block.Tensor[T]) {
	t.Helper()
	end := 0
	for _, b := range x.Blocks {
		require.Zero(t, dense.Norm(x.Data[end:b.Offset]))
		end = b.Offset + b.Len
	}
	require.Zero(t, dense.Norm(x.Data[end:]))
}

// TestIdentityIsSeen disturbs an environment that is the identity.
func TestIdentityIsSeen(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	o := randomSum(t, "spins", 8)
	psi := randomState[complex128](t, rng, o.Group, o.Phys, middle(o.Group, o.Phys))
	psi.Canonicalize(3, nil)
	var ws Workspace[complex128]
	left, right := around(o, psi, 3, 1, &ws)
	vacant, done := placeOf(left.Axes[1], o.Bonds[3].Vacant), placeOf(right.Axes[0], o.Bonds[4].Done)
	require.True(t, isIdentity(left, true, vacant))
	require.True(t, isIdentity(right, false, done))
	require.False(t, isIdentity(left, true, nowhere))
	for _, env := range []*block.Tensor[complex128]{left, right} {
		isLeft := env == left
		at := done
		if isLeft {
			at = vacant
		}
		seen := 0
		for i := range env.Data {
			x := env.Data[i]
			for _, d := range []complex128{1e-6, complex(0, 1e-6)} {
				env.Data[i] = x + d
				if !isIdentity(env, isLeft, at) {
					seen++
				}
			}
			env.Data[i] = x
		}
		want := 0
		for _, s := range env.Axes[2].Sectors {
			want += 2 * s.Dim * s.Dim
		}
		require.Equal(t, want, seen, "each element of the identity, and no other")
	}
}

// TestPlansAreKept asks twice for the same bond, and after a change of structure.
func TestPlansAreKept(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	o := randomSum(t, "fermions", 3)
	p := NewPlanner(o)
	var ws Workspace[complex128]
	plan := func(bond int) *projection[complex128] {
		psi, err := mps.Random[complex128](o.Group, o.Phys, middle(o.Group, o.Phys), bond, rng)
		require.NoError(t, err)
		psi.Canonicalize(2, nil)
		left, right := around(o, psi, 2, 2, &ws)
		h := p.Project(2, 2, left, right, block.Contract(psi.Sites[2], psi.Sites[3], []int{2}, []int{0}).Structure)
		kept := h.plan
		h.Release()
		return kept
	}
	first := plan(6)
	require.Same(t, first, plan(6))
	second := plan(3)
	require.NotSame(t, first, second)
	require.Equal(t, second.tasks(), p.tasks, "one plan is kept for a bond")
}
