package ladder

import (
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

var update = flag.Bool("update", false, "write the golden files anew")

// TestErrorMessages prints each mistake with its error and caret and compares with testdata/errors.txt.
func TestErrorMessages(t *testing.T) {
	l := must(t, 4, Open, Leg("a", Boson(3)), Leg("b", Boson(3)), Leg("s", Spin(1), OnRungs(0, 1)), Leg("e", Electron()))
	s, err := NewScope(l, Constants{"J": 1, "U": 4}, Profile{Name: "trap", Formula: "j^2"}, Profile{Name: "tilt", Formula: "j*leg"})
	require.NoError(t, err)
	mistakes := []Term{
		{Formula: "J d[a,j]"},
		{Formula: "J b[l,j]", Each: Each{"l": "legs"}},
		{Formula: "J n[c,j]"},
		{Formula: "J n[j,a]"},
		{Formula: "J n[a,b]"},
		{Formula: "n[l,l]", Each: Each{"l": "legs"}},
		{Formula: "n[3,j]"},
		{Formula: "n[a,k]", Each: Each{"k": []int{1, 7}}},
		{Formula: "n[a,4]"},
		{Formula: "n[a,-1]"},
		{Formula: "n[a,j/2]"},
		{Formula: "sum(k=0..rungs-1, b^+[a,k+1] b[a,k])"},
		{Formula: "sum(k=0..rungs-1, S^z[s,k])"},
		{Formula: "S^z[s,3]"},
		{Formula: "n[e+1,j]"},
		{Formula: "K n[a,j]"},
		{Formula: "a n[a,j]"},
		{Formula: "trap n[a,j]"},
		{Formula: "tilt[j] n[a,j]"},
		{Formula: "trap[a,j,j]"},
		{Formula: "n + 1"},
		{Formula: "U[j] n[a,j]"},
		{Formula: "n[a]"},
		{Formula: "U/2 n[l,j] (n[l,j] - 1", Each: Each{"l": "legs"}},
		{Formula: "n[a,j]/(j-2)"},
		{Formula: "n[a,j]/n[b,j]"},
		{Formula: "n[a,j]^-1"},
		{Formula: "n[a,j]^0.5"},
		{Formula: "b[a,0]^60 b[a,0]^60 b[a,0]^60"},
		{Formula: "2^n[a,j]"},
		{Formula: "sqrt(n[a,j])"},
		{Formula: "exp(b[a,j])"},
		{Formula: "exp(n[a,j] n[b,j])"},
		{Formula: "exp(1000)"},
		{Formula: "exp(300*n[a,j])"},
		{Formula: "1e308*10*n[a,j]"},
		{Formula: "bessel(0.5, 1)"},
		{Formula: "j % 0"},
		{Formula: "b[a,0].b[b,0]"},
		{Formula: "S[s,0].S[a,0]"},
		{Formula: "n[a,j]", Where: "j"},
		{Formula: "n[a,j]", Where: "j < i"},
		{Formula: "n[a,j]", Where: "j < k"},
		{Formula: "n[a,j]", Where: "n[a,j] == 1"},
		{Formula: "n[a,j]", Each: Each{"l": "legs"}},
		{Formula: "n[l,j]", Each: Each{"l": "lags"}},
		{Formula: "n[a,k]", Each: Each{"k": "1..x"}},
		{Formula: "n[a,k]", Each: Each{"k": "1.."}},
		{Formula: "n[a,k] n[a,m]", Each: Each{"k": "m..3", "m": "k..3"}},
		{Formula: "n[a,k]", Each: Each{"k": []any{}}},
		{Formula: "n[a,k]", Each: Each{"k": []any{1, 1}}},
		{Formula: "n[a,k]", Each: Each{"k": []any{1, "a"}}},
		{Formula: "x*n[a,0]", Each: Each{"x": math.NaN()}},
		{Formula: "n[a,k]", Each: Each{"k": true}},
		{Formula: "n[b,0]", Each: Each{"a": "legs"}},
		{Formula: "n[a,0]", Each: Each{"j": "rungs"}},
		{Formula: "n[a,0]", Each: Each{"J": "rungs"}},
		{Formula: "sum(j=0..1, n[a,j])"},
		{Formula: "sum(k=0..1, sum(k=0..1, n[a,k]))"},
		{Formula: "sum(k=1..1000000000, 1)"},
		{Formula: "k m n", Each: Each{"k": "1..100000", "m": "1..100000", "n": "rungs"}},
		{Formula: "k*m", Each: Each{"k": "1..100000", "m": "1..100000"}},
		{Name: "flow", Formula: "b^+[a,j+1] b[a,j]"},
		{Name: "lone", Formula: "c_up[e,0] + h.c."},
		{Name: "void", Formula: "n[a,0] - n[a,0]"},
	}
	var out strings.Builder
	for _, m := range mistakes {
		_, err := s.Hamiltonian(m)
		var e *Error
		require.ErrorAs(t, err, &e, "%+v", m)
		fmt.Fprintf(&out, "%v\n", e)
		if c := e.Caret(); c != "" {
			fmt.Fprintf(&out, "    %s\n", strings.ReplaceAll(c, "\n", "\n    "))
		}
	}
	golden(t, "testdata/errors.txt", out.String())
}

func golden(t *testing.T, path, got string) {
	if *update {
		require.NoError(t, os.WriteFile(path, []byte(got), 0o644))
	}
	want, err := os.ReadFile(path)
	require.NoError(t, err)
	require.Equal(t, string(want), got)
}

func TestScopeErrors(t *testing.T) {
	l := must(t, 3, Open, Leg("a", Boson(3)), Leg("e", Electron()))
	for _, c := range []struct {
		constants Constants
		profiles  []Profile
		want      string
	}{
		{Constants{"J": math.Inf(1)}, nil, `constant "J" is +Inf (expected a finite number)`},
		{Constants{"J": math.NaN()}, nil, `constant "J" is NaN (expected a finite number)`},
		{Constants{"a": 1}, nil, `a constant named "a": that is a leg (choose another name)`},
		{Constants{"pi": 1}, nil, `a constant named "pi": that is a reserved name (choose another name)`},
		{Constants{"c_up": 1}, nil, `a constant named "c_up": that is a reserved name (choose another name)`},
		{Constants{"2x": 1}, nil, `constant name "2x" (a letter, then letters, digits and _)`},
		{Constants{"J": 1}, []Profile{{Name: "J", Formula: "1"}}, `"J": profile: a profile named "J": that is a constant (choose another name)`},
		{nil, []Profile{{Name: "h", Formula: "1"}, {Name: "h", Formula: "1"}}, `"h": profile: a profile named "h": that is a profile (choose another name)`},
		{nil, []Profile{{Name: "h"}}, `"h": profile: an empty profile (give a formula or values)`},
		{nil, []Profile{{Name: "h", Values: []float64{1, 2}}}, `"h": profile: 2 values (one per rung (3) or one per site (6))`},
		{nil, []Profile{{Name: "h", Values: []float64{1, 2, math.NaN()}}}, `"h": profile: value 2 is NaN (profiles are finite numbers)`},
		{nil, []Profile{{Name: "h", Formula: "1/j"}}, `"h": profile: column 2: division by zero (leave that place out with a condition)`},
		{nil, []Profile{{Name: "h", Formula: "i*j"}}, `"h": profile: column 1: the value at rung 1 is 1*i (profiles are real numbers)`},
		{nil, []Profile{{Name: "h", Formula: "n[a,j]"}}, `"h": profile: column 1: "n" with a place in a profile (profiles are formulas of j, leg and numbers)`},
		{nil, []Profile{{Name: "h", Formula: "uniform(1, -1)"}}, `"h": profile: column 9: uniform(1, -1) (write uniform(lowest, highest))`},
		{nil, []Profile{{Name: "h", Formula: "uniform(1)"}}, `"h": profile: column 9: uniform needs two numbers (write uniform(lowest, highest))`},
		{nil, []Profile{{Name: "h", Formula: "normal(0, W)"}}, `"h": profile: column 11: unknown symbol "W" (always: pi, i, rungs)`},
		{nil, []Profile{{Name: "h", Formula: "normal(0, -1)"}}, `"h": profile: column 8: normal(0, -1) (write normal(mean, sigma))`},
	} {
		t.Run(c.want, func(t *testing.T) {
			_, err := NewScope(l, c.constants, c.profiles...)
			require.EqualError(t, err, c.want)
			var e *Error
			require.True(t, errors.As(err, &e))
		})
	}
	s, err := NewScope(l, Constants{"J": 1})
	require.NoError(t, err)
	for src, want := range map[string]string{
		"J*j":    `column 3: no index "j" here (j runs over the rungs in the formulas of terms and profiles)`,
		"i":      `column 1: expected a real number, got 1*i`,
		"n[a,0]": `column 1: an operator where a number is expected`,
		"1/0":    `column 2: division by zero (leave that place out with a condition)`,
		"10^400": `column 3: the result is not a finite number`,
		"Jx":     `column 1: unknown symbol "Jx" (constants: J; always: pi, i, rungs)`,
	} {
		_, err := s.Number(src)
		require.EqualError(t, err, want)
	}
}

func TestLadderErrors(t *testing.T) {
	leg := Leg("a", Fermion())
	for _, c := range []struct {
		rungs int
		parts []Part
		want  string
	}{
		{0, []Part{leg}, "a ladder of 0 rungs (expected 1 to 100000)"},
		{-3, []Part{leg}, "a ladder of -3 rungs (expected 1 to 100000)"},
		{1_000_000_000, []Part{leg}, "a ladder of 1000000000 rungs (expected 1 to 100000)"},
		{60_000, []Part{leg, Leg("b", Fermion())}, "a ladder of 60000 rungs and 2 legs (at most 100000 sites)"},
		{3, nil, "a ladder without legs (give at least one leg)"},
		{3, []Part{leg, leg}, `two legs named "a" (give each leg its own name)`},
		{3, []Part{Leg("", Fermion())}, `leg name "" (a letter, then letters, digits and _)`},
		{3, []Part{Leg("a b", Fermion())}, `leg name "a b" (a letter, then letters, digits and _)`},
		{3, []Part{Leg("j", Fermion())}, `leg name "j" is reserved (choose another)`},
		{3, []Part{Leg("a", Fermion(), OnRungs(0, 3))}, `leg "a": rungs 3 out of range (rungs are 0..2)`},
		{3, []Part{Leg("a", Fermion(), OnRungs(0, 0))}, `leg "a": rung 0 is listed twice`},
		{3, []Part{Leg("a", Fermion(), OnRungs())}, `leg "a" has no rungs (list at least one)`},
		{3, []Part{Leg("a", Fermion(), OnRange("0..rungs"))}, `leg "a": rungs 0..3 out of range (rungs are 0..2)`},
		{3, []Part{Leg("a", Fermion(), OnRange("0..J"))}, `rungs of leg "a": column 4: unknown symbol "J" (always: pi, i, rungs)`},
	} {
		_, err := New(c.rungs, Open, c.parts...)
		require.EqualError(t, err, c.want)
	}
}
