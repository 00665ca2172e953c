package block

import (
	"encoding/json"
	"fmt"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

func TestNewGroup(t *testing.T) {
	rows := []struct {
		name  string
		rules []Rule
		fault string
	}{
		{"none", nil, ""},
		{"four of each kind", []Rule{{"N", 0}, {"Sz", 0}, {"P", 2}, {"Q", 3}}, ""},
		{"unnamed", []Rule{{}, {"", 2}}, ""},
		{"NUL in a name", []Rule{{"a\x00b", 0}}, `"a\x00b" contains a NUL`},
		{"five", make([]Rule, 5), "5 charges given; at most 4"},
		{"modulus one", []Rule{{"N", 0}, {"P", 1}}, `charge "P" has modulus 1`},
		{"negative modulus", []Rule{{"P", -2}}, "modulus -2"},
		{"huge modulus", []Rule{{"P", 1 << 31}}, "modulus 2147483648"},
	}
	for _, r := range rows {
		t.Run(r.name, func(t *testing.T) {
			g, err := NewGroup(r.rules...)
			if r.fault != "" {
				require.ErrorContains(t, err, r.fault)
				return
			}
			require.NoError(t, err)
			require.Equal(t, len(r.rules), g.Len())
			for i, rule := range r.rules {
				assert.Equal(t, rule, g.Rule(i))
			}
			again, err := NewGroup(r.rules...)
			require.NoError(t, err)
			assert.True(t, g == again, "groups are comparable")
		})
	}
}

func TestGroupJSON(t *testing.T) {
	g, err := NewGroup(Rule{"N", 0}, Rule{"P", 2})
	require.NoError(t, err)
	text, err := json.Marshal(g)
	require.NoError(t, err)
	assert.JSONEq(t, `[{"Name":"N","Modulus":0},{"Name":"P","Modulus":2}]`, string(text))
	var back Group
	require.NoError(t, json.Unmarshal(text, &back))
	assert.Equal(t, g, back)
	assert.ErrorContains(t, json.Unmarshal([]byte(`[{"Name":"P","Modulus":1}]`), &back), "modulus 1")
	assert.Error(t, json.Unmarshal([]byte(`{"N":0}`), &back))
	assert.Equal(t, "N: U(1) × P: Z_2", g.String())
	assert.Equal(t, "1", Group{}.String())
}

func TestGroupIsAbelian(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		g := drawGroup(t)
		a, b, c := drawCharge(t, g), drawCharge(t, g), drawCharge(t, g)
		if g.Add(g.Add(a, b), c) != g.Add(a, g.Add(b, c)) || g.Add(a, b) != g.Add(b, a) {
			t.Fatalf("%v: sums of %v %v %v", g, a, b, c)
		}
		if g.Add(g.Sub(a, b), b) != a || g.Add(a, g.Neg(a)) != (Charge{}) {
			t.Fatalf("%v: difference of %v %v", g, a, b)
		}
		if s := g.Add(a, b); !g.valid(s) || !g.valid(g.Neg(s)) {
			t.Fatalf("%v: %v + %v = %v is not normalized", g, a, b, s)
		}
	})
}

func TestChargeCompare(t *testing.T) {
	order := []Charge{{-2, 5}, {-1, -7}, {-1, 0}, {0, -1}, {}, {0, 0, 0, 1}, {0, 0, 1}, {0, 1}, {3}}
	for i, a := range order {
		for j, b := range order {
			want := 0
			if i < j {
				want = -1
			} else if i > j {
				want = 1
			}
			assert.Equal(t, want, a.Compare(b), "%v with %v", a, b)
		}
	}
}

func TestAxis(t *testing.T) {
	a := NewAxis(In, Sector{Charge{2}, 1}, Sector{Charge{-1}, 3}, Sector{Charge{2}, 4}, Sector{Charge{7}, 0})
	assert.Equal(t, []Sector{{Charge{-1}, 3}, {Charge{2}, 5}}, a.Sectors)
	assert.Equal(t, 8, a.Dim())
	assert.Equal(t, 3, a.Offset(1))
	pos, ok := a.Find(Charge{2})
	assert.Equal(t, 1, pos)
	assert.True(t, ok)
	_, ok = a.Find(Charge{7})
	assert.False(t, ok)
	assert.Equal(t, Out, a.Reversed().Flow)
	assert.False(t, a.Equal(a.Reversed()))
	assert.True(t, a.Equal(NewAxis(In, Sector{Charge{2}, 5}, Sector{Charge{-1}, 3})))
	assert.False(t, a.Equal(NewAxis(In, Sector{Charge{2}, 5}, Sector{Charge{-1}, 2})))
	assert.Equal(t, "in 8 {[-1 0 0 0]:3 [2 0 0 0]:5}", a.String())
}

