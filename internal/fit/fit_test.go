package fit

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// TestWeightedMean is the linear fit of a constant, known in closed form.
func TestWeightedMean(t *testing.T) {
	y, sigma := []float64{1, 2, 4}, []float64{1, 0.5, 2}
	r, err := Polynomial([]float64{7, 7, 7}, y, sigma, 0)
	require.NoError(t, err)
	const sum = 1 + 4 + 0.25
	mean := (1 + 2*4 + 4*0.25) / sum
	assert.InDelta(t, mean, r.Params[0], 1e-15)
	assert.InDelta(t, 1/math.Sqrt(sum), r.Error(0), 1e-15)
	chi2 := math.Pow(1-mean, 2) + math.Pow((2-mean)*2, 2) + math.Pow((4-mean)/2, 2)
	assert.InDelta(t, chi2, r.ChiSquared, 1e-14)
	assert.Equal(t, 2, r.Freedom)
	assert.InDelta(t, math.Exp(-chi2/2), r.Goodness(), 1e-14) // two degrees of freedom
	assert.InDelta(t, math.Sqrt(chi2/2), r.Scatter(), 1e-14)
}

// TestResidualsAreOrthogonal holds the normal equations on random data.
func TestResidualsAreOrthogonal(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 4).Draw(t, "params")
		points := n + rapid.IntRange(0, 6).Draw(t, "extra")
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		design, y, sigma := make([][]float64, points), make([]float64, points), make([]float64, points)
		for i := range design {
			design[i] = make([]float64, n)
			for k := range design[i] {
				design[i][k] = rng.NormFloat64() * math.Pow(10, float64(3*k))
			}
			y[i], sigma[i] = rng.NormFloat64(), 0.5+rng.Float64()
		}
		r, err := Linear(design, y, sigma)
		require.NoError(t, err)
		for k := range n {
			var sum, size float64
			for i, row := range design {
				d := y[i]
				for l, v := range row {
					d -= v * r.Params[l]
				}
				sum += row[k] * d / (sigma[i] * sigma[i])
				size += math.Abs(row[k] / (sigma[i] * sigma[i]))
			}
			assert.InDelta(t, 0, sum/size, 1e-9)
		}
		for k := range n {
			for l := range n { // the covariance inverts the normal matrix
				var v float64
				for m := range n {
					var normal float64
					for i := range design {
						normal += design[i][m] * design[i][l] / (sigma[i] * sigma[i])
					}
					v += r.Covariance[k*n+m] * normal
				}
				want := 0.0
				if k == l {
					want = 1
				}
				assert.InDelta(t, want, v*math.Pow(10, float64(3*(k-l))), 1e-6)
			}
		}
	})
}

// TestCoverage draws data about a known line: two thirds of the true slopes
// lie within one standard error, given or estimated.
func TestCoverage(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 4))
	const trials = 2000
	var given, estimated int
	for range trials {
		x, y, sigma := make([]float64, 24), make([]float64, 24), make([]float64, 24)
		for i := range x {
			x[i], sigma[i] = float64(i), 0.3
			y[i] = 2 - 0.7*x[i] + sigma[i]*rng.NormFloat64()
		}
		a, err := Polynomial(x, y, sigma, 1)
		require.NoError(t, err)
		b, err := Polynomial(x, y, nil, 1)
		require.NoError(t, err)
		if math.Abs(a.Params[1]+0.7) < a.Error(1) {
			given++
		}
		if math.Abs(b.Params[1]+0.7) < b.Error(1) {
			estimated++
		}
	}
	assert.InDelta(t, 0.683, float64(given)/trials, 0.03)
	assert.InDelta(t, 0.67, float64(estimated)/trials, 0.03) // Student's t
}

func TestUnknownErrors(t *testing.T) {
	r, err := Polynomial([]float64{1, 2}, []float64{3, 5}, nil, 1)
	require.NoError(t, err)
	assert.InDeltaSlice(t, []float64{1, 2}, r.Params, 1e-14)
	assert.True(t, math.IsNaN(r.Error(0)), "two points tell nothing about the error of a line")
	assert.True(t, math.IsNaN(r.Goodness()))
	assert.True(t, math.IsNaN(r.Scatter()))
}

