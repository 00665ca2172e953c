package mpo

import (
	"cmp"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/mps/block"
)

// randomSum is a random operator of a family, in complex arithmetic.
func randomSum(t *testing.T, name string, seed uint64) *Operator[complex128] {
	rng := rand.New(rand.NewPCG(seed, 21))
	g, kinds := families()[name]()
	s := newSum(g, kinds...)
	s.addRandom(rng, 30, 3, coupling(rng, true))
	o, err := Build[complex128](s.Strings, Options{})
	require.NoError(t, err)
	return o
}

// unsorted undoes a window: its entries with indices counted along the whole axes.
func unsorted(w *window[complex128], phys []block.Axis) []Entry[complex128] {
	state := func(sector, inner int) int32 {
		if len(phys) == 1 {
			return int32(phys[0].Offset(sector) + inner)
		}
		wide := len(phys[1].Sectors)
		a, b := sector/wide, sector%wide
		d := phys[1].Sectors[b].Dim
		return int32((phys[0].Offset(a)+inner/d)*phys[1].Dim() + phys[1].Offset(b) + inner%d)
	}
	var all []Entry[complex128]
	for _, k := range w.links {
		for _, e := range w.local[k.from:k.to] {
			all = append(all, Entry[complex128]{Left: int32(w.wl.Offset(k.left) + e.left), Right: int32(w.wr.Offset(k.right) + e.right),
				Out: state(k.out, e.out), In: state(k.in, e.in), Value: e.value})
		}
	}
	return settle(all)
}

func TestWindowsKeepAllEntries(t *testing.T) {
	for name := range families() {
		t.Run(name, func(t *testing.T) {
			o := randomSum(t, name, 1)
			p := NewPlanner(o)
			for i := range o.Len() {
				require.Equal(t, o.Sites[i], unsorted(p.site(i), o.Phys[i:i+1]), "site %d", i)
				requireTables(t, p.site(i))
				if i+1 == o.Len() {
					continue
				}
				joined := joinEntries(o.Sites[i], o.Sites[i+1], o.Phys[i+1].Dim())
				require.Equal(t, joined, unsorted(p.pair(i), o.Phys[i:i+2]), "sites %d and %d", i, i+1)
				requireTables(t, p.pair(i))
				for _, k := range p.pair(i).links {
					w := p.pair(i)
					q := o.Group.Sub(o.Group.Add(w.wl.Sectors[k.left].Charge, w.states[k.out].charge), w.states[k.in].charge)
					require.Equal(t, w.wr.Sectors[k.right].Charge, q)
				}
			}
		})
	}
}

// requireTables checks that every link stands once in each table, at its place.
func requireTables(t *testing.T, w *window[complex128]) {
	t.Helper()
	order := func(a, b link) int { return cmp.Compare(a.from, b.from) }
	for f := range face(faces) {
		var all []link
		for at, list := range w.by(f) {
			bond, state := at/len(w.states), at%len(w.states)
			for _, k := range list {
				got := [2]int{k.left, k.out}
				switch f {
				case rightOut:
					got[0] = k.right
				case leftIn:
					got[1] = k.in
				case rightIn:
					got = [2]int{k.right, k.in}
				}
				require.Equal(t, [2]int{bond, state}, got, "face %d", f)
			}
			all = append(all, list...)
		}
		slices.SortFunc(all, order)
		require.Equal(t, w.links, all, "face %d", f)
	}
}

func TestCrossingWindows(t *testing.T) {
	o := randomSum(t, "fermions", 2)
	p := NewPlanner(o)
	for i := range o.Len() - 1 {
		b := o.Bonds[i+1]
		for _, left := range []bool{true, false} {
			site := i
			if !left {
				site++
			}
			var want []Entry[complex128]
			for _, e := range o.Sites[site] {
				index := int(e.Left)
				if left {
					index = int(e.Right)
				}
				if index != b.Vacant && index != b.Done {
					want = append(want, e)
				}
			}
			require.ElementsMatch(t, want, unsorted(p.crossing(i, left), o.Phys[site:site+1]), "bond %d, left %v", i, left)
		}
	}
}

// TestPlannerIsReused runs plans of one planner, made in any order, against those of fresh ones: the bits must agree.
func TestPlannerIsReused(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	o := randomSum(t, "fermions", 3)
	n := o.Len()
	ket := randomSites[complex128](rng, o.Group, o.Phys, middle(o.Group, o.Phys))
	p := NewPlanner(o)
	var ws Workspace[complex128]
	for range 2 {
		env := LeftEdge(o)
		for i := range n {
			g := p.Left(i, env.Structure, ket[i].Structure, ket[i].Structure)
			got := block.New[complex128](g.Out)
			for range 2 { // a plan may be run again
				g.Run(got, env, ket[i], ket[i], &ws, nil)
			}
			env = GrowLeft(o, i, env, ket[i], ket[i], &ws, nil)
			require.Equal(t, env.Data, got.Data, "site %d", i)
			require.Positive(t, g.Flops())
		}
	}
	for i := range n - 1 {
		left, right := LeftEdge(o), RightEdge(o, middle(o.Group, o.Phys), middle(o.Group, o.Phys))
		for k := range i {
			left = GrowLeft(o, k, left, ket[k], ket[k], &ws, nil)
		}
		for k := n - 1; k > i+1; k-- {
			right = GrowRight(o, k, right, ket[k], ket[k], &ws, nil)
		}
		theta := block.Contract(ket[i], ket[i+1], []int{2}, []int{0})
		a, b := block.New[complex128](theta.Structure), block.New[complex128](theta.Structure)
		p.Project(i, 2, left, right, theta.Structure).Apply(a.Data, theta.Data, &ws, nil)
		Project(o, i, 2, left, right, theta.Structure).Apply(b.Data, theta.Data, &ws, nil)
		require.Equal(t, b.Data, a.Data, "bond %d", i)
	}
}

func TestPlansRefuseForeignShapes(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	o := randomSum(t, "fermions", 4)
	ket := randomSites[complex128](rng, o.Group, o.Phys, middle(o.Group, o.Phys))
	p := NewPlanner(o)
	edge := LeftEdge(o)
	requirePanic(t, "left environment with the axes", func() { p.Left(1, edge.Structure, ket[1].Structure, ket[1].Structure) })
	requirePanic(t, "right environment with the axes", func() { p.Right(1, edge.Structure, ket[1].Structure, ket[1].Structure) })
	requirePanic(t, "elements where the plan has", func() {
		p.Left(0, edge.Structure, ket[0].Structure, ket[0].Structure).Run(edge, edge, ket[0], ket[0], new(Workspace[complex128]), nil)
	})
}

func requirePanic(t *testing.T, part string, f func()) {
	t.Helper()
	defer func() {
		t.Helper()
		require.Contains(t, recover(), part)
	}()
	f()
}
