package block

import (
	"errors"
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/dense"
)

func TestDenseRoundTrip(t *testing.T) {
	checkBoth(t, denseRoundTrip[float64], denseRoundTrip[complex128])
}

func denseRoundTrip[T dense.Scalar](t *rapid.T) {
	x := drawTensor[T](t, drawStructure(t, 0, 5))
	requireTensor(t, x, "random tensor")
	full := denseOf(x)
	back, err := FromDense(x.Structure, full.data, 0)
	if err != nil {
		t.Fatal(err)
	}
	requireClose(t, full, denseOf(back), 0, "round trip")
	requireTensor(t, back, "round trip")
	norm := 0.0
	for _, v := range full.data {
		norm = math.Hypot(norm, dense.Abs(v))
	}
	if math.Abs(norm-x.Norm()) > 1e-12*norm {
		t.Fatalf("norm %v, want %v", x.Norm(), norm)
	}
}

func TestVectorOperations(t *testing.T) {
	checkBoth(t, vectorOperations[float64], vectorOperations[complex128])
}

func vectorOperations[T dense.Scalar](t *rapid.T) {
	s := drawStructure(t, 0, 4)
	x, y := drawTensor[T](t, s), drawTensor[T](t, s)
	fx, fy := denseOf(x), denseOf(y)
	var dot T
	want := newArray[T](fx.dims)
	for i := range fx.data {
		dot += dense.Conj(fx.data[i]) * fy.data[i]
		want.data[i] = 3 * (fy.data[i] - 2*fx.data[i])
	}
	if d := Dot(x, y); dense.Abs(d-dot) > 1e-12*(1+x.Norm()*y.Norm()) {
		t.Fatalf("dot %v, want %v", d, dot)
	}
	z := y.Clone()
	z.Axpy(-2, x)
	z.Scale(3)
	requireClose(t, want, denseOf(z), 1e-14, "3 (y - 2 x)")
	requireClose(t, fy, denseOf(y), 0, "the original of a clone")

	c := x.Conj()
	requireTensor(t, c, "conjugate")
	for i, v := range c.Dense() {
		if v != dense.Conj(fx.data[i]) {
			t.Fatalf("conjugate of %v is %v", fx.data[i], v)
		}
	}
	all := make([]int, len(s.Axes))
	for i := range all {
		all[i] = i
	}
	if full := Contract(c, y, all, all); full.Total != (Charge{}) || dense.Abs(full.Data[0]-dot) > 1e-12*(1+x.Norm()*y.Norm()) {
		t.Fatalf("conj(x) y = %v, want %v", full.Data, dot)
	}
}

func TestFromDenseForbidden(t *testing.T) {
	a := NewAxis(In, Sector{Charge{0}, 1}, Sector{Charge{1}, 1})
	s := NewStructure(mustGroup(t, 0), []Axis{a, a.Reversed()}, Charge{})
	x, err := FromDense(s, []float64{1, 1e-14, 0, 2}, 1e-12)
	require.NoError(t, err)
	assert.Equal(t, []float64{1, 0, 0, 2}, x.Dense())
	_, err = FromDense(s, []float64{1, 0, -0.5, 2}, 1e-12)
	var forbidden *ForbiddenError
	require.True(t, errors.As(err, &forbidden))
	assert.Equal(t, []int{1, 0}, forbidden.Index)
	assert.EqualError(t, err, "element [1 0] is (-0.5+0i) but the charge rule allows only zero there")
	_, err = FromDense(s, []float64{1, math.NaN(), 0, 2}, 1e-12)
	assert.Error(t, err)
}

func TestIdentityAndScaleBond(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := drawTensor[complex128](t, drawStructure(t, 1, 4))
		axis := rapid.IntRange(0, len(x.Axes)-1).Draw(t, "axis")
		a := x.Axes[axis]
		one := Identity[complex128](x.Group, a)
		same := Contract(x, one, []int{axis}, []int{1})
		order := make([]int, 0, len(x.Axes))
		for k := range x.Axes {
			switch {
			case k < axis:
				order = append(order, k)
			case k == axis:
				order = append(order, len(x.Axes)-1)
			default:
				order = append(order, k-1)
			}
		}
		requireClose(t, denseOf(x), denseOf(Permute(same, order...)), 0, "times the identity")

		values := make([][]float64, len(a.Sectors))
		var flat []float64
		for p, s := range a.Sectors {
			for range s.Dim {
				values[p] = append(values[p], float64(len(flat)+2))
				flat = append(flat, float64(len(flat)+2))
			}
		}
		want := denseOf(x)
		each(want.dims, func(index []int) { *want.at(index) *= complex(flat[index[axis]], 0) })
		ScaleBond(x, axis, values)
		requireClose(t, want, denseOf(x), 1e-15, "scaled")
	})
}

func TestScratch(t *testing.T) {
	for n := 1; n < 5000; n++ {
		class, size := sizeClass(n)
		require.GreaterOrEqual(t, size, n)
		require.LessOrEqual(t, size, max(8, n+n/4+1), "n = %d", n)
		again, _ := sizeClass(size)
		require.Equal(t, class, again, "n = %d", n)
		if next, _ := sizeClass(n + 1); n == size {
			require.Equal(t, class+1, next, "n = %d", n)
		}
	}
	var s Scratch[float64]
	x := s.Take(100)
	x[0] = 42
	s.Give(x)
	y := s.Take(97)
	assert.Len(t, y, 97)
	assert.Equal(t, 42.0, y[0], "the same slab again")
	assert.Len(t, s.Take(97), 97)
	s.Give(make([]float64, 101)) // not a size of ours
	assert.Len(t, s.Take(110), 110)
	assert.Nil(t, s.Take(0))
	var none *Scratch[float64]
	none.Give(none.Take(5))
}