func TestLinearErrors(t *testing.T) {
	nan, one := math.NaN(), []float64{1}
	for _, row := range []struct {
		name        string
		design      [][]float64
		y, sigma    []float64
		wantMessage string
	}{
		{"no data", nil, nil, nil, "0 points cannot fix 0 parameters"},
		{"rows", [][]float64{one}, []float64{1, 2}, nil, "1 rows of the design matrix for 2 values"},
		{"few points", [][]float64{{1, 2}}, one, nil, "1 points cannot fix 2 parameters"},
		{"ragged", [][]float64{{1, 2}, {1}}, []float64{1, 2}, nil, "row 1 of the design matrix has 1 columns"},
		{"NaN value", [][]float64{one, one}, []float64{1, nan}, nil, "value 1 is NaN"},
		{"infinite column", [][]float64{one, {math.Inf(1)}}, []float64{1, 1}, nil, "element (1, 0) of the design matrix is +Inf"},
		{"zero error", [][]float64{one, one}, []float64{1, 1}, []float64{1, 0}, "error 1 is 0"},
		{"errors", [][]float64{one, one}, []float64{1, 1}, one, "1 errors for 2 values"},
		{"absent parameter", [][]float64{{1, 0}, {2, 0}}, []float64{1, 1}, nil, "parameter 1 does not enter"},
		{"same column twice", [][]float64{{1, 2}, {2, 4}, {3, 6}}, []float64{1, 2, 3}, nil, "do not tell parameter 1"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := Linear(row.design, row.y, row.sigma)
			assert.ErrorContains(t, err, row.wantMessage)
		})
	}
	_, err := Polynomial(one, []float64{1, 2}, nil, 0)
	assert.ErrorContains(t, err, "1 places for 2 values")
	_, err = Polynomial(one, one, nil, -1)
	assert.ErrorContains(t, err, "negative")
	_, err = Polynomial(one, one, nil, 1)
	assert.ErrorContains(t, err, "1 points cannot fix 2")
}

func TestToZero(t *testing.T) {
	line := func(x float64) float64 { return -3 + 2*x }
	x := []float64{1e-5, 1e-7, 1e-6} // any order
	y := []float64{line(1e-5), line(1e-7), line(1e-6)}
	e, err := ToZero(x, y)
	require.NoError(t, err)
	assert.InDelta(t, -3, e.Value, 1e-12)
	assert.InDelta(t, 2, e.Slope, 1e-8)
	assert.InDelta(t, 0.2*2e-7, e.Error, 1e-10)
	two, err := ToZero(x[:2], y[:2])
	require.NoError(t, err)
	assert.InDelta(t, -3, two.Value, 1e-12)
	// A law that bends: the truth lies within the error.
	for _, power := range []float64{0.5, 0.7, 0.9, 1.2, 1.5, 2} {
		for i, v := range x {
			y[i] = -3 + 2*math.Pow(v, power)
		}
		e, err := ToZero(x, y)
		require.NoError(t, err)
		assert.Less(t, math.Abs(e.Value+3), e.Error*(1+1e-9), "power %g", power)
	}
	for _, row := range []struct {
		x, y []float64
		want string
	}{
		{[]float64{1}, []float64{1}, "1 points"},
		{[]float64{1, 0}, []float64{1, 2}, "place 1 is 0"},
		{[]float64{1, 1}, []float64{1, 2}, "do not tell parameter 1"},
		{[]float64{1, 2}, []float64{1}, "2 places for 1 values"},
		{[]float64{1, 2}, []float64{1, math.Inf(1)}, "value 1 is +Inf"},
	} {
		_, err := ToZero(row.x, row.y)
		assert.ErrorContains(t, err, row.want)
	}
}

// TestNonlinearLinear: on a linear model both fits agree, weights included.
func TestNonlinearLinear(t *testing.T) {
	x, y := []float64{0, 1, 2, 3, 5}, []float64{1, 2.2, 2.7, 4.4, 5.9}
	sigma := []float64{0.1, 0.2, 0.1, 0.3, 0.2}
	want, err := Polynomial(x, y, sigma, 1)
	require.NoError(t, err)
	got, err := Nonlinear(func(i int, p []float64) float64 { return p[0] + p[1]*x[i] }, y, sigma, []float64{100, 0}, NonlinearOptions{})
	require.NoError(t, err)
	assert.True(t, got.Converged)
	assert.InDeltaSlice(t, want.Params, got.Params, 1e-9)
	assert.InDeltaSlice(t, want.Covariance, got.Covariance, 1e-8)
	assert.InDelta(t, want.ChiSquared, got.ChiSquared, 1e-9)
	assert.InDelta(t, want.Goodness(), got.Goodness(), 1e-9)
}

