package ladder

import (
	"math"
	"testing"

	"github.com/stretchr/testify/require"
)

func must(t require.TestingT, rungs int, boundary Boundary, parts ...Part) *Ladder {
	l, err := New(rungs, boundary, parts...)
	require.NoError(t, err)
	return l
}

// twoLegs are a ladder of bosons a and b.
func twoLegs(t require.TestingT, rungs int, boundary Boundary, more ...Part) *Ladder {
	return must(t, rungs, boundary, append([]Part{Leg("a", Boson(3)), Leg("b", Boson(3))}, more...)...)
}

func polynomial(t require.TestingT, s *Scope, term Term) *Polynomial {
	p, err := s.Polynomial(term)
	require.NoError(t, err)
	return p
}

// TestPlaces compares terms with the same written out by hand.
func TestPlaces(t *testing.T) {
	bosons := func(rungs int, b Boundary, more ...Part) *Ladder { return twoLegs(t, rungs, b, more...) }
	three := func(b Boundary, across Boundary) *Ladder {
		return must(t, 3, b, Leg("x", Fermion()), Leg("y", Fermion()), Leg("z", Fermion()), Across(across))
	}
	ragged := must(t, 4, Open, Leg("a", Boson(2)), Leg("s", Boson(2), OnRange("0..rungs-2")), Leg("u", Boson(2), OnRungs(1, 3)))
	for _, c := range []struct {
		name   string
		ladder *Ladder
		term   Term
		want   string
	}{
		{"free j, open", bosons(3, Open), Term{Formula: "b^+[a,j+1] b[a,j]"}, "b^+[a,1] b[a,0] + b^+[a,2] b[a,1]"},
		{"free j, ring", bosons(3, Periodic), Term{Formula: "b^+[a,j+1] b[a,j]"}, "b^+[a,1] b[a,0] + b^+[a,2] b[a,1] + b^+[a,0] b[a,2]"},
		{"negative shift on a ring", bosons(3, Periodic), Term{Formula: "n[a,j-2]*j"}, "1*n[a,2] + 2*n[a,0]"},
		{"j in the numbers only", bosons(3, Open), Term{Formula: "j*n[b,1]"}, "3*n[b,1]"},
		{"no j", bosons(3, Open), Term{Formula: "n[a,2]"}, "n[a,2]"},
		{"rungs", bosons(3, Open), Term{Formula: "rungs*n[a,rungs-1]"}, "3*n[a,2]"},
		{"rung by formula", bosons(4, Open), Term{Formula: "n[a,rungs-1-j] * j"}, "n[a,2] + 2*n[a,1] + 3*n[a,0]"},
		{"even places only", bosons(4, Open), Term{Formula: "n[a,j/2]", Where: "j % 2 == 0"}, "n[a,0] + n[a,1]"},
		{"each leg", bosons(2, Open), Term{Formula: "n[l,0]", Each: Each{"l": "legs"}}, "n[a,0] + n[b,0]"},
		{"listed legs", bosons(2, Open), Term{Formula: "n[l,j]", Each: Each{"l": []any{"b"}}}, "n[b,0] + n[b,1]"},
		{"one leg", bosons(2, Open), Term{Formula: "n[l,1]", Each: Each{"l": "a"}}, "n[a,1]"},
		{"each rung", bosons(3, Open), Term{Formula: "k*n[a,k]", Each: Each{"k": "rungs"}}, "n[a,1] + 2*n[a,2]"},
		{"range", bosons(4, Open), Term{Formula: "n[a,j] n[a,j+r]/r", Each: Each{"r": "1..rungs-1"}},
			"n[a,0] n[a,1] + n[a,1] n[a,2] + n[a,2] n[a,3] + n[a,0] n[a,2]/2 + n[a,1] n[a,3]/2 + n[a,0] n[a,3]/3"},
		{"range that depends on j", bosons(3, Open), Term{Formula: "n[a,j] n[b,k]", Each: Each{"k": "j+1..rungs-1"}}, "n[a,0] n[b,1] + n[a,0] n[b,2] + n[a,1] n[b,2]"},
		{"range that depends on an index", bosons(3, Open), Term{Formula: "n[a,m] n[b,k]", Each: Each{"k": "m..2", "m": "1..2"}}, "n[a,1] n[b,1] + n[a,1] n[b,2] + n[a,2] n[b,2]"},
		{"listed numbers", bosons(3, Open), Term{Formula: "x*n[a,k]", Each: Each{"k": []int{0, 2}, "x": []float64{0.5, 2}}}, "2.5*n[a,0] + 2.5*n[a,2]"},
		{"TOML lists", bosons(3, Open), Term{Formula: "x*n[a,k]", Each: Each{"k": []any{int64(0), "rungs-1"}, "x": []any{0.5}}}, "0.5*n[a,0] + 0.5*n[a,2]"},
		{"where on legs", bosons(2, Open), Term{Formula: "b^+[l,j] b[m,j]", Each: Each{"l": "legs", "m": "legs"}, Where: "j % 2 == 0 and l != m"}, "b^+[a,0] b[b,0] + b^+[b,0] b[a,0]"},
		{"where with a leg's name", bosons(2, Open), Term{Formula: "n[l,j]", Each: Each{"l": "legs"}, Where: "not (j == 0 or l == a)"}, "n[b,1]"},
		{"where with order of legs", bosons(1, Open), Term{Formula: "n[l,0] n[m,0]", Each: Each{"l": "legs", "m": "legs"}, Where: "l < m"}, "n[a,0] n[b,0]"},
		{"where that needs j alone", bosons(3, Open), Term{Formula: "n[a,0]", Where: "j >= 1"}, "2*n[a,0]"},
		{"legs as numbers", bosons(2, Open), Term{Formula: "(l+1)*n[l,0]", Each: Each{"l": "legs"}}, "n[a,0] + 2*n[b,0]"},
		{"shift across, open", three(Open, Open), Term{Formula: "n[l+1,0] n[l,0]", Each: Each{"l": "legs"}}, "n[x,0] n[y,0] + n[y,0] n[z,0]"},
		{"shift across, tube", three(Open, Periodic), Term{Formula: "n[l+1,0] n[l,0]", Each: Each{"l": "legs"}}, "n[x,0] n[y,0] + n[y,0] n[z,0] + n[x,0] n[z,0]"},
		{"named leg shifted", three(Open, Open), Term{Formula: "n[z-2,0] n[x+1,1]"}, "n[x,0] n[y,1]"},
		{"shift by an index", three(Open, Open), Term{Formula: "n[x+d,0]", Each: Each{"d": "0..2"}}, "n[x,0] + n[y,0] + n[z,0]"},
		{"ragged legs", ragged, Term{Formula: "n[s,j] n[u,j]"}, "n[s,1] n[u,1]"},
		{"ragged legs with a shift", ragged, Term{Formula: "n[s,j] n[u,j+1]"}, "n[s,0] n[u,1] + n[s,2] n[u,3]"},
		{"each leg where it is", ragged, Term{Formula: "n[l,3]", Each: Each{"l": []string{"a", "u"}}}, "n[a,3] + n[u,3]"},
		{"h.c. of the whole", bosons(2, Open), Term{Formula: "i*b^+[a,0] b[b,1] + n[a,0] + h.c."}, "i*b^+[a,0] b[b,1] - i*b^+[b,1] b[a,0] + 2*n[a,0]"},
		{"h.c. in parentheses", bosons(2, Open), Term{Formula: "n[a,0] + 2i (b[a,0] - h.c.)"}, "n[a,0] + 2*i*b[a,0] - 2*i*b^+[a,0]"},
		{"h.c. of a number", bosons(2, Open), Term{Formula: "(i + 1 + h.c.)*n[a,0]"}, "2*n[a,0]"},
		{"h.c. of fermions", three(Open, Open), Term{Formula: "c[x,0] c[y,1] + h.c."}, "c[x,0] c[y,1] + c^+[y,1] c^+[x,0]"},
		{"sum", bosons(4, Open), Term{Formula: "sum(k=0..j-1, n[a,j] n[a,k]/(j-k))", Where: "j == 2"}, "n[a,2] n[a,0]/2 + n[a,2] n[a,1]"},
		{"sum without j", bosons(3, Open), Term{Formula: "sum(k=0..rungs-1, k*n[a,k])"}, "n[a,1] + 2*n[a,2]"},
		{"sum that leaves the ladder leaves the place out", bosons(4, Open), Term{Formula: "j*sum(k=j..j+1, n[a,k])"}, "n[a,1] + n[a,2] + 2*n[a,2] + 2*n[a,3]"},
		{"sum around the ring", bosons(3, Periodic), Term{Formula: "sum(k=0..rungs-1, b^+[a,k+1] b[a,k])"}, "b^+[a,1] b[a,0] + b^+[a,2] b[a,1] + b^+[a,0] b[a,2]"},
		{"sum of numbers", bosons(1, Open), Term{Formula: "sum(k=1..4, k)*n[a,0]"}, "10*n[a,0]"},
		{"empty sum and product", bosons(1, Open), Term{Formula: "sum(k=1..0, n[a,k]) + prod(k=1..0, n[a,k])*n[a,0]"}, "n[a,0]"},
		{"product of numbers", bosons(1, Open), Term{Formula: "prod(k=1..4, k)*n[a,0]"}, "24*n[a,0]"},
		{"product in rising order", three(Open, Open), Term{Formula: "prod(k=0..2, c[x,k])"}, "c[x,0] c[x,1] c[x,2]"},
		{"sums in sums", bosons(3, Open), Term{Formula: "sum(k=0..2, sum(m=k..2, n[a,k] n[b,m]))"}, "n[a,0] n[b,0] + n[a,0] n[b,1] + n[a,0] n[b,2] + n[a,1] n[b,1] + n[a,1] n[b,2] + n[a,2] n[b,2]"},
		{"powers", bosons(1, Open), Term{Formula: "n[a,0]^2 + b[a,0]^0 + b^+[a,0]^3"}, "n[a,0] n[a,0] + 1 + b^+[a,0] b^+[a,0] b^+[a,0]"},
		{"power of a sum", bosons(2, Open), Term{Formula: "(n[a,0] + n[a,1])^3"},
			"n[a,0]^3 + 3*n[a,0]^2 n[a,1] + 3*n[a,0] n[a,1]^2 + n[a,1]^3"},
		{"juxtaposition after a division", bosons(1, Open), Term{Formula: "1/2 n[a,0] (n[a,0] - 1)"}, "0.5*b^+[a,0]^2 b[a,0]^2"},
		{"division of operators by numbers", bosons(1, Open), Term{Formula: "n[a,0]/4"}, "0.25*n[a,0]"},
		{"bosons are ordered", bosons(1, Open), Term{Formula: "b[a,0] b^+[a,0]"}, "n[a,0] + 1"},
		{"functions", bosons(1, Open), Term{Formula: "(sqrt(4) + abs(-3) + abs(3+4*i) + cos(pi) + sin(pi/2) + exp(0) + bessel(0, 0) + 7 % 4)*n[a,0]"}, "(2+3+5-1+1+1+1+3)*n[a,0]"},
		{"exact phases", bosons(1, Open), Term{Formula: "exp(i*pi)*b[a,0] + exp(i*pi/2)*n[a,0] + exp(2*i*pi)*b^+[a,0] + cos(pi/2)*n[b,0]"}, "-b[a,0] + i*n[a,0] + b^+[a,0]"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, err := NewScope(c.ladder, nil)
			require.NoError(t, err)
			got, want := polynomial(t, s, c.term), polynomial(t, s, Term{Formula: c.want})
			require.True(t, got.Equal(want, 1e-14), "got  %v\nwant %v", got, want)
			require.NotZero(t, want.NumTerms())
		})
	}
}

