package modelfile

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

func parseGood(t *testing.T, text string) *Model {
	t.Helper()
	m, err := Parse("m", []byte(text))
	if err != nil {
		t.Fatalf("%v\nin\n%s", err, text)
	}
	return m
}

// TestExamples reads the bundled model files.
func TestExamples(t *testing.T) {
	files, err := filepath.Glob("../../examples/*/*.toml")
	if err != nil || len(files) == 0 {
		t.Fatal("no examples found", err)
	}
	for _, f := range files {
		m, err := Load(f)
		if err != nil {
			t.Errorf("%s: %v", f, err)
			continue
		}
		if m.Title == "" || m.Hamiltonian.Poly.NumTerms() == 0 || len(m.Observe) == 0 || m.Solve.Precision == 0 {
			t.Errorf("%s: incomplete: %+v", f, m)
		}
	}
}

// all has every key that the sections know.
const all = `title = "all keys"
ladder = { rungs = 6, boundary = "periodic", across = "periodic" }
[[leg]]
name   = "a"
site   = "fermion"
spin   = "1/2"
double = false
[[leg]]
name  = "b"
site  = "spin"
s     = 0.5
rungs = "1..rungs-2"
[[leg]]
name = "d"
site = "clock"
q    = 3
rungs = [0, 3, 5]
[constants]
t = 1
V = "2*t"
W = 0.1
[profile]
h    = "uniform(-W, W)"
g    = { formula = "normal(0, W)", seed = 7 }
trap = "0.01*(j - (rungs-1)/2)^2"
mu   = [1, 2, 3, 4, 5, 6]
[[term]]
formula = "-t c_up^+[a,j+1] c_up[a,j] - t c_down^+[a,j+1] c_down[a,j] + h.c."
[[term]]
name    = "pairs"
formula = "V/4^k n[a,j] n[a,k]"
each.k  = "rungs"
where   = "j < k"
[[term]]
name    = "place"
formula = "(h[a,k] + g[a,k] + trap[k] + mu[k]) n[a,k]"
each    = { k = [0, 2] }
[[term]]
formula = "S^z[b,j]"
[[term]]
formula = "Z[d,j] + h.c."
[sector]
N = "rungs - 1"
[solve]
precision            = 1e-9
observable_precision = 1e-6
states  = 2
bond    = 300
sweeps  = 20
time    = "1d2h"
memory  = "2 GiB"
seed    = 5
charges = ["N"]
[[observe]]
name    = "density"
formula = "n[l,j]"
each    = { l = ["a"] }
where   = "j != 2"
[[observe]]
name = "coherence"
kind = "correlations"
of   = ["c_up^+[l,j]", "c_up[a,j]"]
each = { l = ["a"] }
connected = true
[[observe]]
kind = "entanglement"
spectrum_to = 20
`

func TestAllKeys(t *testing.T) {
	m := parseGood(t, all)
	if got, want := m.Ladder.Sites(), 6+4+3; got != want {
		t.Errorf("%d sites, want %d", got, want)
	}
	s := m.Solve
	if s.Precision != 1e-9 || s.ObservablePrecision != 1e-6 || s.States != 2 || s.Bond != 300 || s.Sweeps != 20 || s.Time != 26*time.Hour || s.Memory != 2<<30 || s.Seed != 5 ||
		len(s.Charges) != 1 || s.Charges[0] != "N" {
		t.Errorf("settings %+v", s)
	}
	if m.Sector["N"] != "rungs - 1" {
		t.Errorf("sector %v", m.Sector)
	}
	if len(m.Observe) != 3 {
		t.Fatalf("observations %+v", m.Observe)
	}
	if o := m.Observe[0]; o.Kind != Values || o.Name != "density" || o.Term.Formula != "n[l,j]" || o.Term.Where != "j != 2" || len(o.Term.Each) != 1 {
		t.Errorf("%+v", o)
	}
	if o := m.Observe[1]; o.Kind != Correlations || o.Second.Formula != "c_up[a,j]" || len(o.Term.Each) != 1 || o.Second.Each != nil || !o.Connected {
		t.Errorf("%+v", o)
	}
	if o := m.Observe[2]; o.Kind != Entanglement || o.Name != "entanglement" || o.SpectrumTo != 20 {
		t.Errorf("%+v", o)
	}
}

