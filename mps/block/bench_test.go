package block

import (
	"fmt"
	"testing"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// mpoAxis is the bond of an operator with a few charges.
func mpoAxis(f Flow) Axis {
	return NewAxis(f, Sector{Charge{-2}, 2}, Sector{Charge{0}, 5}, Sector{Charge{2}, 2})
}

// environmentStep contracts an environment (bra Out, MPO In, ket In) with a two-site tensor over ket: the step that takes most of a sweep.
func environmentStep[T dense.Scalar](b testing.TB, bond int) (env, theta *Tensor[T], p *ContractPlan) {
	theta = typicalTheta[T](b, bond)
	l := theta.Axes[0]
	env = Random[T](NewStructure(theta.Group, []Axis{l.Reversed(), mpoAxis(In), l.Reversed()}, Charge{}), fixed(3))
	return env, theta, PlanContract(env.Structure, theta.Structure, []int{2}, []int{0})
}

func BenchmarkContract(b *testing.B) {
	for _, bond := range []int{64, 256} {
		for _, threads := range []int{1, 2} {
			b.Run(fmt.Sprintf("type=real/bond=%d/threads=%d", bond, threads), func(b *testing.B) { benchmarkContract[float64](b, bond, threads, 1) })
			b.Run(fmt.Sprintf("type=complex/bond=%d/threads=%d", bond, threads), func(b *testing.B) { benchmarkContract[complex128](b, bond, threads, 4) })
		}
	}
}

func benchmarkContract[T dense.Scalar](b *testing.B, bond, threads int, factor float64) {
	env, theta, p := environmentStep[T](b, bond)
	out := New[T](p.Out)
	var ws Scratch[T]
	pool := task.New(threads)
	b.ReportAllocs()
	for b.Loop() {
		RunContract(p, out.Data, env.Data, theta.Data, &ws, pool)
	}
	b.ReportMetric(factor*p.Flops()*float64(b.N)/b.Elapsed().Seconds()/1e9, "Gflop/s")
	b.ReportMetric(float64(len(p.gemms)), "gemms")
}

func BenchmarkPlanContract(b *testing.B) {
	env, theta, _ := environmentStep[float64](b, 64)
	b.ReportAllocs()
	for b.Loop() {
		PlanContract(env.Structure, theta.Structure, []int{2}, []int{0})
	}
}

func BenchmarkNewStructure(b *testing.B) {
	group := mustGroup(b, 0, 0)
	var sectors []Sector
	for up := range int32(12) {
		for down := range int32(12) {
			sectors = append(sectors, Sector{Charge{up, down}, 3})
		}
	}
	l := NewAxis(In, sectors...)
	s := NewAxis(In, Sector{Charge{0, 0}, 1}, Sector{Charge{1, 0}, 1}, Sector{Charge{0, 1}, 1}, Sector{Charge{1, 1}, 1})
	axes := []Axis{l, s, s, l.Reversed()}
	b.ReportAllocs()
	blocks := 0
	for b.Loop() {
		blocks = len(NewStructure(group, axes, Charge{}).Blocks)
	}
	b.ReportMetric(float64(blocks), "blocks")
}

func BenchmarkFind(b *testing.B) {
	s := typicalTheta[float64](b, 64).Structure
	i := 0
	for b.Loop() {
		if _, ok := s.Find(s.Blocks[i].Sectors...); !ok {
			b.Fatal("not found")
		}
		i = (i + 1) % len(s.Blocks)
	}
}

func BenchmarkPermute(b *testing.B) {
	x := typicalTheta[float64](b, 256)
	for _, order := range [][]int{{3, 2, 1, 0}, {0, 2, 1, 3}, {2, 3, 0, 1}} {
		b.Run(fmt.Sprintf("order=%v", order), func(b *testing.B) {
			p := PlanPermute(x.Structure, order...)
			out := New[float64](p.Out)
			b.SetBytes(int64(16 * x.Elements()))
			for b.Loop() {
				RunPermute(p, out.Data, x.Data, nil)
			}
		})
	}
}

func BenchmarkSVD(b *testing.B) {
	for _, bond := range []int{32, 128} {
		b.Run(fmt.Sprintf("bond=%d", bond), func(b *testing.B) {
			x := typicalTheta[float64](b, bond)
			for b.Loop() {
				if _, _, _, err := SVD(x, 2, Cut{Bond: bond}, nil, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
