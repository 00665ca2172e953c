package observables_test

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// formula is an operator written for both sides.
type formula struct {
	text  string
	terms []exact.Term
}

func op(text string, terms ...exact.Term) formula { return formula{text, terms} }

// signs is the product of exp(i pi n) over fermion sites, times other operators: each factor is 1 - 2n.
func signs(coef complex128, sites []int, rest ...any) (all []exact.Term) {
	for set := range 1 << len(sites) {
		c, args := coef, append([]any(nil), rest...)
		for k, site := range sites {
			if set>>k&1 == 1 {
				c *= -2
				args = append(args, "n", site)
			}
		}
		all = append(all, exact.T(c, args...))
	}
	return all
}

// TestFormulas compares expectation values with full vectors: fermion signs, long strings, complex operators in real gauges, constants, operators that
// change the charge.
func TestFormulas(t *testing.T) {
	for _, row := range []struct {
		world world
		list  []formula
	}{
		{fermions, []formula{ // sites: 2 rung + leg
			op("n[b,1]", exact.T(1, "n", 3)),
			op("c^+[a,0] c[b,2]", exact.T(1, "c^+", 0, "c", 5)),
			op("c^+[b,2] c[a,0]", exact.T(1, "c^+", 5, "c", 0)),
			op("c[b,2] c^+[a,0]", exact.T(1, "c", 5, "c^+", 0)),
			op("c^+[a,0] c^+[b,1] c[a,2] c[b,0]", exact.T(1, "c^+", 0, "c^+", 3, "c", 4, "c", 1)),
			op("c[b,0] c^+[a,1] c^+[b,1] c[a,0]", exact.T(1, "c", 1, "c^+", 2, "c^+", 3, "c", 0)),
			op("i*(c^+[a,0] c[b,1] - h.c.)", exact.T(1i, "c^+", 0, "c", 3), exact.T(-1i, "c^+", 3, "c", 0)),
			op("(1+2*i) n[a,1] + 0.5 - i", exact.T(1+2i, "n", 2), exact.T(0.5-1i)),
			op("exp(i*pi*n[a,0]) exp(i*pi*n[b,0]) exp(i*pi*n[a,1])", signs(1, []int{0, 1, 2})...),
			op("prod(k=0..2, exp(i*pi*n[a,k]))", signs(1, []int{0, 2, 4})...),
			op("c^+[a,0] exp(i*pi*n[b,0]) exp(i*pi*n[a,1]) c[b,1]", signs(1, []int{1, 2}, "c^+", 0, "c", 3)...),
			op("n[a,0] exp(i*g*pi*n[b,1]) n[a,2]", exact.T(1, "n", 0, "n", 4), exact.T(cmplx.Exp(0.25i*math.Pi)-1, "n", 0, "n", 3, "n", 4)),
			op("3", exact.T(3)),
			op("c[a,0]"), op("c^+[a,1] c^+[b,1]"), op("c^+[a,1] n[b,1]"), op("n[a,0] - n[a,0]"),
			op("c^+[a,1] c^+[b,1] + n[a,0]", exact.T(1, "n", 0)),
		}},
		{flux, []formula{
			op("b^+[a,0] b[b,2]", exact.T(1, "b^+", 0, "b", 5)),
			op("b[b,2] b^+[a,0]", exact.T(1, "b^+", 0, "b", 5)),
			op("b[a,1] b^+[a,1]", exact.T(1, "n", 2), exact.T(1)),
			op("b^+[a,0]^2 b[b,1]^2", exact.T(1, "b^+", 0, "b^+", 0, "b", 3, "b", 3)),
			op("i*(exp(0.3*i) b^+[a,1] b[a,0] - h.c.)", exact.T(1i*cmplx.Exp(0.3i), "b^+", 2, "b", 0), exact.T(-1i*cmplx.Exp(-0.3i), "b^+", 0, "b", 2)),
			op("n[a,0] n[b,0] n[a,2]", exact.T(1, "n", 0, "n", 1, "n", 4)),
			op("b[a,0] b[b,0]"), op("b^+[a,2]"),
		}},
		{paired, []formula{
			op("c[a,0] c[a,3]", exact.T(1, "c", 0, "c", 3)),
			op("c^+[a,4] c^+[a,1]", exact.T(1, "c^+", 4, "c^+", 1)),
			op("c^+[a,0] c[a,4]", exact.T(1, "c^+", 0, "c", 4)),
			op("(c^+[a,0] - c[a,0])*(c^+[a,4] + c[a,4])", exact.T(1, "c^+", 0, "c^+", 4), exact.T(1, "c^+", 0, "c", 4), exact.T(-1, "c", 0, "c^+", 4), exact.T(-1, "c", 0, "c", 4)),
			op("prod(k=0..4, exp(i*pi*n[a,k]))", signs(1, []int{0, 1, 2, 3, 4})...),
			op("c[a,2]"),
		}},
		{turned, []formula{
			op("S^x[a,2]", exact.T(1, "S^x", 2)),
			op("S^z[a,2]", exact.T(1, "S^z", 2)),
			op("S^y[a,0] S^y[a,5]", exact.T(1, "S^y", 0, "S^y", 5)),
			op("S^z[a,0] S^y[a,3]", exact.T(1, "S^z", 0, "S^y", 3)),
			op("S^+[a,1] S^-[a,4]", exact.T(1, "S^+", 1, "S^-", 4)),
			op("S^+[a,1] S^+[a,4]", exact.T(1, "S^+", 1, "S^+", 4)),
			op("S^z[a,0] S^x[a,1] S^x[a,2] S^z[a,3]", exact.T(1, "S^z", 0, "S^x", 1, "S^x", 2, "S^z", 3)),
			op("S[a,1].S[a,4]", exact.T(1, "S^z", 1, "S^z", 4), exact.T(0.5, "S^+", 1, "S^-", 4), exact.T(0.5, "S^-", 1, "S^+", 4)),
		}},
		{spinsOne, []formula{
			op("S^z[a,1]^2", exact.T(1, "S^z", 1, "S^z", 1)),
			op("S^x[a,0] S^x[a,3]", exact.T(1, "S^x", 0, "S^x", 3)),
			op("S^x[a,0] S^y[a,3]", exact.T(1, "S^x", 0, "S^y", 3)),
			op("S^+[a,0]^2 S^-[a,4]^2", exact.T(1, "S^+", 0, "S^+", 0, "S^-", 4, "S^-", 4)),
			// The string order of spin-one chains (den Nijs, Rommelse 1989): exp(i pi S^z) = 1 - 2 (S^z)^2.
			op("S^z[a,0] prod(k=1..3, exp(i*pi*S^z[a,k])) S^z[a,4]", stringOrder()...),
			op("S^+[a,0]"),
		}},
		{electrons, []formula{
			op("c_up^+[a,0] c_up[a,3]", exact.T(1, "c_up^+", 0, "c_up", 3)),
			op("c_down[a,3] c_down^+[a,1]", exact.T(1, "c_down", 3, "c_down^+", 1)),
			op("c_up^+[a,0] c_down^+[a,0] c_down[a,2] c_up[a,2]", exact.T(1, "c_up^+", 0, "c_down^+", 0, "c_down", 2, "c_up", 2)),
			op("S^+[a,0] S^-[a,3]", exact.T(1, "S^+", 0, "S^-", 3)),
			op("n_up[a,1] n_down[a,2]", exact.T(1, "n_up", 1, "n_down", 2)),
			op("c_up^+[a,0] c_down[a,1]"), op("c_up^+[a,2] c_up[a,0] n[a,1]", exact.T(1, "c_up^+", 2, "c_up", 0, "n", 1)),
		}},
		{clocks, []formula{
			op("Z[a,1]", exact.T(1, "Z", 1)),
			op("X^+[a,0] X[a,4]", exact.T(1, "X^+", 0, "X", 4)),
			op("X[a,0] X[a,2] X[a,3]", exact.T(1, "X", 0, "X", 2, "X", 3)),
			op("X^+[a,0] Z[a,1] Z[a,2] X[a,3]", exact.T(1, "X^+", 0, "Z", 1, "Z", 2, "X", 3)),
			op("X[a,0]"),
		}},
		{mixed, []formula{
			op("c^+[a,0] c[a,2]", exact.T(1, "c^+", 0, "c", 4)),
			op("c^+[a,2] n[b,1] c[a,0]", exact.T(1, "c^+", 4, "n", 3, "c", 0)),
			op("b^+[b,0] c^+[a,0] c[a,1] b[b,2]", exact.T(1, "b^+", 1, "c^+", 0, "c", 2, "b", 5)),
			op("c^+[a,0] b[b,0]"),
		}},
	} {
		t.Run(row.world.name, func(t *testing.T) {
			s := row.world.sample(t, 3)
			for _, f := range row.list {
				got, err := observables.Observe(context.Background(), s.state, ladder.Term{Formula: f.text})
				require.NoError(t, err, f.text)
				require.Len(t, got.Values, 1)
				require.Empty(t, got.At[0])
				value := complex(got.Values[0], 0)
				if got.Imag != nil {
					value = complex(got.Values[0], got.Imag[0])
				}
				require.InDelta(t, 0, cmplx.Abs(value-s.expect(f.terms...)), 1e-13, "%s: %v, full vector %v", f.text, value, s.expect(f.terms...))
			}
		})
	}
}