// TestHash changes the text in ways that leave the result alone, then in ways that do not.
func TestHash(t *testing.T) {
	m := parseGood(t, small)
	for name, text := range map[string]string{
		"title":             change(t, "\"small\"", "\"another\""),
		"comments":          "# hello\n" + change(t, "rungs = 4", "rungs = 4 # four"),
		"spacing":           change(t, "U/2 n[l,j] (n[l,j] - 1)", "(U/2)  n[l, j](n[l,j]-1)"),
		"name of a term":    change(t, "\"repulsion\"", "\"U\""),
		"form of a number":  change(t, "\"4*J\"", "0.4e1"),
		"order of sections": strings.Replace(change(t, "[sector]\nN = 4\n", ""), "[ladder]", "[sector]\nN = 4.0\n[ladder]", 1),
		"time and memory":   change(t, "precision = 1e-8", "precision = 1e-8\ntime = \"1h\"\nmemory = \"1 GB\""),
		"byte order mark":   "\ufeff" + small,
		"Windows line ends": strings.ReplaceAll(small, "\n", "\r\n"),
		"default":           change(t, "rungs = 4", "rungs = 4\nboundary = \"open\""),
		"range of a leg":    change(t, "max  = 2", "max  = 2\nrungs = \"0..rungs-1\""),
	} {
		o := parseGood(t, text)
		if o.Hash != m.Hash || Difference(m, o) != "" {
			t.Errorf("%s changes the hash: %s", name, Difference(m, o))
		}
	}
	for _, c := range []struct{ old, new, want string }{
		{"U = \"4*J\"", "U = 5", "constant U: 4, now 5"},
		{"rungs = 4", "rungs = 5", "rungs: 4, now 5"},
		{"max  = 2", "max  = 3", `leg 1: "a", boson (max 2), rungs 0..3, now "a", boson (max 3), rungs 0..3`},
		{"N = 4", "N = 3", "sector N: 4, now 3"},
		{"N = 4", "", "sector N: 4, now absent"},
		{"1e-8", "1e-9", "precision: 1e-08, now 1e-09"},
		{"precision = 1e-8", "precision = 1e-8\nseed = 3", "seed: absent before, now 3"},
		{"\"n[a,j]\"", "\"n[a,j]^2\"", `observe "density": values: n[a,j], now values: n[a,j]^2`},
		{"- 1)\"", "- 2)\"", "term 2: U/2 n[l,j] (n[l,j] - 1), each l in legs, now U/2 n[l,j] (n[l,j] - 2), each l in legs"},
	} {
		o := parseGood(t, change(t, c.old, c.new))
		if o.Hash == m.Hash || Difference(m, o) != c.want {
			t.Errorf("%q for %q: got %q, want %q", c.new, c.old, Difference(m, o), c.want)
		}
	}
	// Written down on 2026-12-01; a change here makes every run folder of earlier versions foreign.
	if want := "d56f98363eb5339bb0dc20b3b78ca699ff8827db96fd8e3abbb4d0cef33c5522"; m.Hash != want {
		t.Errorf("hash %s, want %s, of\n%s", m.Hash, want, m.Content())
	}
}