func TestFrameAxis(t *testing.T) {
	f := Frame{Charges: []Charge{{0}, {1}, {1}, {2}}, Order: []int{0, 2, 1, 3}}
	assert.Equal(t, 4, f.Dim())
	assert.Equal(t, []Sector{{Charge{0}, 1}, {Charge{1}, 2}, {Charge{2}, 1}}, f.Axis().Sectors)
	assert.Equal(t, In, f.Axis().Flow)
	text, err := json.Marshal(f)
	require.NoError(t, err)
	var back Frame
	require.NoError(t, json.Unmarshal(text, &back))
	assert.Equal(t, f, back)
	assert.PanicsWithValue(t, "block: frame with charge [0 0 0 0] of state 1 after [1 0 0 0]; states are sorted by charge",
		func() { Frame{Charges: []Charge{{1}, {0}}}.Axis() })
}

// TestStructureBlocks compares the block table with all combinations of sectors, tried one by one.
func TestStructureBlocks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawStructure(t, 0, 5)
		counts := make([]int, len(s.Axes))
		for k, a := range s.Axes {
			counts[k] = len(a.Sectors)
		}
		found, offset := 0, 0
		each(counts, func(at []int) {
			index, length := make([]int, len(at)), 1
			for k, p := range at {
				index[k] = s.Axes[k].Offset(p)
				length *= s.Axes[k].Sectors[p].Dim
			}
			i, ok := s.Find(at...)
			if want := allowedAt(s.Group, s.Axes, s.Total, index); ok != want {
				t.Fatalf("block at %v of %v: %v, want %v", at, s, ok, want)
			}
			if !ok {
				return
			}
			b := s.Blocks[i]
			if i != found || !slices.Equal(b.Sectors, at) || b.Len != length || b.Offset != offset {
				t.Fatalf("block %d at %v is %+v of %v", found, at, b, s)
			}
			found++
			offset += (length + 7) / 8 * 8
		})
		if found != len(s.Blocks) || offset != s.Size {
			t.Fatalf("%d blocks in %d elements, want %d in %d", len(s.Blocks), s.Size, found, offset)
		}
	})
}

func TestFindWithoutTable(t *testing.T) {
	g := mustGroup(t, 0)
	a := bellAxis(In, -20, 20, 100)
	s := NewStructure(g, []Axis{a, a, a, a.Reversed()}, Charge{})
	require.Nil(t, NewStructure(g, []Axis{a, a, a, a, NewAxis(In, Sector{Charge{80}, 1})}, Charge{}).table, "few blocks among many combinations")
	require.NotNil(t, s.table)
	plain := *s
	plain.table = nil
	for i, b := range s.Blocks {
		j, ok := s.Find(b.Sectors...)
		require.True(t, ok)
		require.Equal(t, i, j)
		j, ok = plain.Find(b.Sectors...)
		require.True(t, ok)
		require.Equal(t, i, j)
	}
	for _, none := range [][]int{{0, 0, 0, 0}, {40, 40, 40, 40}, {-1, 0, 0, 0}, {41, 0, 0, 0}} {
		_, ok := s.Find(none...)
		assert.False(t, ok, "%v", none)
		_, ok = plain.Find(none...)
		assert.False(t, ok, "%v", none)
	}
}

func TestEmptyStructures(t *testing.T) {
	g := mustGroup(t, 0)
	assert.Len(t, NewStructure(g, nil, Charge{}).Blocks, 1, "a number")
	assert.Empty(t, NewStructure(g, nil, Charge{1}).Blocks)
	assert.Empty(t, NewStructure(g, []Axis{NewAxis(In)}, Charge{}).Blocks)
	one := NewAxis(In, Sector{Charge{1}, 2})
	s := NewStructure(g, []Axis{one, one}, Charge{})
	assert.Empty(t, s.Blocks)
	assert.Zero(t, New[float64](s).Norm())
	assert.Equal(t, make([]float64, 4), New[float64](s).Dense())
}

func TestStructureEqual(t *testing.T) {
	g := mustGroup(t, 0)
	a := NewAxis(In, Sector{Charge{0}, 1}, Sector{Charge{1}, 2})
	s := NewStructure(g, []Axis{a, a.Reversed()}, Charge{})
	assert.True(t, s.Equal(NewStructure(g, []Axis{a, a.Reversed()}, Charge{})))
	assert.False(t, s.Equal(NewStructure(g, []Axis{a.Reversed(), a}, Charge{})))
	assert.False(t, s.Equal(NewStructure(g, []Axis{a, a.Reversed()}, Charge{1})))
	assert.False(t, s.Equal(NewStructure(mustGroup(t, 3), []Axis{a, a.Reversed()}, Charge{})))
	assert.Equal(t, 5, s.Elements())
	c := s.Conj()
	assert.True(t, c.Conj().Equal(s))
	assert.Equal(t, NewStructure(g, c.Axes, c.Total).Blocks, c.Blocks)
}

