package block_test

import (
	"fmt"
	"math"

	"rundle/mps/block"
)

// Two spins 1/2 in the singlet state, cut between them. The charge is 2 S^z.
func Example() {
	group, err := block.NewGroup(block.Rule{Name: "2 Sz"})
	if err != nil {
		fmt.Println(err)
		return
	}
	down, up := block.Charge{-1}, block.Charge{1}
	spin := block.NewAxis(block.In, block.Sector{Charge: up, Dim: 1}, block.Sector{Charge: down, Dim: 1})
	s := block.NewStructure(group, []block.Axis{spin, spin}, block.Charge{})
	fmt.Println(len(s.Blocks), "blocks:", s)

	singlet := block.New[float64](s)
	singlet.Block(0)[0] = -math.Sqrt(0.5) // down, up: sectors are sorted by charge
	singlet.Block(1)[0] = math.Sqrt(0.5)

	u, spectrum, v, err := block.SVD(singlet, 1, block.Cut{Bond: 100}, nil, nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	for i, sector := range spectrum.Axis.Sectors {
		fmt.Printf("left spin %+d/2: Schmidt value %.4f\n", sector.Charge[0], spectrum.Values[i][0])
	}
	block.ScaleBond(v, 0, spectrum.Values)
	again := block.Contract(u, v, []int{1}, []int{0})
	fmt.Printf("%.4f\n", again.Dense())
	// Output:
	// 2 blocks: tensor over 2 Sz: U(1), total [0 0 0 0], axes [in 2 {[-1 0 0 0]:1 [1 0 0 0]:1}; in 2 {[-1 0 0 0]:1 [1 0 0 0]:1}]
	// left spin -1/2: Schmidt value 0.7071
	// left spin +1/2: Schmidt value 0.7071
	// [0.0000 -0.7071 0.7071 0.0000]
}

// A contraction that is needed many times is planned once.
func ExamplePlanContract() {
	var group block.Group // no charges: one block
	rows := block.NewAxis(block.In, block.Sector{Dim: 2})
	s := block.NewStructure(group, []block.Axis{rows, rows.Reversed()}, block.Charge{})
	a := block.New[float64](s)
	copy(a.Block(0), []float64{1, 1, 0, 1})

	plan := block.PlanContract(s, s, []int{1}, []int{0})
	var scratch block.Scratch[float64]
	power, next := a.Clone(), block.New[float64](plan.Out)
	for range 9 {
		block.RunContract(plan, next.Data, power.Data, a.Data, &scratch, nil)
		power, next = next, power
	}
	fmt.Println(power.Dense())
	// Output: [1 10 0 1]
}
