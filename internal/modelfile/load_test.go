package modelfile

import (
	"regexp"
	"strings"
	"testing"
)

// big numbers make a fuzzed model costly, not wrong.
var big = regexp.MustCompile(`[0-9]{3}|[0-9][eE]|\^[^+\-xyz]`)

// small is the model that the tests disturb.
const small = `title = "small"

[ladder]
rungs = 4

[[leg]]
name = "a"
site = "boson"
max  = 2

[constants]
J = 1.0
U = "4*J"

[[term]]
name    = "hopping"
formula = "-J b^+[a,j+1] b[a,j] + h.c."

[[term]]
name    = "repulsion"
formula = "U/2 n[l,j] (n[l,j] - 1)"
each    = { l = "legs" }

[sector]
N = 4

[solve]
precision = 1e-8

[[observe]]
name    = "density"
formula = "n[a,j]"
`

// change replaces the one place where old stands in small.
func change(t *testing.T, old, new string) string {
	t.Helper()
	if strings.Count(small, old) != 1 {
		t.Fatalf("%q stands in the model %d times", old, strings.Count(small, old))
	}
	return strings.Replace(small, old, new, 1)
}

// TestFaults holds the errors of the file itself: what TOML, the sections, their keys and the syntax of formulas can get wrong.
func TestFaults(t *testing.T) {
	for _, c := range []struct{ name, old, new, want string }{
		{"unknown key", "max  = 2", "mx   = 2", `
m:6:1: [[leg]] "a" has no key "max" (add max = 3, the largest occupation)
m:9:1: unknown key "mx" in [[leg]] "a" (did you mean "max"? keys here: name, site, spin, double, max, s, q, rungs)`},
		{"key in other letters", "rungs = 4", "Rungs = 4", `
m:3:1: [ladder] has no key "rungs" (add rungs = 16)
m:4:1: unknown key "Rungs" in [ladder] (did you mean "rungs"? keys here: rungs, boundary, across)`},
		{"unknown section", "[solve]", "[solver]", `
m:27:1: unknown section "solver" (did you mean "solve"? sections: ladder, leg, constants, profile, term, sector, solve, observe)`},
		{"unknown key at the top", "title = \"small\"", "titel = 3", `
m:1:1: unknown key "titel" (did you mean "title"? before the first section: title)`},
		{"later section", "[solve]", "[survey]", `
m:27:1: section "survey" is not supported by this version (remove it to solve the model as it stands)`},
		{"wrong type", "rungs = 4", "rungs = \"four\"", `
m:4:9: key "rungs" in [ladder] is a string; expected a whole number, such as rungs = 4`},
		{"fraction for a whole number", "rungs = 4", "rungs = 4.0", `
m:4:9: key "rungs" in [ladder] is a number; expected a whole number, such as rungs = 4`},
		{"date", "precision = 1e-8", "precision = 2020-01-01", `
m:28:13: key "precision" in [solve] is a date or time; expected a number`},
		{"zero rungs", "rungs = 4", "rungs = 0", `
m:4:9: rungs = 0 in [ladder] is too small (expected 1 to 100000)`},
		{"negative rungs", "rungs = 4", "rungs = -4", `
m:4:9: rungs = -4 in [ladder] is too small (expected 1 to 100000)`},
		{"a billion rungs", "rungs = 4", "rungs = 1_000_000_000", `
m:4:9: rungs = 1000000000 in [ladder] is too large (expected 1 to 100000)`},
		{"more rungs than numbers", "rungs = 4", "rungs = 99999999999999999999", `
m:4:9: whole number 99999999999999999999 out of range`},
		{"boundary", "rungs = 4", "rungs = 4\nboundary = \"Open\"", `
m:5:12: boundary = "Open" in [ladder] (did you mean "open"? expected one of: open, periodic)`},
		{"site kind", "\"boson\"", "\"bosons\"", `
m:8:8: site = "bosons" in [[leg]] "a" (did you mean "boson"? expected one of: fermion, boson, spin, clock)`},
		{"huge max", "max  = 2", "max  = 1000000", `
m:9:8: max = 1000000 in [[leg]] "a" is too large (expected 1 to 255)`},
		{"max of a fermion", "\"boson\"", "\"fermion\"", `
m:9:1: key "max" has no meaning for site = "fermion" (remove it)`},
		{"spin", "site = \"boson\"\nmax  = 2", "site = \"spin\"\ns = \"1/3\"", `
m:9:5: s = "1/3" in [[leg]] "a" (expected "1/2", 1, "3/2", ... up to 25)`},
		{"spinless double", "site = \"boson\"\nmax  = 2", "site = \"fermion\"\ndouble = false", `
m:9:1: key "double" needs a fermion with two components (add spin = "1/2" for two components, or remove it)`},
		{"fermions of another spin", "site = \"boson\"\nmax  = 2", "site = \"fermion\"\nspin = 1.5", `
m:9:8: fermions of spin 1.5 (expected spin = "1/2" for two components, or no such key for one)`},
		{"rung of a leg", "max  = 2", "max  = 2\nrungs = [0, 4]", `
m:10:13: rung 4 in [[leg]] "a" is out of range (rungs are 0 to 3)`},
		{"leg twice", "[constants]", "[[leg]]\nname = \"a\"\nsite = \"fermion\"\n[constants]", `
m:12:8: leg "a" for the second time, first in line 7 (give each leg its own name)`},
		{"term twice", "\"repulsion\"", "\"hopping\"", `
m:20:11: term "hopping" for the second time, first in line 16 (give each term its own name)`},
		{"key twice", "rungs = 4", "rungs = 4\nrungs = 5", `
m:5:1: key "rungs" for the second time, first in line 4 (keep one of them)`},
		{"section twice", "[sector]", "[ladder]", `
m:24:1: [ladder] for the second time (keep one of them)`},
		{"single brackets", "[[leg]]", "[leg]", `
m:6:1: [leg] with single brackets; there may be several such sections (write [[leg]])`},
		{"double brackets", "[solve]", "[[solve]]", `
m:27:1: [[solve]] with double brackets; there is one such section (write [solve])`},
		{"infinite constant", "J = 1.0", "J = inf", `
m:12:5: J is inf (expected a finite number)`},
		{"nan", "J = 1.0", "J = nan", `
m:12:5: J is nan (expected a finite number)`},
		{"overflowing constant", "J = 1.0", "J = 1e999", `
m:12:5: number 1e999 out of range (the largest is about 1.8e308)`},
		{"list for a constant", "J = 1.0", "J = [1]", `
m:12:5: key "J" in [constants] is a list; expected a number or a formula in quotes`},
		{"profile and constant of one name", "[[observe]]", "[profile]\nJ = [1, 2, 3, 4]\n[[observe]]", `
m:31:1: constant or profile "J" for the second time, first in line 12 (give each constant or profile its own name)`},
		{"profile of another length", "[[observe]]", "[profile]\nh = [1, 2]\n[[observe]]", `
m:31:5: profile "h" has 2 numbers; expected one a rung, 4, or one a site, 4`},
		{"profile without formula", "[[observe]]", "[profile]\nh = { sede = 1 }\n[[observe]]", `
m:31:5: profile "h" has no key "formula" (add formula = "uniform(-W, W)")
m:31:7: unknown key "sede" in profile "h" (did you mean "seed"? keys here: formula, seed)`},
		{"unbalanced formula", "(n[l,j] - 1)", "(n[l,j] - 1", `
m:21:23: parenthesis opened here is not closed`},
		{"two faults", "-J b^+[a,j+1] b[a,j] + h.c.\"\n\n[[term]]\nname    = \"repulsion\"\nformula = \"U/2 n[l,j] (n[l,j] - 1)", "-J b^+ b[a,j] + h.c.\"\n\n[[term]]\nformula = \"U/2 n[l,j]) - 1", `
m:17:15: operator "b^+" without [leg,rung] (write b^+[leg,rung])
m:20:22: parenthesis closed here was not opened`},
		{"fault behind escapes", "\"U/2 n[l,j] (n[l,j] - 1)\"", "\"\"\"\n  U/2 \\\n  n[l,j] \\u0028n[l,j] - 1\"\"\"", `
m:23:10: parenthesis opened here is not closed`},
		{"fault in a condition", "each    = { l = \"legs\" }", "each    = { l = \"legs\" }\nwhere   = \"j = 2\"", `
m:23:14: single = in a condition (equality is written ==)`},
		{"each without a table", "each    = { l = \"legs\" }", "each    = \"legs\"", `
m:22:11: key "each" in [[term]] "repulsion" is a string; expected a table of indices, as in each = { l = "legs" }`},
		{"each over nothing known", "{ l = \"legs\" }", "{ l = \"leg\" }", `
m:22:17: index "l" runs over "leg" (expected "legs", "rungs", a range such as "1..rungs-1" or a list)`},
		{"each over a mixed list", "{ l = \"legs\" }", "{ l = [\"a\", 3.5] }", `
m:22:23: index "l" runs over a list with a number; expected names of legs or whole numbers`},
		{"each over an empty list", "{ l = \"legs\" }", "{ l = [] }", `
m:22:17: index "l" runs over an empty list`},
		{"term without formula", "formula = \"-J b^+[a,j+1] b[a,j] + h.c.\"", "", `
m:15:1: [[term]] "hopping" has no key "formula" (add formula = "...")`},
		{"sector of a wrong type", "N = 4", "N = true", `
m:25:5: key "N" in [sector] is true or false; expected a number, a string such as "1/2" or a formula such as "rungs"`},
		{"precision", "1e-8", "-1e-8", `
m:28:13: precision = -1e-08 in [solve] (expected a number above 0)`},
		{"memory", "precision = 1e-8", "memory = \"8 G\"", `
m:28:10: memory size "8 G"; expected a number and a unit, as in "8 GiB" or "500 MB"`},
		{"time", "precision = 1e-8", "time = \"2 hours\"", `
m:28:8: time "2 hours"; expected a positive time with units, as in "90s", "2h30m" or "1d12h"`},
		{"time without unit", "precision = 1e-8", "time = 60", `
m:28:8: key "time" in [solve] is a whole number; expected a string with a unit, such as "2h30m"`},
		{"states", "precision = 1e-8", "states = 0", `
m:28:10: states = 0 in [solve] is too small (expected 1 to 1000)`},
		{"charges", "precision = 1e-8", "charges = [1]", `
m:28:12: key "charges" in [solve] holds a whole number; expected strings in quotes`},
		{"observation without name", "name    = \"density\"\n", "", `
m:30:1: [[observe]] has no key "name" (add name = "density")`},
		{"kind of observation", "formula = \"n[a,j]\"", "kind = \"correlation\"", `
m:32:8: kind = "correlation" in [[observe]] "density" (did you mean "correlations"? expected one of: values, correlations, entanglement)`},
		{"three operators", "formula = \"n[a,j]\"", "kind = \"correlations\"\nof = [\"n[a,j]\", \"n[a,j]\", \"n[a,j]\"]", `
m:33:6: "of" in [[observe]] "density" holds 3 formulas; expected two (as in of = ["b^+[l,j]", "b[l,j]"])`},
		{"fault in the second operator", "formula = \"n[a,j]\"", "kind = \"correlations\"\nof = [\"n[a,j]\", \"n[a,j\"]", `
m:33:19: bracket opened here is not closed`},
		{"index in neither operator", "formula = \"n[a,j]\"", "kind = \"correlations\"\nof = [\"n[a,j]\", \"n[a,j]\"]\neach.l = \"legs\"", `
m:34:6: index "l" is in neither formula`},
		{"entanglement twice", "[[observe]]", "[[observe]]\nkind = \"entanglement\"\n[[observe]]\nkind = \"entanglement\"\nspectrum_to = 0\n[[observe]]", `
m:32:1: [[observe]] with kind = "entanglement" for the second time (keep one of them)
m:34:15: spectrum_to = 0 in [[observe]] (expected a number above 0)`},
		{"no TOML", "[ladder]", "[ladder", `
m:3:8: not valid TOML: expected ']' to close table name`},
		{"open quotes", "\"small\"", "\"small", `
m:1:15: not valid TOML: basic strings cannot have new lines`},
		{"number with a unit", "rungs = 4", "rungs = 4x", `
m:4:10: not valid TOML: strings must be quoted`},
		{"bytes", "title", "\xfe\xba\x00", `
m:1:1: not a text file: byte 0xfe is not valid UTF-8 (expected a model file in TOML, saved as UTF-8)`},
		{"control character", "small", "sm\x00ll", `
m:1:12: not a text file: control character 0x00 (expected a model file in TOML)`},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := Parse("m", []byte(change(t, c.old, c.new)))
			want := strings.TrimPrefix(c.want, "\n")
			if err == nil || err.Error() != want {
				t.Errorf("got  %v\nwant %s", err, want)
			}
		})
	}
}

// TestEmpty holds what a file without the sections that every model needs is told.
func TestEmpty(t *testing.T) {
	_, err := Parse("m", nil)
	want := `m:1:1: section [ladder] is missing (add [ladder] with rungs = 16)
m:1:1: no [[term]] section (add [[term]] with formula = "...")`
	if err == nil || err.Error() != want {
		t.Errorf("got %v", err)
	}
}
