package block

import (
	"cmp"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// drawMatrix draws a tensor with at least one block, not zero, and a bipartition. Half of them have elements -1, 0 and 1 only: many are
// rank-deficient, with equal singular values.
func drawMatrix[T dense.Scalar](t *rapid.T) (*Tensor[T], int) {
	s := drawStructure(t, 1, 5)
	if len(s.Blocks) == 0 {
		t.Skip("no block")
	}
	x := drawTensor[T](t, s)
	if rapid.Bool().Draw(t, "coarse") {
		for i, v := range x.Data {
			x.Data[i] = dense.FromFloat[T](math.Round(dense.Real(v) / 1.5))
		}
	}
	if x.Norm() == 0 {
		t.Skip("zero")
	}
	return x, rapid.IntRange(0, len(s.Axes)).Draw(t, "left")
}

// requireIsometry checks that the sum over all axes but the bond gives the identity on it.
func requireIsometry[T dense.Scalar](t fataler, x *Tensor[T], bond int, what string) {
	t.Helper()
	var rest []int
	for k := range x.Axes {
		if k != bond {
			rest = append(rest, k)
		}
	}
	square := Contract(x.Conj(), x, rest, rest)
	want := newArray[T](square.Dims())
	for i := range want.dims[0] {
		*want.at([]int{i, i}) = 1
	}
	requireClose(t, want, denseOf(square), 1e-12, what)
}

// requireBond checks the conventions that all factorizations share.
func requireBond(t fataler, s *Structure, left int, a, b *Structure) {
	t.Helper()
	bond := a.Axes[left]
	if bond.Flow != Out || !bond.Equal(b.Axes[0].Reversed()) || a.Total != (Charge{}) || b.Total != s.Total {
		t.Fatalf("%v cut after %d axes into %v and %v", s, left, a, b)
	}
}

func TestSVD(t *testing.T) { checkBoth(t, svdReconstructs[float64], svdReconstructs[complex128]) }

func svdReconstructs[T dense.Scalar](t *rapid.T) {
	x, left := drawMatrix[T](t)
	u, s, v, err := SVD(x, left, Cut{}, nil, nil)
	if err != nil {
		t.Fatal(err)
	}
	requireTensor(t, u, "u")
	requireTensor(t, v, "v")
	requireBond(t, x.Structure, left, u.Structure, v.Structure)
	requireIsometry(t, u, left, "u")
	requireIsometry(t, v, 0, "v")
	if !s.Axis.Equal(v.Axes[0]) || s.Discarded != 0 || math.Abs(s.Norm-x.Norm()) > 1e-13*s.Norm {
		t.Fatalf("spectrum %+v of a tensor of norm %v, bond %v", s, x.Norm(), v.Axes[0])
	}
	for p, list := range s.Values {
		if len(list) != s.Axis.Sectors[p].Dim || !slices.IsSortedFunc(list, func(a, b float64) int { return cmp.Compare(b, a) }) {
			t.Fatalf("values %v on %v", s.Values, s.Axis)
		}
	}
	ScaleBond(v, 0, s.Values)
	requireClose(t, denseOf(x), denseOf(Contract(u, v, []int{left}, []int{0})), 1e-12, "u s v")
}

// TestTruncation compares with the singular values of the full matrix, which know no charges.
func TestTruncation(t *testing.T) { checkBoth(t, truncates[float64], truncates[complex128]) }

func truncates[T dense.Scalar](t *rapid.T) {
	x, left := drawMatrix[T](t)
	dims := x.Dims()
	rows, cols := product(dims[:left]), product(dims[left:])
	var full dense.SVD[T]
	if err := full.Factor(rows, cols, x.Dense(), cols); err != nil {
		t.Fatal(err)
	}
	all := full.Values()
	total := 0.0
	for _, v := range all {
		total += v * v
	}
	cut := Cut{
		Bond:    rapid.IntRange(0, 6).Draw(t, "bond"),
		Weight:  rapid.SampledFrom([]float64{0, 1e-3, 0.1, 0.5, 1}).Draw(t, "weight"),
		Floor:   rapid.SampledFrom([]float64{0, 0.1, 0.5}).Draw(t, "floor"),
		MinBond: rapid.IntRange(0, 4).Draw(t, "min"),
	}
	u, s, v, err := SVD(x, left, cut, nil, nil)
	if err != nil {
		t.Fatal(err)
	}
	kept := slices.Concat(s.Values...)
	slices.SortFunc(kept, func(a, b float64) int { return cmp.Compare(b, a) })
	dropped := 0.0
	for i, v := range all {
		if i >= len(kept) {
			dropped += v * v / total
		} else if math.Abs(v-kept[i]) > 1e-12*all[0] {
			t.Fatalf("kept %v, the largest are %v", kept, all)
		}
	}
	if math.Abs(dropped-s.Discarded) > 1e-13 {
		t.Fatalf("discarded %v, want %v", s.Discarded, dropped)
	}
	checkCount(t, cut, all, len(kept), total)
	ScaleBond(v, 0, s.Values)
	y := Contract(u, v, []int{left}, []int{0})
	y.Axpy(-1, x)
	if got := y.Norm() * y.Norm() / total; math.Abs(got-s.Discarded) > 1e-12 {
		t.Fatalf("lost %v, reported %v", got, s.Discarded)
	}
}

// checkCount judges the number kept by the meaning of each limit. Which values are exactly zero is a matter of rounding.
func checkCount(t *rapid.T, cut Cut, all []float64, n int, total float64) {
	fits := func(n int) bool { // whether Weight or Floor allow to keep only n
		tail := 0.0
		for _, v := range all[n:] {
			tail += v * v
		}
		return tail <= cut.Weight*total*(1-1e-10) || all[n] < cut.Floor*all[0]*(1-1e-10)
	}
	switch {
	case n < 1 || cut.Bond > 0 && n > cut.Bond:
		t.Fatalf("kept %d with %+v of %v", n, cut, all)
	case n > max(1, cut.MinBond) && (cut.Weight > 0 || cut.Floor > 0 || all[n-1] > 1e-12*all[0]) && fits(n-1):
		t.Fatalf("kept %d with %+v though %d would do, of %v", n, cut, n-1, all)
	case n < len(all) && all[n] > 1e-12*all[0] && (cut.Bond == 0 || n < cut.Bond):
		tail := 0.0
		for _, v := range all[n:] {
			tail += v * v
		}
		if n < cut.MinBond || tail > cut.Weight*total*(1+1e-10) && all[n] > cut.Floor*all[0]*(1+1e-10) {
			t.Fatalf("kept only %d with %+v of %v", n, cut, all)
		}
	}
}

func TestCutSelect(t *testing.T) {
	values := [][]float64{{4, 1, 0.1}, {}, {3, 3, 1e-9, 0}, {2}}
	// squares 16 9 9 4 1 0.01 1e-18
	const total = 39.01 + 1e-18
	rows := []struct {
		name      string
		cut       Cut
		keep      []int
		discarded float64
	}{
		{"all but zeros", Cut{}, []int{3, 0, 3, 1}, 0},
		{"cap", Cut{Bond: 3}, []int{1, 0, 2, 0}, 5.01 / total},
		{"cap inside a tie takes the first list", Cut{Bond: 2}, []int{1, 0, 1, 0}, 14.01 / total},
		{"cap of one", Cut{Bond: 1}, []int{1, 0, 0, 0}, 23.01 / total},
		{"cap beyond", Cut{Bond: 100}, []int{3, 0, 3, 1}, 0},
		{"tiny weight, no cancellation", Cut{Weight: 1e-15}, []int{3, 0, 2, 1}, 1e-18 / total},
		{"weight", Cut{Weight: 0.03}, []int{1, 0, 2, 1}, 1.01 / total},
		{"all the weight", Cut{Weight: 1}, []int{1, 0, 0, 0}, 23.01 / total},
		{"floor", Cut{Floor: 0.3}, []int{1, 0, 2, 1}, 1.01 / total},
		{"at the floor stays", Cut{Floor: 0.25}, []int{2, 0, 2, 1}, 0.01 / total},
		{"least over weight", Cut{Weight: 1, MinBond: 4}, []int{1, 0, 2, 1}, 1.01 / total},
		{"least has no zeros", Cut{Weight: 1, MinBond: 50}, []int{3, 0, 3, 1}, 0},
		{"cap over least", Cut{Bond: 2, MinBond: 4}, []int{1, 0, 1, 0}, 14.01 / total},
	}
	for _, r := range rows {
		t.Run(r.name, func(t *testing.T) {
			keep, discarded := r.cut.Select(values)
			assert.Equal(t, r.keep, keep)
			assert.InEpsilon(t, 1+r.discarded, 1+discarded, 1e-15)
			if r.discarded > 0 {
				assert.InEpsilon(t, r.discarded, discarded, 1e-12)
			}
		})
	}
	keep, discarded := Cut{Bond: 1}.Select([][]float64{{0, 0}, {0}})
	assert.Equal(t, []int{0, 0}, keep)
	assert.Zero(t, discarded)
	keep, _ = Cut{Weight: 1e-3}.Select([][]float64{{1e200, 1e199}, {1e198}})
	assert.Equal(t, []int{2, 0}, keep, "squares that overflow")
}

func TestSVDErrors(t *testing.T) {
	g := mustGroup(t, 0)
	a := NewAxis(In, Sector{Charge{0}, 2}, Sector{Charge{1}, 2})
	s := NewStructure(g, []Axis{a, a.Reversed()}, Charge{})
	_, _, _, err := SVD(New[float64](s), 1, Cut{}, nil, nil)
	assert.ErrorIs(t, err, ErrZero)
	_, _, _, err = SVD(New[float64](NewStructure(g, []Axis{a}, Charge{7})), 1, Cut{}, nil, nil)
	assert.ErrorIs(t, err, ErrZero, "no blocks")

	x := Random[complex128](s, fixed(1))
	x.Block(1)[2] = complex(0, math.NaN())
	_, _, _, err = SVD(x, 1, Cut{}, nil, nil)
	var fault *SVDError
	require.True(t, errors.As(err, &fault), "%v", err)
	assert.Equal(t, Charge{1}, fault.Charge)
	var cause *dense.NumericalError
	assert.True(t, errors.As(err, &cause), "%v", err)
	assert.ErrorContains(t, err, "singular values of the 2×2 block of bond charge [1 0 0 0]: ")
}

// TestSVDLeavesOutSectors has one charge too faint to keep: it disappears from the bond.
func TestSVDLeavesOutSectors(t *testing.T) {
	g := mustGroup(t, 0)
	a := NewAxis(In, Sector{Charge{0}, 1}, Sector{Charge{1}, 1}, Sector{Charge{2}, 1})
	s := NewStructure(g, []Axis{a, a.Reversed()}, Charge{})
	x, err := FromDense(s, []float64{2, 0, 0, 0, 1e-6, 0, 0, 0, 1}, 0)
	require.NoError(t, err)
	u, spectrum, v, err := SVD(x, 1, Cut{Weight: 1e-10}, nil, nil)
	require.NoError(t, err)
	assert.Equal(t, []Sector{{Charge{0}, 1}, {Charge{2}, 1}}, spectrum.Axis.Sectors)
	assert.Equal(t, [][]float64{{2}, {1}}, spectrum.Values)
	assert.InEpsilon(t, 1e-12/5, spectrum.Discarded, 1e-9)
	ScaleBond(v, 0, spectrum.Values)
	assert.InDeltaSlice(t, []float64{2, 0, 0, 0, 0, 0, 0, 0, 1}, Contract(u, v, []int{1}, []int{0}).Dense(), 1e-15)
}

func TestSVDOnThreads(t *testing.T) {
	x := typicalTheta[float64](t, 320)
	require.Greater(t, decompose(x, 2, nil, nil).flops, float64(task.Threshold))
	cut := Cut{Bond: 60}
	u, s, v, err := SVD(x, 2, cut, nil, nil)
	require.NoError(t, err)
	u3, s3, v3, err := SVD(x, 2, cut, nil, task.New(3))
	require.NoError(t, err)
	assert.Equal(t, s, s3)
	assert.Equal(t, u.Data, u3.Data)
	assert.Equal(t, v.Data, v3.Data)
	assert.Equal(t, 60, s.Axis.Dim())
	requireIsometry(t, u, 2, "u")
	requireIsometry(t, v, 0, "v")
}

func TestQROnThreads(t *testing.T) {
	x := typicalTheta[float64](t, 500)
	_, flops := PlanMatrix(x.Structure, 2).byWork(qrCost)
	require.Greater(t, flops, float64(task.Threshold))
	for _, factor := range []func(*Tensor[float64], int, *Workspace[float64], *task.Pool) (a, b *Tensor[float64], err error){QR[float64], LQ[float64]} {
		a, b, err := factor(x, 2, nil, nil)
		require.NoError(t, err)
		a3, b3, err := factor(x, 2, nil, task.New(3))
		require.NoError(t, err)
		assert.Equal(t, a.Data, a3.Data)
		assert.Equal(t, b.Data, b3.Data)
	}
}

// TestWorkspaceOfOthers runs factorizations of several sizes, a stopped one among them, through one workspace: nothing shows in the results.
func TestWorkspaceOfOthers(t *testing.T) { bothWorkspaces[float64](t); bothWorkspaces[complex128](t) }

func bothWorkspaces[T dense.Scalar](t *testing.T) {
	var ws Workspace[T]
	for i, bond := range []int{60, 10, 35, 90} {
		x := typicalTheta[T](t, bond)
		pool, cut := task.New(i%3+1), Cut{Bond: bond}
		u, s, v, err := SVD(x, 2, cut, nil, nil)
		require.NoError(t, err)
		u1, s1, v1, err := SVD(x, 2, cut, &ws, pool)
		require.NoError(t, err)
		assert.Equal(t, s, s1)
		assert.Equal(t, [][]T{u.Data, v.Data}, [][]T{u1.Data, v1.Data})
		q, r, err := QR(x, 1, nil, nil)
		require.NoError(t, err)
		q1, r1, err := QR(x, 1, &ws, pool)
		require.NoError(t, err)
		assert.Equal(t, [][]T{q.Data, r.Data}, [][]T{q1.Data, r1.Data})
		_, _, err = LQ(x, 2, &ws, pool.Until(func() bool { return true }))
		if kernels, _ := dense.Kernels(); kernels != "netlib" {
			require.Equal(t, dense.ErrStopped, err)
		}
	}
}

func TestQR(t *testing.T) { checkBoth(t, qrFactors[float64], qrFactors[complex128]) }

func qrFactors[T dense.Scalar](t *rapid.T) {
	x, left := drawMatrix[T](t)
	q, r, err := QR(x, left, nil, nil)
	if err != nil {
		t.Fatal(err)
	}
	requireFactors(t, x, left, q, r)
	requireIsometry(t, q, left, "q")
	requireTriangles(t, PlanMatrix(r.Structure, 1), r.Data, func(i, j int) bool { return i > j })
}

func TestLQ(t *testing.T) { checkBoth(t, lqFactors[float64], lqFactors[complex128]) }

func lqFactors[T dense.Scalar](t *rapid.T) {
	x, left := drawMatrix[T](t)
	l, q, err := LQ(x, left, nil, nil)
	if err != nil {
		t.Fatal(err)
	}
	requireFactors(t, x, left, l, q)
	requireIsometry(t, q, 0, "q")
	requireTriangles(t, PlanMatrix(l.Structure, left), l.Data, func(i, j int) bool { return i < j })
}

func requireFactors[T dense.Scalar](t *rapid.T, x *Tensor[T], left int, a, b *Tensor[T]) {
	t.Helper()
	requireTensor(t, a, "left factor")
	requireTensor(t, b, "right factor")
	requireBond(t, x.Structure, left, a.Structure, b.Structure)
	p := PlanMatrix(x.Structure, left)
	for i, m := range p.Sectors {
		if s := b.Axes[0].Sectors[i]; s.Charge != m.Charge || s.Dim != min(m.Rows, m.Cols) {
			t.Fatalf("bond %v for matrices %+v", b.Axes[0], p.Sectors)
		}
	}
	requireClose(t, denseOf(x), denseOf(Contract(a, b, []int{left}, []int{0})), 1e-12, "product of the factors")
}

func requireTriangles[T dense.Scalar](t *rapid.T, p *MatrixPlan, data []T, zero func(i, j int) bool) {
	t.Helper()
	for s, m := range p.Sectors {
		a := make([]T, m.Rows*m.Cols)
		Gather(p, s, a, m.Cols, data)
		for i := range m.Rows {
			for j := range m.Cols {
				v := dense.ToComplex(a[i*m.Cols+j])
				if zero(i, j) && v != 0 || i == j && (imag(v) != 0 || real(v) < 0) {
					t.Fatalf("triangle of charge %v has %v at %d, %d", m.Charge, v, i, j)
				}
			}
		}
	}
}

// TestMatrixPlan checks that the matrices hold every element once, with the charge of rows and columns, and come back.
func TestMatrixPlan(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x, left := drawMatrix[float64](t)
		p := PlanMatrix(x.Structure, left)
		back := New[float64](x.Structure)
		slab := make([]float64, p.Size)
		weight := 0.0
		for i, m := range p.Sectors {
			if j, ok := p.Find(m.Charge); !ok || i != j {
				t.Fatalf("charge %v found at %d, want %d", m.Charge, j, i)
			}
			a := slab[m.Offset : m.Offset+m.Rows*m.Cols]
			Gather(p, i, a, m.Cols, x.Data)
			for _, v := range a {
				weight += v * v
			}
			checkSegments(t, x.Structure, x.Axes[:left], m.Charge, m.RowSegs, m.Rows)
			checkSegments(t, x.Structure, x.Axes[left:], x.Group.Sub(x.Total, m.Charge), m.ColSegs, m.Cols)
			wide := make([]float64, m.Rows*(m.Cols+3))
			copyRows(wide, m.Cols+3, a, m.Cols, m.Rows, m.Cols)
			Scatter(p, i, back.Data, wide, m.Cols+3)
		}
		if math.Abs(weight-x.Norm()*x.Norm()) > 1e-12*weight {
			t.Fatalf("matrices hold %v, the tensor %v", weight, x.Norm()*x.Norm())
		}
		requireClose(t, denseOf(x), denseOf(back), 0, "gathered and scattered")
		if _, ok := p.Find(Charge{99}); ok {
			t.Fatalf("found a charge that is not there")
		}
	})
}

