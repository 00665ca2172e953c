package modelfile

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"github.com/pelletier/go-toml/v2"
)

// plain turns a tree into what the TOML module decodes into; dated tells that it holds a date, which this package
// does not look into.
func plain(v *value) (x any, dated bool) {
	switch v.kind {
	case text:
		return v.text, false
	case integer:
		return v.integer, false
	case float:
		return v.float, false
	case boolean:
		return v.boolean, false
	case list:
		all := []any{}
		for _, item := range v.items {
			y, d := plain(item)
			all, dated = append(all, y), dated || d
		}
		return all, dated
	case group:
		return plainTable(v.table)
	}
	return nil, true
}

func plainTable(t *table) (m map[string]any, dated bool) {
	m = map[string]any{}
	for _, e := range t.entries {
		y, d := plain(e.value)
		m[e.key], dated = y, dated || d
	}
	return m, dated
}

var tomlSamples = []string{
	"", "title = \"x\"\n[ladder]\nrungs = 3\n[[leg]]\nname='a'\n[[leg]]\nname = 'b'\n",
	"a.b.c = 1\na.b.d = 2\n[a.b.e]\nf = 3", "[a.b]\nc = 1\n[a]\nd = 2", "[a]\nb.c = 1\n[a.b.d]\n", "x = { y = 1, z.w = [1, 2.5, \"s\", true] }",
	"n = 0x1F\no = 0o17\nb = 0b101\nm = -1_000\np = +5\nf = 1e3\ng = -inf\nh = +nan\nz = -0",
	"[[a]]\n[[a.b]]\nx=1\n[[a.b]]\n[[a]]\n[a.c]\n", "s = \"\"\"\n a\\\n   b \\u00e9\\t\"\"\"\nt = '''\r\nx'y'''", "l = [ # c\n 1,\n [2, 3],\n]",
	"d = 1979-05-27T07:32:00Z", "[a]\n[a]", "a = 1\na = 2", "[a.b]\n[a]\nb.c = 1", "a = [1]\n[[a]]", "[[a]]\n[a]", "a = {b = 1}\n[a.c]", "a.b = 1\n[a]", "a = {b.c = 1, b.d = 2}\na.b.e = 3",
	"x = 9223372036854775808", "x = 1e999", "x = ", "[x", "x = 'a\n'", "= 1", "a = 0x", "\"a b\".'c' = 1", "x = \"\\xe9\\e\"",
}

// TestTreeAgrees compares with the TOML module's own decoder: what it takes this package takes, with the same values.
func TestTreeAgrees(t *testing.T) {
	for _, s := range tomlSamples {
		compareTree(t, s)
	}
}

func compareTree(t *testing.T, s string) {
	t.Helper()
	src := newSource("f.toml", []byte(s))
	root := parse(src)
	var want map[string]any
	err := toml.Unmarshal([]byte(s), &want)
	accepted := root != nil && len(src.faults) == 0
	var got map[string]any
	if accepted {
		var dated bool
		if got, dated = plainTable(root); dated {
			return
		}
	}
	for _, f := range src.faults {
		if strings.HasPrefix(f.msg, "not a text file") || strings.HasPrefix(f.msg, "key of ") {
			return // stricter than TOML on purpose
		}
	}
	if accepted != (err == nil) {
		t.Errorf("%q: accepted %v, the TOML module says %v; %v", s, accepted, err, src.err())
		return
	}
	if accepted && !same(got, want) {
		t.Errorf("%q:\n got %v\nwant %v", s, got, want)
	}
}

// same is DeepEqual with nan equal to nan and an absent table equal to an empty one.
func same(a, b any) bool {
	switch x := a.(type) {
	case map[string]any:
		y, ok := b.(map[string]any)
		if !ok || len(x) != len(y) {
			return false
		}
		for k := range x {
			if !same(x[k], y[k]) {
				return false
			}
		}
		return true
	case []any:
		y := reflect.ValueOf(b)
		if y.Kind() != reflect.Slice || y.Len() != len(x) {
			return false
		}
		for i := range x {
			if !same(x[i], y.Index(i).Interface()) {
				return false
			}
		}
		return true
	case float64:
		y, ok := b.(float64)
		return ok && (x == y || math.IsNaN(x) && math.IsNaN(y))
	}
	return reflect.DeepEqual(a, b)
}

// TestPlaces checks where keys and values are found.
func TestPlaces(t *testing.T) {
	src := "\"φ\" = 'é'\n  [ leg . x ]\nlist = [1, [2], {a = 3}]\n [[ t ]]\nkey   =   true"
	root := parse(newSource("f", []byte(src)))
	at := func(off int) string { s, _, _ := strings.Cut(src[off:], "\n"); return s }
	x := root.byKey["leg"].value.table.byKey["x"].value
	l := x.table.byKey["list"].value
	tt := root.byKey["t"].value
	for _, c := range []struct{ name, got, want string }{
		{"text", at(root.byKey["φ"].value.at), "'é'"},
		{"header", at(x.at), "[ leg . x ]"},
		{"list", at(l.at), "[1, [2], {a = 3}]"},
		{"item", at(l.items[0].at), "1, [2], {a = 3}]"},
		{"inline table", at(l.items[2].at), "{a = 3}]"},
		{"value inside", at(l.items[2].table.byKey["a"].value.at), "3}]"},
		{"double header", at(tt.items[0].at), "[[ t ]]"},
		{"key", at(tt.items[0].table.byKey["key"].at), "key   =   true"},
		{"value", at(tt.items[0].table.byKey["key"].value.at), "true"},
	} {
		if c.got != c.want {
			t.Errorf("%s: at %q, want %q", c.name, c.got, c.want)
		}
	}
}

// TestInside follows every byte of a text to its place in the file: letters stand for themselves, all else is written as an escape or
// swallowed.
func TestInside(t *testing.T) {
	for name, raw := range map[string]string{
		"plain":          `"abc"`,
		"literal":        `'a\nb'`,
		"empty":          `""`,
		"escapes":        `"a\tb\"c\\d\u00e9e\U0001F600f\x41g\eh"`,
		"several lines":  "\"\"\"\r\nab\\\n   c \\ \r\n\t d\"e\"\"\"\"",
		"literal lines":  "'''\nab\ncd'''",
		"no first break": "\"\"\"ab\ncd\"\"\"",
	} {
		t.Run(name, func(t *testing.T) {
			file := "k = " + raw + "\n"
			src := newSource("f", []byte(file))
			root := parse(src)
			if root == nil {
				t.Fatal(src.err())
			}
			v := root.byKey["k"].value
			for k := range len(v.text) {
				c := v.text[k]
				at := src.inside(v, k)
				if c >= 'a' && c <= 'z' && file[at] != c {
					t.Errorf("byte %d, %q, found at %q", k, c, file[at:])
				}
				if k > 0 && at < src.inside(v, k-1) {
					t.Errorf("byte %d lies before byte %d", k, k-1)
				}
			}
		})
	}
}