// TestModelFaults holds the errors that need the physics.
func TestModelFaults(t *testing.T) {
	for _, c := range []struct{ name, old, new, want string }{
		{"unknown constant", "-J b^+", "-K b^+", `17:13: unknown symbol "K"`},
		{"unknown constant in a constant", "\"4*J\"", "\"4*I\"", `13:8: unknown symbol "I"`},
		{"constant of itself", "\"4*J\"", "\"4*U\"", `13:8: "U" is not defined before this line`},
		{"complex constant", "\"4*J\"", "\"exp(i*J)\"", `13:6: expected a real number, got (0.5403023058681398+0.8414709848078965*i)`},
		{"constant of infinity", "\"4*J\"", "\"1/(J-1)\"", `13:7: division by zero`},
		{"constant with the name of a leg", "U = \"4*J\"", "U = 4\na = 3", `14:1: a constant named "a": that is a leg`},
		{"reserved constant", "U = \"4*J\"", "U = 4\npi = 3", `14:1: a constant named "pi": that is a reserved name`},
		{"name that no formula can hold", "U = \"4*J\"", "U = 4\n2x = 3", `14:1: constant name "2x"`},
		{"unknown leg", "b[a,j]", "b[c,j]", `17:28: unknown leg "c"`},
		{"unknown operator", "b[a,j] +", "d[a,j] +", `17:26: unknown operator "d" on leg "a"`},
		{"operator without bracket", "b[a,j] +", "b +", `17:26: operator "b" without its place`},
		{"non-Hermitian", " + h.c.", "", `17:12: not Hermitian: -b[a,0] b^+[a,1] has no conjugate`},
		{"rung out of range", "b^+[a,j+1] b[a,j]", "b^+[a,0] b[a,4]", `17:28: rung 4 out of range`},
		{"index unused", "{ l = \"legs\" }", "{ l = \"legs\", m = \"rungs\" }", `22:25: index "m" is not used`},
		{"index of a reserved name", "{ l = \"legs\" }", "{ l = \"legs\", pi = \"rungs\" }", `22:25: an index named "pi": that is a reserved name`},
		{"unknown leg in each", "{ l = \"legs\" }", "{ l = [\"a\", \"e\"] }", `22:23: unknown leg "e"`},
		{"range out of range", "(n[l,j] - 1)\"\neach    = { l = \"legs\" }", "n[l,k]\"\neach    = { l = \"legs\", k = \"0..rungs\" }", `21:27: rung 4 out of range`},
		{"unknown name in a condition", "{ l = \"legs\" }", "{ l = \"legs\" }\nwhere = \"l != a and m > 3\"", `23:21: unknown symbol "m"`},
		{"sector out of reach", "N = 4", "N = 9", `25:5: sector N = 9 cannot be reached on this ladder`},
		{"fraction of a particle", "N = 4", "N = \"1/2\"", `25:5: sector N = 1/2: expected a whole number`},
		{"unknown charge", "N = 4", "M = 4", `25:1: sector: this ladder has no charge "M"`},
		{"charge that is not conserved", "N = 4", "N = 4\nSz = 0", `26:1: sector: this ladder has no charge "Sz"`},
		{"unknown charge asked for", "precision = 1e-8", "charges = [\"N\", \"Q\"]", `28:17: charge "Q" cannot be used: this ladder has no charge "Q"`},
		{"slip in a name", "U/2", "W/2*Ur", `21:12: unknown symbol "W"`},
		{"observation", "\"n[a,j]\"", "\"n[a,j] m[a]\"", `32:19: "m" with 1 index`},
		{"range of a leg", "max  = 2", "max  = 2\nrungs = \"0..rungs\"", `10:9: leg "a": rungs 0..4 out of range`},
		{"name in the range of a leg", "max  = 2", "max  = 2\nrungs = \"0..L-1\"", `10:13: unknown symbol "L"`},
		{"leg with a reserved name", "name = \"a\"", "name = \"pi\"", `7:8: leg name "pi" is reserved`},
		{"leg that is no name", "name = \"a\"", "name = \"a b\"", `7:8: leg name "a b"`},
		{"profile", "[[observe]]", "[profile]\nh = \"uniform(-1, M)\"\n[[observe]]", `31:18: unknown symbol "M"`},
		{"random constant", "\"4*J\"", "\"uniform(0, 1)\"", `13:6: random number outside [profile]`},
		{"two terms at fault", "-J b^+[a,j+1] b[a,j] + h.c.\"\n\n[[term]]\nname    = \"repulsion\"\nformula = \"U/2 n[l,j]", "-K b^+[a,j+1] b[a,j] + h.c.\"\n\n[[term]]\nname    = \"repulsion\"\nformula = \"U/2 m[l,j]", `17:13: unknown symbol "K"
21:16: unknown operator "m" on leg "a"`},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Parse("m", []byte(change(t, c.old, c.new)))
			var got []string
			for _, e := range Faults(err) {
				got = append(got, fmt.Sprintf("%d:%d: %s", e.Line, e.Column, e.Msg))
			}
			if g := strings.Join(got, "\n"); g != c.want {
				t.Errorf("got\n%s\nwant\n%s", g, c.want)
			}
		})
	}
}