// TestOperators shows what the operators of each kind become.
func TestOperators(t *testing.T) {
	l := must(t, 2, Open, Leg("f", Fermion()), Leg("e", Electron()), Leg("t", Electron(Double(false))), Leg("p", Boson(2)),
		Leg("s", Spin(1)), Leg("v", Spin(2)), Leg("q", Clock(3)))
	s, err := NewScope(l, Constants{"J": 0.5})
	require.NoError(t, err)
	for _, c := range []struct{ formula, want string }{
		{"c^+[f,1] c[f,0]", "-c[f,0] c^+[f,1]"},
		{"c[f,0] c^+[f,0]", "1 - n[f,0]"},
		{"c_up^+[e,0] c_down[e,0] c_up[e,0]", "-n_up[e,0] c_down[e,0]"},
		{"n[e,0]", "n_up[e,0] + n_down[e,0]"},
		{"n[e,0]^2", "n_up[e,0] + n_down[e,0] + 2 n_up[e,0] n_down[e,0]"},
		{"S^-[e,0]", "-c_up[e,0] c_down^+[e,0]"},
		{"n_up[t,0] n_down[t,0] + n_up[t,0]", "n_up[t,0]"},
		{"c_up[t,0] c_down[t,0] c_down^+[t,0] c_up^+[t,0]", "1 - n_up[t,0] - n_down[t,0]"},
		{"S[s,0].S[s,1]", "S^z[s,0] S^z[s,1] + 0.5 S^+[s,0] S^-[s,1] + 0.5 S^-[s,0] S^+[s,1]"},
		{"S[s,0].S[s,0]", "0.75"},
		{"S[v,0].S[v,0]", "2"},
		{"J (S[s,0].S[v,1])^2 - J*S[s,0].S[v,1]*S[s,0].S[v,1]", "0"},
		{"S^x[s,0]", "0.5 S^+[s,0] + 0.5 S^-[s,0]"},
		{"S^y[s,0]^2", "0.25"},
		{"S^z[v,0]^2", "S^z[v,0]^2"},
		{"S^z[v,0]^3", "S^z[v,0]"},
		{"S^+[v,0] S^-[v,0]", "2 + S^z[v,0] - S^z[v,0]^2"},
		{"S^z[v,0] S^+[v,0]", "0.5 S^+[v,0] + (S^z[v,0] - 1/2) S^+[v,0]"},
		{"S^+[v,0]^3", "0"},
		{"X[q,0] Z[q,0] - exp(-2*pi*i/3) Z[q,0] X[q,0]", "0"},
		{"Z^+[q,0] Z[q,0]", "1"},
		{"Z[q,0]^2", "Z^+[q,0]"},
		{"X[q,0]^3", "1"},
		{"exp(i*pi*n[f,0])", "1 - 2 n[f,0]"},
		{"exp(i*pi*n[e,0])", "1 - 2 n_up[e,0] - 2 n_down[e,0] + 4 n_up[e,0] n_down[e,0]"},
		{"exp(i*pi*n[t,0])", "1 - 2 n_up[t,0] - 2 n_down[t,0]"},
		{"exp(i*pi*n[p,0]) b[p,0]", "exp(3.141592653589793*i n[p,0]) b[p,0]"},
		{"b[p,0] exp(i*pi*n[p,0])", "-exp(3.141592653589793*i n[p,0]) b[p,0]"},
		{"exp(i*pi*n[p,0])^2", "1"},
		{"exp(i*pi*n[p,0]^2) - exp(i*pi*n[p,0])", "0"},
		{"exp(i*pi*S^z[s,0])", "2*i S^z[s,0]"},
		{"exp(i*pi*S^z[v,0])", "1 - 2 S^z[v,0]^2"},
		{"exp(i*pi*(n[f,0] + n[f,1]))", "1 - 2 n[f,0] + 4 n[f,0] n[f,1] - 2 n[f,1]"},
		{"exp(i*pi*prod(k=0..1, 1))", "-1"},
		{"2", "2"},
	} {
		t.Run(c.formula, func(t *testing.T) { require.Equal(t, c.want, polynomial(t, s, Term{Formula: c.formula}).String()) })
	}
}