func checkSegments(t *rapid.T, s *Structure, axes []Axis, want Charge, segments []Segment, total int) {
	t.Helper()
	at := 0
	for i, seg := range segments {
		var q Charge
		dim := 1
		for k, pos := range seg.Sectors {
			q = s.Group.signed(q, axes[k].Flow, axes[k].Sectors[pos].Charge)
			dim *= axes[k].Sectors[pos].Dim
		}
		if q != want || seg.Dim != dim || seg.Start != at || i > 0 && slices.Compare(segments[i-1].Sectors, seg.Sectors) >= 0 {
			t.Fatalf("segment %+v of charge %v on axes %v", seg, want, axes)
		}
		at += dim
	}
	if at != total {
		t.Fatalf("segments of %d states, want %d", at, total)
	}
}

// typicalTheta is a two-site tensor (l In, s In, s In, r Out) in the middle of a spin chain: one U(1) charge, bells of sectors.
func typicalTheta[T dense.Scalar](t testing.TB, bond int) *Tensor[T] {
	l := bellAxis(In, -8, 8, bond)
	s := NewAxis(In, Sector{Charge{-1}, 1}, Sector{Charge{1}, 1})
	return Random[T](NewStructure(mustGroup(t, 0), []Axis{l, s, s, l.Reversed()}, Charge{}), rand.New(rand.NewPCG(1, 2)))
}

// TestSVDStops stops at every question in turn; what the pool carries changes nothing otherwise.
func TestSVDStops(t *testing.T) {
	g := mustGroup(t, 0)
	a := NewAxis(In, Sector{Charge{0}, 50}, Sector{Charge{1}, 40})
	x := Random[float64](NewStructure(g, []Axis{a, a.Reversed()}, Charge{}), fixed(1))
	want, _, _, err := SVD(x, 1, Cut{}, nil, nil)
	require.NoError(t, err)
	few := 8
	if kernels, _ := dense.Kernels(); kernels == "netlib" {
		few = 0 // LAPACK does not ask
	}
	for at := 0; ; at++ {
		asked := 0
		pool := task.New(1).Until(func() bool { asked++; return asked > at })
		u, _, _, err := SVD(x, 1, Cut{}, nil, pool)
		if err == nil {
			assert.Greater(t, at, few, "it asks too seldom")
			assert.Equal(t, want.Data, u.Data)
			break
		}
		require.Equal(t, dense.ErrStopped, err, "question %d", at)
	}
}