// fermions is a chain with a term that fermions do not allow.
const fermions = `[ladder]
rungs = 4
[[leg]]
name = "chain"
site = "fermion"
[constants]
Jleg = 1
[[term]]
name    = "hopping"
formula = "-Jleg c^+[chain,j+1] c[chain,j] + h.c."
[[term]]
name    = "leads"
formula = "c[chain,0] + h.c."
`

func TestOddTerm(t *testing.T) {
	_, err := Parse("m", []byte(fermions))
	faults := Faults(err)
	if len(faults) != 1 || faults[0].Line != 13 || !strings.Contains(faults[0].Msg, "fermion-odd term c[chain,0]") {
		t.Errorf("%v", err)
	}
}

func TestGuess(t *testing.T) {
	for _, c := range []struct{ old, new, want string }{
		{"-Jleg", "-Jlge", `m:10:13: unknown symbol "Jlge" (did you mean "Jleg"? `},
		{"c[chain,j]", "c[chian,j]", `m:10:35: unknown leg "chian" (did you mean "chain"? `},
	} {
		_, err := Parse("m", []byte(strings.Replace(fermions, c.old, c.new, 1)))
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("got %v, want %s", err, c.want)
		}
	}
}

// TestCombined holds that Hermiticity is judged for the sum: a term may bring the conjugate of another.
func TestCombined(t *testing.T) {
	parseGood(t, change(t, " + h.c.\"", "\"\n[[term]]\nformula = \"-J b^+[a,j] b[a,j+1]\""))
}

func TestLoadUnreadable(t *testing.T) {
	dir := t.TempDir()
	_, err := Load(filepath.Join(dir, "none.toml"))
	if !errors.Is(err, os.ErrNotExist) || !strings.Contains(err.Error(), "none.toml: cannot read the model file") {
		t.Errorf("absent file: %v", err)
	}
	if _, err := Load(dir); err == nil || !strings.Contains(err.Error(), "cannot read the model file") {
		t.Errorf("folder: %v", err)
	}
	large := filepath.Join(dir, "large.toml")
	if err := os.WriteFile(large, make([]byte, MaxSize+1), 0o600); err != nil {
		t.Fatal(err)
	}
	if _, err := Load(large); err == nil || !strings.Contains(err.Error(), "larger than 16 MiB") {
		t.Errorf("large file: %v", err)
	}
}

func TestManyFaults(t *testing.T) {
	_, err := Parse("m", []byte(small+strings.Repeat("[[term]]\nformula = \"(\"\n", 100)))
	faults := Faults(err)
	if len(faults) != maxFaults+1 || faults[maxFaults].Msg != "80 more faults follow" {
		t.Errorf("%d faults, %v", len(faults), faults[len(faults)-1])
	}
}

func TestManyLegs(t *testing.T) {
	_, err := Parse("m", []byte("[ladder]\nrungs = 1\n[[term]]\nformula = \"1\"\n"+strings.Repeat("[[leg]]\n", maxLegs+1)))
	if want := "m:261:1: 257 legs; expected at most 256"; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
}

func TestCaret(t *testing.T) {
	_, err := Parse("m", []byte(change(t, "\"U/2 n", "\"é*(U/2 n")))
	faults := Faults(err)
	if len(faults) != 1 {
		t.Fatal(err)
	}
	want := "formula = \"é*(U/2 n[l,j] (n[l,j] - 1)\"\n" + strings.Repeat(" ", 13) + "^"
	if got := faults[0].Caret(); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	_, err = Parse("m", []byte("title = \""+strings.Repeat("é", 500)+"\" x"))
	if lines := strings.Split(Faults(err)[0].Caret(), "\n"); len(lines) != 2 || len([]rune(lines[0])) > 160 || []rune(lines[0])[len(lines[1])-1] != 'x' {
		t.Errorf("%q", lines)
	}
}
