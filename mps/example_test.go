package mps_test

import (
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"

	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

func check(err error) {
	if err != nil {
		panic(err)
	}
}

// A pair of bosons shared by two sites: the sum of two product states, its Schmidt values with their charges, a file.
func Example() {
	lad, err := ladder.New(2, ladder.Open, ladder.Leg("a", ladder.Boson(2)))
	check(err)
	h, err := lad.Hamiltonian(nil, ladder.Term{Formula: "-b^+[a,j+1] b[a,j] + h.c."})
	check(err)
	frames, err := h.Frames(ladder.FrameOptions{})
	check(err)

	left, err := mps.ProductState(frames, h.Scope, []int{2, 0})
	check(err)
	right, err := mps.ProductState(frames, h.Scope, []int{0, 2})
	check(err)
	pair, err := mps.Superpose(0.6, left, 0.8, right)
	check(err)
	fmt.Println(pair.Charges(), "norm", pair.Norm())
	cut := pair.Schmidt(0)
	for i, sector := range cut.Axis.Sectors {
		fmt.Printf("left of the cut %v: %.2f\n", frames.Values(sector.Charge), cut.Values[i])
	}

	dir, err := os.MkdirTemp("", "")
	check(err)
	defer os.RemoveAll(dir)
	path := filepath.Join(dir, "pair.npz")
	check(pair.Save(path))
	again, err := mps.Load(path)
	check(err)
	overlap, err := again.Overlap(right)
	check(err)
	fmt.Printf("overlap %.2f\n", real(overlap))
	// Output:
	// map[N:2] norm 1
	// left of the cut map[N:0]: [0.80]
	// left of the cut map[N:2]: [0.60]
	// overlap 0.80
}

// The expert level: chains on axes of one's own.
func ExampleRandom() {
	g, err := block.NewGroup(block.Rule{Name: "N"})
	check(err)
	site := block.NewAxis(block.In, block.Sector{Charge: block.Charge{0}, Dim: 1}, block.Sector{Charge: block.Charge{1}, Dim: 1})
	axes := []block.Axis{site, site, site, site, site, site}
	c, err := mps.Random[float64](g, axes, block.Charge{3}, 6, rand.New(rand.NewPCG(1, 2)))
	check(err)
	fmt.Println(c.BondDims(), c.Center)
	discarded, err := c.Truncate(block.Cut{Bond: 2}, nil)
	check(err)
	fmt.Println(c.BondDims(), discarded > 0, discarded < 1)
	// Output:
	// [2 4 6 4 2] 0
	// [2 2 2 2 2] true true
}
