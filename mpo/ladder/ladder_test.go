package ladder

import (
	"encoding/json"
	"testing"

	"github.com/stretchr/testify/require"
)

func TestSiteOrder(t *testing.T) {
	l := must(t, 3, Open, Leg("a", Boson(2)), Leg("s", Spin(1), OnRange("0..rungs-2")), Leg("u", Boson(2), OnRungs(2, 0)))
	require.Equal(t, 7, l.Sites())
	require.Equal(t, 3, l.Rungs())
	require.Equal(t, []string{"a", "s", "u"}, l.Legs())
	type spot struct {
		leg  string
		rung int
	}
	var got []spot
	for i := range l.Sites() {
		leg, rung, site := l.SiteAt(i)
		got = append(got, spot{leg, rung})
		back, ok := l.SiteIndex(leg, rung)
		require.True(t, ok)
		require.Equal(t, i, back)
		require.Equal(t, site, l.Site(i))
	}
	require.Equal(t, []spot{{"a", 0}, {"s", 0}, {"u", 0}, {"a", 1}, {"s", 1}, {"a", 2}, {"u", 2}}, got)
	for _, s := range []spot{{"s", 2}, {"u", 1}, {"x", 0}, {"a", 3}, {"a", -1}} {
		_, ok := l.SiteIndex(s.leg, s.rung)
		require.False(t, ok)
	}
	a, _ := l.LegSite("a")
	u, _ := l.LegSite("u")
	require.True(t, a == u, "like sites share their operators")
	_, ok := l.LegSite("x")
	require.False(t, ok)
}

func TestScopeSurvivesJSON(t *testing.T) {
	l := must(t, 4, Periodic, Across(Periodic), Leg("f", Fermion()), Leg("e", Electron()), Leg("t", Electron(Double(false))),
		Leg("b", Boson(7), OnRungs(1, 3)), Leg("s", Spin(3)), Leg("q", Clock(5)))
	s, err := NewScope(l, Constants{"J": 1.0 / 3, "U": 1e300}, Profile{Name: "h", Formula: "uniform(-J, J)", Seed: 1 << 63},
		Profile{Name: "list", Values: []float64{1, 2, 3, 0.1}})
	require.NoError(t, err)
	data, err := json.Marshal(s)
	require.NoError(t, err)
	var back Scope
	require.NoError(t, json.Unmarshal(data, &back))
	require.True(t, l.Equal(back.Ladder()))
	require.Equal(t, s.Constants(), back.Constants())
	require.Equal(t, s.Profiles(), back.Profiles())
	term := Term{Formula: "h[f,j]*list[j]*J*n[f,j] + S^z[s,j+1]"}
	require.Equal(t, polynomial(t, s, term).String(), polynomial(t, &back, term).String())
	for name, bad := range map[string]string{
		"not JSON":         "{",
		"no ladder":        "{}",
		"empty ladder":     `{"ladder": {}}`,
		"unknown boundary": `{"ladder": {"rungs": 3, "boundary": "moebius", "across": "open", "legs": []}}`,
		"unknown site":     `{"ladder": {"rungs": 3, "boundary": "open", "across": "open", "legs": [{"name": "a", "site": "anyon"}]}}`,
		"huge":             `{"ladder": {"rungs": 1000000000, "boundary": "open", "across": "open", "legs": [{"name": "a", "site": "fermion"}]}}`,
		"bad size":         `{"ladder": {"rungs": 3, "boundary": "open", "across": "open", "legs": [{"name": "a", "site": "boson", "size": -1}]}}`,
		"bad constant":     `{"ladder": {"rungs": 3, "boundary": "open", "across": "open", "legs": [{"name": "a", "site": "fermion"}]}, "constants": {"a": 1}}`,
	} {
		var s Scope
		require.Error(t, json.Unmarshal([]byte(bad), &s), name)
	}
}

func TestLaddersDiffer(t *testing.T) {
	base := must(t, 3, Open, Leg("a", Boson(2)), Leg("b", Boson(2)))
	require.True(t, base.Equal(must(t, 3, Open, Leg("a", Boson(2)), Leg("b", Boson(2)))))
	for name, other := range map[string]*Ladder{
		"rungs":    must(t, 4, Open, Leg("a", Boson(2)), Leg("b", Boson(2))),
		"boundary": must(t, 3, Periodic, Leg("a", Boson(2)), Leg("b", Boson(2))),
		"across":   must(t, 3, Open, Leg("a", Boson(2)), Leg("b", Boson(2)), Across(Periodic)),
		"max":      must(t, 3, Open, Leg("a", Boson(2)), Leg("b", Boson(3))),
		"ragged":   must(t, 3, Open, Leg("a", Boson(2)), Leg("b", Boson(2), OnRungs(0))),
		"names":    must(t, 3, Open, Leg("a", Boson(2)), Leg("c", Boson(2))),
	} {
		require.False(t, base.Equal(other), name)
	}
}

// FuzzFormula holds that no formula, condition or range makes the evaluation panic.
func FuzzFormula(f *testing.F) {
	for _, seed := range [][3]string{
		{"-J*exp(i*pi/2) b^+[a,j+1] b[a,j] + h.c.", "j % 2 == 0", "1..rungs-1"},
		{"sum(m=0..j-1, n[a,j] n[a,m]/(j-m)) + k*c_up[e,k]^2", "k < j", "legs"},
		{"prod(m=0..2, exp(i*pi*S^z[s,m])) h[k+1,j] + S[s,0].S[e,j]", "", "a"},
		{"(Z[q,j] + X^+[q,j+k])^3 - c[f,j+1]", "not j == k", "j..j+2"},
	} {
		f.Add(seed[0], seed[1], seed[2])
	}
	l := must(f, 3, Periodic, Leg("a", Boson(2)), Leg("e", Electron()), Leg("f", Fermion()), Leg("s", Spin(2), OnRungs(0, 2)), Leg("q", Clock(3)))
	f.Fuzz(func(t *testing.T, src, where, span string) {
		s, err := NewScope(l, Constants{"J": 1}, Profile{Name: "h", Formula: "j+leg"})
		require.NoError(t, err)
		if len(src) > 80 { // long products of sums are slow, not wrong
			return
		}
		p, err := s.Polynomial(Term{Formula: src, Where: where, Each: Each{"k": span}})
		if err == nil {
			require.NotNil(t, p.Adjoint())
			_, _ = p.Odd()
			_ = p.String()
		}
	})
}