func stringOrder() (all []exact.Term) {
	for set := range 8 {
		c, args := complex128(1), []any{"S^z", 0}
		for k := range 3 {
			if set>>k&1 == 1 {
				c *= -2
				args = append(args, "S^z", k+1, "S^z", k+1)
			}
		}
		all = append(all, exact.T(c, append(args, "S^z", 4)...))
	}
	return all
}

// TestExpectations enters many polynomials at once, repeated, empty and constant ones among them.
func TestExpectations(t *testing.T) {
	s := fermions.sample(t, 5)
	scope := s.state.Scope()
	var polys []*ladder.Polynomial
	var want []complex128
	add := func(text string, terms ...exact.Term) {
		p, err := scope.Polynomial(ladder.Term{Formula: text})
		require.NoError(t, err)
		polys, want = append(polys, p), append(want, s.expect(terms...))
	}
	add("n[a,1]", exact.T(1, "n", 2))
	add("2", exact.T(2))
	add("c^+[a,0] c[b,2]", exact.T(1, "c^+", 0, "c", 5))
	add("c[a,0]")
	add("n[a,1]", exact.T(1, "n", 2))
	add("sum(k=0..2, n[a,k]) - i*n[b,0] n[b,2]", exact.T(1, "n", 0), exact.T(1, "n", 2), exact.T(1, "n", 4), exact.T(-1i, "n", 1, "n", 5))
	polys, want = append(polys, ladder.Zero(s.lad)), append(want, 0)
	got, err := observables.Expectations(context.Background(), s.state, polys)
	require.NoError(t, err)
	require.Len(t, got, len(want))
	for i := range want {
		require.InDelta(t, 0, cmplx.Abs(got[i]-want[i]), 1e-13, "polynomial %d", i)
	}
	none, err := observables.Expectations(context.Background(), s.state, nil)
	require.NoError(t, err)
	require.Empty(t, none)
}