func TestNonlinearEdges(t *testing.T) {
	y := []float64{1, 2, 3}
	root := func(i int, p []float64) float64 { return math.Sqrt(p[0]) * float64(i+1) }
	r, err := Nonlinear(root, y, nil, []float64{9}, NonlinearOptions{}) // steps that overshoot give NaN
	require.NoError(t, err)
	assert.InDelta(t, 1, r.Params[0], 1e-9)
	r, err = Nonlinear(root, y, nil, []float64{900}, NonlinearOptions{Iterations: 1})
	require.NoError(t, err)
	assert.False(t, r.Converged)
	assert.Equal(t, 1, r.Iterations)
	_, err = Nonlinear(root, y, nil, []float64{-1}, NonlinearOptions{})
	assert.ErrorContains(t, err, "not finite at the start")
	_, err = Nonlinear(root, y, nil, nil, NonlinearOptions{})
	assert.ErrorContains(t, err, "3 points cannot fix 0 parameters")
	_, err = Nonlinear(func(i int, p []float64) float64 { return p[0] }, y, nil, []float64{1, 1}, NonlinearOptions{})
	assert.ErrorContains(t, err, "parameter 1 does not enter")
	_, err = Nonlinear(root, []float64{math.NaN()}, nil, []float64{1}, NonlinearOptions{})
	assert.ErrorContains(t, err, "value 0 is NaN")
}

func TestBootstrap(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 7))
	y := make([]float64, 400)
	for i := range y {
		y[i] = 5 + 2*rng.NormFloat64()
	}
	mean := func(drawn []int) ([]float64, error) {
		var m float64
		for _, i := range drawn {
			m += y[i] / float64(len(drawn))
		}
		return []float64{m}, nil
	}
	s, err := Bootstrap(len(y), 2000, 1, mean)
	require.NoError(t, err)
	assert.InDelta(t, 5, s.Mean[0], 0.3)
	assert.InDelta(t, 2/math.Sqrt(400), s.Error[0], 0.01)
	assert.InDelta(t, 2*s.Error[0], s.High[0]-s.Low[0], 0.02)
	again, err := Bootstrap(len(y), 2000, 1, mean)
	require.NoError(t, err)
	assert.Equal(t, s, again)
	other, err := Bootstrap(len(y), 2000, 2, mean)
	require.NoError(t, err)
	assert.NotEqual(t, s, other)
}

// TestPerturb agrees with the error of the linear fit it repeats.
func TestPerturb(t *testing.T) {
	x, y := []float64{1, 2, 3, 4, 6}, []float64{1, 4, 9, 16, 36}
	sigma := []float64{0.1, 0.1, 0.2, 0.2, 0.4}
	want, err := Polynomial(x, y, sigma, 2)
	require.NoError(t, err)
	s, err := Perturb(y, sigma, 4000, 3, func(y []float64) ([]float64, error) {
		r, err := Polynomial(x, y, sigma, 2)
		return r.Params, err
	})
	require.NoError(t, err)
	for k := range want.Params {
		assert.InEpsilon(t, want.Error(k), s.Error[k], 0.05)
		assert.InDelta(t, want.Params[k], s.Mean[k], 5*want.Error(k)/math.Sqrt(4000))
	}
}

func TestSpreadErrors(t *testing.T) {
	good := func([]int) ([]float64, error) { return []float64{1}, nil }
	count := 0
	_, err := Bootstrap(1, 10, 0, good)
	assert.ErrorContains(t, err, "1 points")
	_, err = Bootstrap(5, 1, 0, good)
	assert.ErrorContains(t, err, "1 resamples")
	_, err = Bootstrap(5, 10, 0, func([]int) ([]float64, error) {
		if count++; count > 5 {
			return nil, errors.New("no way")
		}
		return []float64{1}, nil
	})
	assert.ErrorContains(t, err, "5 of 10 resamples failed")
	assert.ErrorContains(t, err, "no way")
	count = 0
	s, err := Bootstrap(5, 20, 0, func([]int) ([]float64, error) {
		if count++; count == 3 {
			return []float64{math.NaN()}, nil
		}
		return []float64{float64(count)}, nil
	})
	require.NoError(t, err)
	assert.Equal(t, 1, s.Failed)
	count = 0
	_, err = Bootstrap(5, 10, 0, func([]int) ([]float64, error) { count++; return make([]float64, count), nil })
	assert.ErrorContains(t, err, "an estimate of 2 numbers after one of 1")
	_, err = Perturb([]float64{1}, nil, 10, 0, nil)
	assert.ErrorContains(t, err, "needs their errors")
	_, err = Perturb([]float64{1}, []float64{-1}, 10, 0, nil)
	assert.ErrorContains(t, err, "must be positive")
}