// TestLongStringsStayShort holds the reason for compounds: 2^60 terms otherwise.
func TestLongStringsStayShort(t *testing.T) {
	l := must(t, 64, Open, Leg("v", Spin(2)), Leg("f", Fermion()))
	s, err := NewScope(l, nil)
	require.NoError(t, err)
	haldane := polynomial(t, s, Term{Formula: "S^z[v,0] prod(k=1..62, exp(i*pi*S^z[v,k])) S^z[v,63]"})
	require.Equal(t, 1, haldane.NumTerms())
	ok, _ := haldane.Hermitian(1e-12)
	require.True(t, ok)
	byHand := polynomial(t, s, Term{Formula: "S^z[v,0] prod(k=1..62, 1 - 2*S^z[v,k]^2) S^z[v,63]"})
	require.True(t, haldane.Equal(byHand, 1e-13))
	parity := polynomial(t, s, Term{Formula: "prod(k=0..63, exp(i*pi*n[f,k]))"})
	require.Equal(t, 1, parity.NumTerms())
	square, err := parity.Mul(parity)
	require.NoError(t, err)
	require.Equal(t, "1", square.String())
	short := polynomial(t, s, Term{Formula: "prod(k=0..1, exp(i*pi*n[f,k]))"})
	require.Equal(t, "1 - 2 n[f,0] + 4 n[f,0] n[f,1] - 2 n[f,1]", short.String())
	flip := polynomial(t, s, Term{Formula: "prod(k=0..63, 2*S^x[v,k])"})
	require.Equal(t, 1, flip.NumTerms())
	// Even and odd elements do not make one: an error, not a loop without end.
	_, err = s.Polynomial(Term{Formula: "prod(k=0..63, 1 + c[f,k])"})
	require.ErrorContains(t, err, "a product of more than 4 million terms")
}

