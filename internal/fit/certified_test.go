package fit

import (
	"math"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// Data and certified values of this file: NIST Statistical Reference Datasets
// (StRD), public domain, from memory. That fits reproduce the certified values
// to nine digits and more vouches for the data.

type certified struct {
	params, errors []float64
	scatter        float64 // residual standard deviation
}

func (c certified) hold(t *testing.T, r Report, relative float64) {
	t.Helper()
	require.Len(t, r.Params, len(c.params))
	assert.True(t, r.Converged)
	for k := range c.params {
		assert.InEpsilon(t, c.params[k], r.Params[k], relative, "parameter %d", k)
		assert.InEpsilon(t, c.errors[k], r.Error(k), 100*relative, "error of parameter %d", k)
	}
	assert.InEpsilon(t, c.scatter, r.Scatter(), 100*relative)
}

func TestNorris(t *testing.T) {
	y := []float64{0.1, 338.8, 118.1, 888.0, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, 0.3, 0.1, 778.1, 668.8, 339.3, 448.9, 10.8,
		557.7, 228.3, 998.0, 888.8, 119.6, 0.3, 0.6, 557.6, 339.3, 888.0, 998.5, 778.9, 10.2, 117.6, 228.9, 668.4, 449.2, 0.2}
	x := []float64{0.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777.0, 558.2, 0.4, 0.6, 775.5, 666.9, 338.0, 447.5, 11.6,
		556.0, 228.1, 995.8, 887.6, 120.2, 0.3, 0.3, 556.8, 339.1, 887.2, 999.0, 779.0, 11.1, 118.3, 229.2, 669.1, 448.9, 0.5}
	r, err := Polynomial(x, y, nil, 1)
	require.NoError(t, err)
	certified{
		[]float64{-0.262323073774029, 1.00211681802045},
		[]float64{0.232818234301152, 0.429796848199937e-03},
		0.884796396144373,
	}.hold(t, r, 1e-12)
}

func TestLongley(t *testing.T) {
	rows := [][]float64{
		{60323, 83.0, 234289, 2356, 1590, 107608, 1947}, {61122, 88.5, 259426, 2325, 1456, 108632, 1948},
		{60171, 88.2, 258054, 3682, 1616, 109773, 1949}, {61187, 89.5, 284599, 3351, 1650, 110929, 1950},
		{63221, 96.2, 328975, 2099, 3099, 112075, 1951}, {63639, 98.1, 346999, 1932, 3594, 113270, 1952},
		{64989, 99.0, 365385, 1870, 3547, 115094, 1953}, {63761, 100.0, 363112, 3578, 3350, 116219, 1954},
		{66019, 101.2, 397469, 2904, 3048, 117388, 1955}, {67857, 104.6, 419180, 2822, 2857, 118734, 1956},
		{68169, 108.4, 442769, 2936, 2798, 120445, 1957}, {66513, 110.8, 444546, 4681, 2637, 121950, 1958},
		{68655, 112.6, 482704, 3813, 2552, 123366, 1959}, {69564, 114.2, 502601, 3931, 2514, 125368, 1960},
		{69331, 115.7, 518173, 4806, 2572, 127852, 1961}, {70551, 116.9, 554894, 4007, 2827, 130081, 1962},
	}
	var y []float64
	var design [][]float64
	for _, row := range rows {
		y = append(y, row[0])
		design = append(design, append([]float64{1}, row[1:]...))
	}
	r, err := Linear(design, y, nil)
	require.NoError(t, err)
	certified{
		[]float64{-3482258.63459582, 15.0618722713733, -0.358191792925910e-01, -2.02022980381683,
			-1.03322686717359, -0.511041056535807e-01, 1829.15146461355},
		[]float64{890420.383607373, 84.9149257747669, 0.334910077722432e-01, 0.488399681651699,
			0.214274163161675, 0.226073200069370, 455.478499142212},
		304.854073561965,
	}.hold(t, r, 1e-8)
}

// TestWampler is an exact polynomial of degree five: y = 1 + x + .. + x^5.
func TestWampler(t *testing.T) {
	var x, y []float64
	for i := range 21 {
		v := float64(i)
		x, y = append(x, v), append(y, 1+v*(1+v*(1+v*(1+v*(1+v)))))
	}
	r, err := Polynomial(x, y, nil, 5)
	require.NoError(t, err)
	for _, p := range r.Params {
		assert.InDelta(t, 1, p, 1e-8)
	}
}

func TestMisra1a(t *testing.T) {
	y := []float64{10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78}
	x := []float64{77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0}
	model := func(i int, p []float64) float64 { return p[0] * (1 - math.Exp(-p[1]*x[i])) }
	for _, start := range [][]float64{{500, 1e-4}, {250, 5e-4}} {
		r, err := Nonlinear(model, y, nil, start, NonlinearOptions{})
		require.NoError(t, err)
		certified{
			[]float64{2.3894212918e+02, 5.5015643181e-04},
			[]float64{2.7070075241, 7.2668688436e-06},
			math.Sqrt(1.2455138894e-01 / 12),
		}.hold(t, r, 1e-9)
	}
}

func TestRat43(t *testing.T) {
	y := []float64{16.08, 33.83, 65.80, 97.20, 191.55, 326.20, 386.87, 520.53, 590.03, 651.92, 724.93, 699.56, 689.96, 637.56, 717.41}
	model := func(i int, p []float64) float64 {
		return p[0] / math.Pow(1+math.Exp(p[1]-p[2]*float64(i+1)), 1/p[3])
	}
	for _, start := range [][]float64{{100, 10, 1, 1}, {700, 5, 0.75, 1.3}} {
		r, err := Nonlinear(model, y, nil, start, NonlinearOptions{})
		require.NoError(t, err)
		certified{
			[]float64{6.9964151270e+02, 5.2771253025, 7.5962938329e-01, 1.2792483859},
			[]float64{1.6302297817e+01, 2.0828735829, 1.9566123451e-01, 6.8761936385e-01},
			math.Sqrt(8.7864049080e+03 / 11),
		}.hold(t, r, 1e-7)
	}
}
