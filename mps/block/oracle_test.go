package block

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
)

// The oracle knows full arrays and lists of charges, one a state; it shares no code with the block tables.

type array[T dense.Scalar] struct {
	dims []int
	data []T
}

func newArray[T dense.Scalar](dims []int) array[T] {
	n := 1
	for _, d := range dims {
		n *= d
	}
	return array[T]{dims, make([]T, n)}
}

func (a array[T]) at(index []int) *T {
	k := 0
	for i, d := range a.dims {
		k = k*d + index[i]
	}
	return &a.data[k]
}

// each visits every index of a box in row-major order.
func each(dims []int, visit func(index []int)) {
	index := make([]int, len(dims))
	for {
		for i, d := range dims {
			if index[i] >= d {
				return
			}
		}
		visit(index)
		k := len(dims) - 1
		for ; k >= 0; k-- {
			if index[k]++; index[k] < dims[k] {
				break
			}
			index[k] = 0
		}
		if k < 0 {
			return
		}
	}
}

func denseOf[T dense.Scalar](t *Tensor[T]) array[T] { return array[T]{t.Dims(), t.Dense()} }

func contractDense[T dense.Scalar](a, b array[T], axesA, axesB []int) array[T] {
	pairA, pairB := map[int]int{}, map[int]int{}
	var dims, sum []int
	for i := range axesA {
		pairA[axesA[i]], pairB[axesB[i]] = i, i
		sum = append(sum, a.dims[axesA[i]])
	}
	for k, d := range a.dims {
		if _, ok := pairA[k]; !ok {
			dims = append(dims, d)
		}
	}
	for k, d := range b.dims {
		if _, ok := pairB[k]; !ok {
			dims = append(dims, d)
		}
	}
	out := newArray[T](dims)
	ia, ib := make([]int, len(a.dims)), make([]int, len(b.dims))
	each(dims, func(free []int) {
		var s T
		each(sum, func(inner []int) {
			n := 0
			for k := range ia {
				if i, ok := pairA[k]; ok {
					ia[k] = inner[i]
				} else {
					ia[k] = free[n]
					n++
				}
			}
			for k := range ib {
				if i, ok := pairB[k]; ok {
					ib[k] = inner[i]
				} else {
					ib[k] = free[n]
					n++
				}
			}
			s += *a.at(ia) * *b.at(ib)
		})
		*out.at(free) = s
	})
	return out
}

// stateCharges lists the charge of every state of an axis.
func stateCharges(a Axis) []Charge {
	var c []Charge
	for _, s := range a.Sectors {
		for range s.Dim {
			c = append(c, s.Charge)
		}
	}
	return c
}

// allowedAt applies the charge rule to one element with plain integers.
func allowedAt(g Group, axes []Axis, total Charge, index []int) bool {
	for r := range g.Len() {
		sum := -int(total[r])
		for k, a := range axes {
			sum += int(a.Flow) * int(stateCharges(a)[index[k]][r])
		}
		if q := g.Rule(r).Modulus; q > 0 {
			sum %= q
		}
		if sum != 0 {
			return false
		}
	}
	return true
}

type fataler interface {
	Helper()
	Fatalf(string, ...any)
}

// requireClose compares arrays element by element, to tol of the largest.
func requireClose[T dense.Scalar](t fataler, want, got array[T], tol float64, what string) {
	t.Helper()
	if fmt.Sprint(want.dims) != fmt.Sprint(got.dims) {
		t.Fatalf("%s: dimensions %v, want %v", what, got.dims, want.dims)
	}
	scale := 1.0
	for _, x := range want.data {
		scale = max(scale, dense.Abs(x))
	}
	for i := range want.data {
		if d := dense.Abs(want.data[i] - got.data[i]); !(d <= tol*scale) {
			t.Fatalf("%s: element %d is %v, want %v", what, i, got.data[i], want.data[i])
		}
	}
}

// requireTensor checks the invariants of a tensor: slab size, zero gaps, and the charge rule on the dense image.
func requireTensor[T dense.Scalar](t fataler, x *Tensor[T], what string) {
	t.Helper()
	if len(x.Data) != x.Size {
		t.Fatalf("%s: slab of %d, want %d", what, len(x.Data), x.Size)
	}
	end := 0
	for i, b := range x.Blocks {
		if b.Offset%8 != 0 {
			t.Fatalf("%s: block %d at offset %d", what, i, b.Offset)
		}
		for ; end < b.Offset; end++ {
			if x.Data[end] != 0 {
				t.Fatalf("%s: gap before block %d holds %v", what, i, x.Data[end])
			}
		}
		end = b.Offset + b.Len
	}
	for ; end < len(x.Data); end++ {
		if x.Data[end] != 0 {
			t.Fatalf("%s: last gap holds %v", what, x.Data[end])
		}
	}
	full := denseOf(x)
	each(full.dims, func(index []int) {
		if v := *full.at(index); v != 0 && !allowedAt(x.Group, x.Axes, x.Total, index) {
			t.Fatalf("%s: element %v = %v breaks the charge rule", what, index, v)
		}
	})
}