func TestPlacesOneByOne(t *testing.T) {
	s, err := NewScope(twoLegs(t, 3, Open), nil)
	require.NoError(t, err)
	places, err := s.Places(Term{Formula: "x*n[l,j+1]", Each: Each{"l": "legs", "x": []float64{0.5, 2}}, Where: "l == b or x > 1"})
	require.NoError(t, err)
	var got []string
	for _, p := range places {
		got = append(got, placeName(p.At)+": "+p.Poly.String())
	}
	require.Equal(t, []string{
		"j = 0, l = a, x = 2: 2 n[a,1]", "j = 0, l = b, x = 0.5: 0.5 n[b,1]", "j = 0, l = b, x = 2: 2 n[b,1]",
		"j = 1, l = a, x = 2: 2 n[a,2]", "j = 1, l = b, x = 0.5: 0.5 n[b,2]", "j = 1, l = b, x = 2: 2 n[b,2]",
	}, got)
	require.Equal(t, 1, places[3].At[0].Value())
	require.Equal(t, 0.5, places[1].At[2].Value())
	places, err = s.Places(Term{Formula: "b[a,0] - b[a,0]"})
	require.NoError(t, err)
	require.Len(t, places, 1, "a place whose value is zero is a place")
	require.Empty(t, places[0].At)
	places, err = s.Places(Term{Formula: "3*j"})
	require.NoError(t, err)
	require.Len(t, places, 3)
	require.Equal(t, "6", places[2].Poly.String())
}