func TestMisuseShowsShapes(t *testing.T) {
	g, z := mustGroup(t, 0), mustGroup(t, 2)
	a := NewAxis(In, Sector{Charge{0}, 1}, Sector{Charge{1}, 2})
	b := NewAxis(Out, Sector{Charge{0}, 3})
	s, o := NewStructure(g, []Axis{a, a.Reversed()}, Charge{}), NewStructure(g, []Axis{b}, Charge{})
	x, y := New[float64](s), New[float64](o)
	first, second := "in 3 {[0 0 0 0]:1 [1 0 0 0]:2}", "out 3 {[0 0 0 0]:3}"
	rows := []struct {
		name string
		call func()
		want []string
	}{
		{"axis without flow", func() { NewAxis(0) }, []string{"flow 0"}},
		{"negative dimension", func() { NewAxis(In, Sector{Charge{1}, -1}) }, []string{"[1 0 0 0]", "-1"}},
		{"unsorted axis", func() { NewStructure(g, []Axis{{In, []Sector{{Charge{1}, 1}, {Charge{0}, 1}}}}, Charge{}) }, []string{"order"}},
		{"charge of another group", func() { NewStructure(z, []Axis{NewAxis(In, Sector{Charge{2}, 1})}, Charge{}) }, []string{"[2 0 0 0]", "Z_2"}},
		{"charge beyond the group", func() { NewStructure(g, []Axis{NewAxis(In, Sector{Charge{0, 1}, 1})}, Charge{}) }, []string{"[0 1 0 0]"}},
		{"total not normalized", func() { NewStructure(z, []Axis{}, Charge{3}) }, []string{"[3 0 0 0]"}},
		{"too many axes", func() { NewStructure(g, make([]Axis, 17), Charge{}) }, []string{"17", "16"}},
		{"find", func() { s.Find(1) }, []string{"1 positions", first}},
		{"rule", func() { g.Rule(1) }, []string{"rule 1"}},
		{"axpy", func() { x.Axpy(1, y) }, []string{first, second}},
		{"dot", func() { Dot(x, y) }, []string{first, second}},
		{"contract flows", func() { Contract(x, x, []int{0}, []int{0}) }, []string{first, "does not pair"}},
		{"contract sectors", func() { Contract(x, y, []int{0}, []int{0}) }, []string{first, second}},
		{"contract counts", func() { Contract(x, x, []int{0}, nil) }, []string{first, "numbers of axes"}},
		{"contract twice", func() { Contract(x, x, []int{0, 0}, []int{1, 1}) }, []string{first, "twice"}},
		{"contract no axis", func() { Contract(x, x, []int{2}, []int{1}) }, []string{first, "no such axis"}},
		{"contract groups", func() { Contract(x, New[float64](NewStructure(z, nil, Charge{})), nil, nil) }, []string{"different groups", "Z_2"}},
		{"contract slab", func() { RunContract(PlanContract(s, s, nil, nil), x.Data, x.Data, x.Data, nil, nil) }, []string{"slab of 16"}},
		{"permute", func() { Permute(x, 0, 0) }, []string{"[0 0]", first}},
		{"permute slab", func() { RunPermute(PlanPermute(s, 1, 0), x.Data, y.Data, nil) }, []string{"slab of 8", first}},
		{"fuse", func() { Fuse(x, 1, 3, In) }, []string{"1..2", first}},
		{"split", func() { Split(x, 0, NewFusion(g, []Axis{b}, In)) }, []string{first, "in 3 {[0 0 0 0]:3}"}},
		{"split axis", func() { Split(x, 2, NewFusion(g, []Axis{b}, In)) }, []string{"axis 2", first}},
		{"bipartition", func() { PlanMatrix(s, 3) }, []string{"3 axes", first}},
		{"gather", func() { Gather(PlanMatrix(s, 1), 1, make([]float64, 4), 1, x.Data) }, []string{"leading dimension 1", first}},
		{"from dense", func() { FromDense(s, make([]float64, 8), 0) }, []string{"8 elements", "[3 3]", first}},
		{"scale lists", func() { ScaleBond(x, 0, [][]float64{{1}}) }, []string{"1 lists", first}},
		{"scale values", func() { ScaleBond(x, 0, [][]float64{{1}, {1}}) }, []string{"1 values for sector 1", first}},
		{"scale axis", func() { ScaleBond(x, -1, nil) }, []string{"axis -1", first}},
	}
	for _, r := range rows {
		t.Run(r.name, func(t *testing.T) {
			defer func() {
				text := fmt.Sprint(recover())
				require.Contains(t, text, "block: ")
				for _, w := range r.want {
					assert.Contains(t, text, w)
				}
			}()
			r.call()
		})
	}
}
