package mpo

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// benchModel is a lattice, its Hamiltonian, and a bond dimension.
type benchModel struct {
	name  string
	rungs int
	legs  []ladder.Part
	terms []ladder.Term
	bond  int
}

func benchModels() []benchModel {
	legs := func(s ladder.Site, names ...string) (parts []ladder.Part) {
		for _, n := range names {
			parts = append(parts, ladder.Leg(n, s))
		}
		return parts
	}
	each := ladder.Each{"l": "legs"}
	spins := []ladder.Term{{Formula: "S[l,j].S[l,j+1]", Each: each}, {Formula: "S[a,j].S[b,j]"}}
	return []benchModel{
		{"ladder", 32, legs(ladder.Spin(1), "a", "b"), spins, 400},
		{"ladder", 32, legs(ladder.Spin(1), "a", "b"), spins, 800},
		{"chain", 64, legs(ladder.Spin(1), "a"), spins[:1], 256},
		{"hubbard", 32, legs(ladder.Electron(), "a"), []ladder.Term{{Formula: "-c_up^+[a,j+1] c_up[a,j] + h.c."}, {Formula: "-c_down^+[a,j+1] c_down[a,j] + h.c."},
			{Formula: "4 n_up[a,j] n_down[a,j]"}}, 512},
		{"flux", 32, legs(ladder.Fermion(), "a", "b"), []ladder.Term{{Formula: "-exp(i) c^+[a,j+1] c[a,j] + h.c."}, {Formula: "-exp(-i) c^+[b,j+1] c[b,j] + h.c."},
			{Formula: "-0.7 c^+[a,j] c[b,j] + h.c."}, {Formula: "3 n[l,j] n[l,j+1]", Each: each}, {Formula: "0.25 (n[a,j] - n[b,j])"}}, 256},
		{"boson", 16, legs(ladder.Boson(3), "a", "b"), []ladder.Term{{Formula: "-exp(0.7*i) b^+[a,j+1] b[a,j] + h.c."}, {Formula: "-exp(-0.7*i) b^+[b,j+1] b[b,j] + h.c."},
			{Formula: "-b^+[a,j] b[b,j] + h.c."}, {Formula: "n[l,j] (n[l,j] - 1)", Each: each}}, 128},
		{"four legs", 12, legs(ladder.Spin(1), "a", "b", "c", "d"), []ladder.Term{{Formula: "S[l,j].S[l,j+1]", Each: each},
			{Formula: "S[l,j].S[l+1,j]", Each: each}}, 400},
	}
}

// stage is the middle of a model's chain: environments with random elements, but for the identities that canonical sites have there.
type stage[T dense.Scalar] struct {
	planner     *Planner[T]
	first       int
	bonds       []block.Axis
	left, right *block.Tensor[T]
	theta       *block.Tensor[T]
}

func (m benchModel) stage(b *testing.B) any {
	l, err := ladder.New(m.rungs, ladder.Open, m.legs...)
	require.NoError(b, err)
	h, err := l.Hamiltonian(nil, m.terms...)
	require.NoError(b, err)
	f, err := h.Frames(ladder.FrameOptions{})
	require.NoError(b, err)
	s, err := f.Strings(h.Poly)
	require.NoError(b, err)
	if s.Real {
		return newStage[float64](b, s, m.bond)
	}
	return newStage[complex128](b, s, m.bond)
}

func newStage[T dense.Scalar](b *testing.B, s *ladder.Strings, bond int) *stage[T] {
	o, err := Build[T](s, Options{})
	require.NoError(b, err)
	filling := block.Charge{}
	for i, p := range o.Phys { // half filled
		q := p.Sectors[i%2*(len(p.Sectors)-1)].Charge
		if len(p.Sectors) == 4 {
			q = p.Sectors[1+i%2].Charge
		}
		filling = o.Group.Add(filling, q)
	}
	bonds, err := mps.ExpectedBonds(o.Group, o.Phys, filling, bond)
	require.NoError(b, err)
	st := &stage[T]{planner: NewPlanner(o), first: o.Len()/2 - 1, bonds: bonds}
	rng := rand.New(rand.NewPCG(1, 2))
	i := st.first
	l, r := bonds[i], bonds[i+2]
	st.theta = block.Random[T](block.NewStructure(o.Group, []block.Axis{l, o.Phys[i], o.Phys[i+1], r.Reversed()}, block.Charge{}), rng)
	st.left = block.Random[T](block.NewStructure(o.Group, []block.Axis{l.Reversed(), o.Bonds[i].Axis(block.In), l}, block.Charge{}), rng)
	st.right = block.Random[T](block.NewStructure(o.Group, []block.Axis{o.Bonds[i+2].Axis(block.In), r, r.Reversed()}, block.Charge{}), rng)
	setIdentity(st.left, true, placeOf(st.left.Axes[1], o.Bonds[i].Vacant))
	setIdentity(st.right, false, placeOf(st.right.Axes[0], o.Bonds[i+2].Done))
	return st
}