// Generators.

func drawGroup(t *rapid.T) Group {
	n := rapid.IntRange(1, 4).Draw(t, "charges")
	rules := make([]Rule, n)
	for i := range rules {
		rules[i] = Rule{Name: fmt.Sprintf("q%d", i), Modulus: rapid.SampledFrom([]int{0, 2, 3, 5}).Draw(t, "modulus")}
	}
	g, err := NewGroup(rules...)
	require.NoError(t, err)
	return g
}

func drawCharge(t *rapid.T, g Group) Charge {
	var c Charge
	for i := range g.Len() {
		c[i] = int32(rapid.IntRange(-1, 2).Draw(t, "charge"))
	}
	return g.Normalize(c)
}

func drawAxis(t *rapid.T, g Group) Axis {
	sectors := make([]Sector, rapid.IntRange(1, 3).Draw(t, "sectors"))
	for i := range sectors {
		sectors[i] = Sector{drawCharge(t, g), rapid.IntRange(1, 2).Draw(t, "dim")}
	}
	return NewAxis(rapid.SampledFrom([]Flow{In, Out}).Draw(t, "flow"), sectors...)
}

// drawTotal draws the charge of some element, now and then any charge.
func drawTotal(t *rapid.T, g Group, axes []Axis) Charge {
	if rapid.IntRange(0, 9).Draw(t, "any total") == 0 {
		return drawCharge(t, g)
	}
	var c Charge
	for _, a := range axes {
		c = g.signed(c, a.Flow, rapid.SampledFrom(a.Sectors).Draw(t, "sector").Charge)
	}
	return c
}

func drawStructure(t *rapid.T, minAxes, maxAxes int) *Structure {
	g := drawGroup(t)
	axes := make([]Axis, rapid.IntRange(minAxes, maxAxes).Draw(t, "axes"))
	for i := range axes {
		axes[i] = drawAxis(t, g)
	}
	return NewStructure(g, axes, drawTotal(t, g, axes))
}

func drawTensor[T dense.Scalar](t *rapid.T, s *Structure) *Tensor[T] {
	seed := rapid.Uint64().Draw(t, "seed")
	return Random[T](s, rand.New(rand.NewPCG(seed, 1)))
}

func drawOrder(t *rapid.T, n int) []int {
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	return rapid.Permutation(order).Draw(t, "order")
}

// checkBoth runs a property for real and for complex numbers.
func checkBoth(t *testing.T, real, complex func(*rapid.T)) {
	t.Run("real", func(t *testing.T) { rapid.Check(t, real) })
	t.Run("complex", func(t *testing.T) { rapid.Check(t, complex) })
}

// fixed returns a reproducible source of random numbers.
func fixed(seed uint64) *rand.Rand { return rand.New(rand.NewPCG(seed, 7)) }

// mustGroup is NewGroup for rules known to be good.
func mustGroup(t testing.TB, moduli ...int) Group {
	rules := make([]Rule, len(moduli))
	for i, q := range moduli {
		rules[i] = Rule{Name: string(rune('A' + i)), Modulus: q}
	}
	g, err := NewGroup(rules...)
	require.NoError(t, err)
	return g
}

// bellAxis has the charges lowest..highest with dimensions that peak in the middle, as a bond of a real state has.
func bellAxis(flow Flow, lowest, highest, total int) Axis {
	width := float64(highest-lowest) / 4
	mid := float64(highest+lowest) / 2
	sum := 0.0
	for q := lowest; q <= highest; q++ {
		sum += math.Exp(-math.Pow((float64(q)-mid)/width, 2) / 2)
	}
	var s []Sector
	for q := lowest; q <= highest; q++ {
		dim := float64(total) * math.Exp(-math.Pow((float64(q)-mid)/width, 2)/2) / sum
		s = append(s, Sector{Charge{int32(q)}, max(1, int(math.Round(dim)))})
	}
	return NewAxis(flow, s...)
}
