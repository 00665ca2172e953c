package modelfile

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// FuzzTree compares with the TOML module's decoder and follows texts back to their place.
func FuzzTree(f *testing.F) {
	for _, s := range tomlSamples {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		compareTree(t, s)
		src := newSource("f", []byte(s))
		root := parse(src)
		if root == nil {
			return
		}
		var follow func(*value)
		follow = func(v *value) {
			for k := range v.text {
				if v.kind != text {
					break
				}
				at := src.inside(v, k)
				if at < v.at || at >= v.end {
					t.Fatalf("%q: byte %d of %q found at %d, outside %d..%d", s, k, v.text, at, v.at, v.end)
				}
				if c := s[at]; c != v.text[k] && c != '\\' {
					t.Fatalf("%q: byte %d of %q found at %q", s, k, v.text, s[at:])
				}
			}
			for _, item := range v.items {
				follow(item)
			}
			if v.table != nil {
				for _, e := range v.table.entries {
					follow(e.value)
				}
			}
		}
		follow(&value{kind: group, table: root})
	})
}

// FuzzLoad holds that no bytes make the reader panic, and that every fault has a place.
func FuzzLoad(f *testing.F) {
	for _, s := range tomlSamples {
		f.Add(s)
	}
	models, _ := filepath.Glob("../../examples/*/model.toml")
	for _, m := range models {
		data, err := os.ReadFile(m)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(string(data))
	}
	f.Add(small)
	f.Fuzz(func(t *testing.T, s string) {
		if big.MatchString(s) {
			t.Skip("costly, not wrong")
		}
		m, err := Parse("f.toml", []byte(s))
		if err == nil {
			if m.Hash == "" || m.Hamiltonian == nil {
				t.Errorf("%q: an unfinished model", s)
			}
			return
		}
		faults := Faults(err)
		if len(faults) == 0 {
			t.Fatalf("%q: %v", s, err)
		}
		for _, e := range faults {
			if e.Line < 1 || e.Column < 1 || e.Line > 1+strings.Count(s, "\n") || e.Msg == "" || strings.Contains(e.Error(), "%!") {
				t.Errorf("%q: fault %+v", s, e)
			}
			e.Caret()
		}
	})
}