func setIdentity[T dense.Scalar](env *block.Tensor[T], left bool, at place) {
	bond := 0
	if left {
		bond = 1
	}
	for i, b := range env.Blocks {
		if b.Sectors[bond] != at.sector {
			continue
		}
		n := b.Shape[2]
		for r := range n {
			row := env.Block(i)[(at.inner*n+r)*n:]
			if left {
				row = env.Block(i)[(r*b.Shape[1]+at.inner)*n:]
			}
			clear(row[:n])
			row[r] = 1
		}
	}
}

// BenchmarkApply reports the rate of one application and of a large product of equal work beside it, in GF/s of real operations.
func BenchmarkApply(b *testing.B) {
	for _, m := range benchModels() {
		for _, threads := range []int{1, 2} {
			b.Run(fmt.Sprintf("model=%s/bond=%d/threads=%d", m.name, m.bond, threads), func(b *testing.B) {
				switch s := m.stage(b).(type) {
				case *stage[float64]:
					s.apply(b, threads)
				case *stage[complex128]:
					s.apply(b, threads)
				}
			})
		}
	}
}

func (s *stage[T]) apply(b *testing.B, threads int) {
	var ws Workspace[T]
	pool := task.New(threads)
	out := slices.Clone(s.theta.Data)
	h := s.planner.Project(s.first, 2, s.left, s.right, s.theta.Structure)
	h.Apply(out, s.theta.Data, &ws, pool)
	for b.Loop() {
		h.Apply(out, s.theta.Data, &ws, pool)
	}
	flops := h.Flops()
	if dense.IsComplex[T]() {
		flops *= 4
	}
	b.ReportMetric(flops/1e6, "Mflop")
	b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
	b.ReportMetric(float64(len(s.theta.Data)), "elements")
}

// BenchmarkProject plans anew each time; kept takes the plan of the last time.
func BenchmarkProject(b *testing.B) {
	for _, m := range benchModels() {
		for _, kept := range []bool{false, true} {
			b.Run(fmt.Sprintf("model=%s/bond=%d/kept=%v", m.name, m.bond, kept), func(b *testing.B) {
				switch s := m.stage(b).(type) {
				case *stage[float64]:
					s.project(b, kept)
				case *stage[complex128]:
					s.project(b, kept)
				}
			})
		}
	}
}

func (s *stage[T]) project(b *testing.B, kept bool) {
	s.planner.Project(s.first, 2, s.left, s.right, s.theta.Structure).Release()
	for b.Loop() {
		if !kept {
			clear(s.planner.projections)
			s.planner.tasks = 0
		}
		s.planner.Project(s.first, 2, s.left, s.right, s.theta.Structure).Release()
	}
}

// BenchmarkGrow reports the rate of the growth of an environment across a canonical site.
func BenchmarkGrow(b *testing.B) {
	for _, m := range benchModels() {
		for _, left := range []bool{true, false} {
			b.Run(fmt.Sprintf("model=%s/bond=%d/left=%v", m.name, m.bond, left), func(b *testing.B) {
				switch s := m.stage(b).(type) {
				case *stage[float64]:
					s.grow(b, left)
				case *stage[complex128]:
					s.grow(b, left)
				}
			})
		}
	}
}

func (s *stage[T]) grow(b *testing.B, left bool) {
	var ws Workspace[T]
	p, env, i := s.planner, s.left, s.first
	if !left {
		env, i = s.right, i+1
	}
	axes := []block.Axis{s.bonds[i], p.op.Phys[i], s.bonds[i+1].Reversed()}
	a := block.Random[T](block.NewStructure(p.op.Group, axes, block.Charge{}), rand.New(rand.NewPCG(1, 2)))
	plan := func() *Growth[T] {
		if left {
			return p.LeftIsometry(i, env, a.Structure)
		}
		return p.RightIsometry(i, env, a.Structure)
	}
	g := plan()
	out := block.New[T](g.Out)
	g.Run(out, env, a, a, &ws, nil)
	for b.Loop() {
		plan().Run(out, env, a, a, &ws, nil)
	}
	flops := g.Flops()
	if dense.IsComplex[T]() {
		flops *= 4
	}
	b.ReportMetric(flops/1e6, "Mflop")
	b.ReportMetric(flops*float64(b.N)/b.Elapsed().Seconds()/1e9, "GF/s")
}