// TestAnyGauge: norm, scale and orthogonality centre of a state must not matter, and the state must not change.
func TestAnyGauge(t *testing.T) {
	for _, w := range []world{fermions, flux} {
		s := w.sample(t, 7)
		term := ladder.Term{Formula: "n[l,j]", Each: ladder.Each{"l": "legs"}}
		want, err := observables.Observe(context.Background(), s.state, term)
		require.NoError(t, err)
		change(s.state, func(scale func(float64), move func(int)) {
			for _, where := range []int{3, 5, -1} {
				scale(1e-30)
				move(where)
				before := userVector(t, s.state)
				got, err := observables.Observe(context.Background(), s.state, term)
				require.NoError(t, err)
				require.InDeltaSlice(t, want.Values, got.Values, 1e-12)
				require.Equal(t, before, userVector(t, s.state))
			}
		})
	}
}

// change lends the chain of a state.
func change(s *mps.State, f func(scale func(float64), move func(int))) {
	if c, ok := s.Real(); ok {
		f(func(x float64) { c.Scale(x) }, func(i int) {
			if c.Canonicalize(max(i, 0), nil); i < 0 {
				c.Center = -1
			}
		})
		return
	}
	c, _ := s.Complex()
	f(func(x float64) { c.Scale(complex(x, 0)) }, func(i int) {
		if c.Canonicalize(max(i, 0), nil); i < 0 {
			c.Center = -1
		}
	})
}

func TestNothingToMeasure(t *testing.T) {
	s := fermions.sample(t, 9)
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	_, err := observables.Everywhere(ctx, s.state, "n[a,j]", nil)
	require.ErrorIs(t, err, context.Canceled)
	_, err = observables.AllPairs(ctx, s.state, ladder.Term{Formula: "n[a,j]"}, ladder.Term{Formula: "n[a,j]"})
	require.ErrorIs(t, err, context.Canceled)
	_, err = observables.Occupations(ctx, s.state)
	require.ErrorIs(t, err, context.Canceled)

	var bad *ladder.Error
	_, err = observables.Everywhere(context.Background(), s.state, "q[a,j]", nil)
	require.True(t, errors.As(err, &bad), "%v", err)
	_, err = observables.AllPairs(context.Background(), s.state, ladder.Term{Formula: "n[a,j]"}, ladder.Term{Formula: "n[z,j]"})
	require.ErrorContains(t, err, "second operator")
	_, err = observables.AllPairs(context.Background(), s.state, ladder.Term{Formula: "n[a,j"}, ladder.Term{Formula: "n[a,j]"})
	require.ErrorContains(t, err, "first operator")

	c, _ := s.state.Real()
	c.Scale(0)
	_, err = observables.Everywhere(context.Background(), s.state, "n[a,j]", nil)
	require.ErrorContains(t, err, "zero")
	_, err = observables.Occupations(context.Background(), s.state)
	require.ErrorContains(t, err, "zero")
}

// TestStopsSoon cancels a pass with much to do.
func TestStopsSoon(t *testing.T) {
	s := randomState(t, 60, 80)
	ctx, cancel := context.WithTimeout(context.Background(), 20*time.Millisecond)
	defer cancel()
	begin := time.Now()
	_, err := observables.AllPairs(ctx, s, ladder.Term{Formula: "c^+[a,j]"}, ladder.Term{Formula: "c[a,j]"})
	require.ErrorIs(t, err, context.DeadlineExceeded)
	require.Less(t, time.Since(begin), time.Second)
}