func TestNumbers(t *testing.T) {
	s, err := NewScope(twoLegs(t, 6, Open), Constants{"J": 2, "phi_0": 0.5})
	require.NoError(t, err)
	for _, c := range []struct {
		src  string
		want float64
	}{
		{"0.8*pi", 0.8 * math.Pi}, {"rungs/2 - 1", 2}, {"J^2^3", 256}, {"-J^2", -4}, {"J^-1", 0.5}, {"i^2", -1}, {"(-8)^(1/3)*(-8)^(2/3)", -8},
		{"phi_0^0.5", math.Sqrt(0.5)}, {"sqrt(-4)*i", -2}, {"-1 % 3", 2}, {"bessel(1, 2)", 0.5767248077568734}, // J_1(2), Abramowitz and Stegun table 9.1
		{"sum(k=0..3, J*k)", 12}, {"abs(exp(i*J))", 1}, {"sin(i)*i + (exp(1)-exp(-1))/2", 0},
	} {
		got, err := s.Number(c.src)
		require.NoError(t, err, c.src)
		require.InDelta(t, c.want, got, 1e-13, c.src)
	}
}

func TestProfiles(t *testing.T) {
	l := twoLegs(t, 3, Open)
	s, err := NewScope(l, Constants{"W": 2},
		Profile{Name: "h", Formula: "uniform(-W, W)", Seed: 7},
		Profile{Name: "g", Formula: " normal( 1, sqrt(W) )", Seed: 7},
		Profile{Name: "trap", Formula: "0.01*(j - (rungs-1)/2)^2"},
		Profile{Name: "tilt", Formula: "j + 10*leg + trap[j]"},
		Profile{Name: "list", Values: []float64{1, 2, 3}},
		Profile{Name: "sites", Values: []float64{1, 2, 3, 4, 5, 6}})
	require.NoError(t, err)
	for formula, want := range map[string]string{
		"trap[j]*n[a,j]":    "0.01*n[a,0] + 0.01*n[a,2]",
		"trap[b,j]*n[a,j]":  "0.01*n[a,0] + 0.01*n[a,2]",
		"trap[j+1]*n[a,j]":  "0.01*n[a,1]",
		"tilt[b,j]*n[b,j]":  "10.01*n[b,0] + 11*n[b,1] + 12.01*n[b,2]",
		"list[j]*n[a,j]":    "n[a,0] + 2*n[a,1] + 3*n[a,2]",
		"list[a,2]*n[a,0]":  "3*n[a,0]",
		"sites[b,j]*n[b,j]": "2*n[b,0] + 4*n[b,1] + 6*n[b,2]",
	} {
		got, by := polynomial(t, s, Term{Formula: formula}), polynomial(t, s, Term{Formula: want})
		require.True(t, got.Equal(by, 1e-14), "%s: %v", formula, got)
	}
	h := s.profile("h")
	require.Len(t, h.bySite, 6)
	for _, v := range append(h.bySite, h.byRung...) {
		require.True(t, -2 <= v && v < 2)
	}
	longer, err := NewScope(twoLegs(t, 9, Open), Constants{"W": 2}, Profile{Name: "h", Formula: "uniform(-W,W)", Seed: 7})
	require.NoError(t, err)
	require.Equal(t, h.bySite, longer.profile("h").bySite[:6], "a longer ladder begins like a shorter one")
	require.NotEqual(t, h.bySite[0], h.byRung[0])
	// Golden numbers of this package at its first release: disorder must not change under the user.
	require.InDelta(t, 0.26062653, h.bySite[0], 1e-8)
	require.InDelta(t, 2.58629767, s.profile("g").bySite[0], 1e-8)
}

func TestManyPlacesAreFast(t *testing.T) {
	// 500 rungs with all pairs: 125 000 terms; the benchmark has ten times as many.
	l := must(t, 500, Open, Leg("a", Boson(1)))
	s, err := NewScope(l, Constants{"V": 2})
	require.NoError(t, err)
	p := polynomial(t, s, Term{Formula: "V/(k-j)^3 n[a,j] n[a,k]", Each: Each{"k": "rungs"}, Where: "k > j"})
	require.Equal(t, 500*499/2, p.NumTerms())
}

func BenchmarkPairs(b *testing.B) { // terms=1e6
	l := must(b, 1000, Open, Leg("a", Boson(1)))
	s, err := NewScope(l, Constants{"V": 2, "phi": 0.3})
	require.NoError(b, err)
	b.ReportAllocs()
	for b.Loop() {
		p, err := s.Polynomial(Term{Formula: "V*exp(i*phi*(k-j))/(k-j)^3 b^+[a,j] b[a,k] + h.c.", Each: Each{"k": "rungs"}, Where: "k > j"})
		require.NoError(b, err)
		b.ReportMetric(float64(p.NumTerms()), "terms")
	}
}
