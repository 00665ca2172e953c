package arch

import (
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"testing/fstest"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// TestModule reads the whole module.
func TestModule(t *testing.T) {
	root, err := filepath.Abs("../..")
	require.NoError(t, err)
	sources, err := read(os.DirFS(root))
	require.NoError(t, err)
	assert.True(t, slices.ContainsFunc(sources, func(s source) bool { return s.path == "internal/arch/check.go" }),
		"the walk does not see this package")
	for _, wrong := range check(sources) {
		t.Error(wrong)
	}
}

func TestTopLevel(t *testing.T) {
	entries, err := os.ReadDir("../..")
	require.NoError(t, err)
	text, err := os.ReadFile("../../.gitignore")
	require.NoError(t, err)
	assert.Empty(t, strangers(entries, strings.Fields(string(text))), "does not belong into the module's root")
}

// TestFaults shows that each rule bites.
func TestFaults(t *testing.T) {
	for _, row := range []struct {
		name string
		path string
		text string
		want string // "": nothing wrong
	}{
		{"down", "mps/a.go", `package mps; import "rundle/mps/block"`, ""},
		{"down past layers", "cmd/rundle/a.go", `package main; import "rundle/internal/fit"`, ""},
		{"the operators know the states", "mpo/a.go", `package mpo; import "rundle/mps"`, ""},
		{"up", "mps/a.go", `package mps; import "rundle/mpo"`, "above or beside"},
		{"up from a test", "mps/a_test.go", `package mps_test; import "rundle/dmrg"`, "above or beside"},
		{"sideways", "observables/a.go", `package observables; import "rundle/entanglement"`, "above or beside"},
		{"another file of the same line", "internal/npz/a.go", `package npz; import "rundle/internal/task"`, "above or beside"},
		{"itself", "mps/a_test.go", `package mps_test; import "rundle/mps"`, ""},
		{"another build tag", "mps/a.go", "//go:build netlib\n\npackage mps; import \"rundle/dmrg\"", "above or beside"},
		{"oracle in a test", "mps/a_test.go", `package mps; import "rundle/internal/exact"`, ""},
		{"oracle in the program", "cmd/rundle/a.go", `package main; import "rundle/internal/exact"`, "only test files"},
		{"oracle that peeks", "internal/exact/a.go", `package exact; import "rundle/internal/dense"`, "above or beside"},
		{"unknown package", "internal/misc/a.go", `package misc`, "stands in no layer"},
		{"unknown import", "mps/a.go", `package mps; import "rundle/internal/misc"`, "it stands in no layer"},
		{"example below", "examples/vortex/main.go", `package main; import "rundle/dmrg"`, ""},
		{"core with gonum", "mps/block/a.go", `package block; import "gonum.org/v1/gonum/mat"`, ""},
		{"core with a stranger", "dmrg/a.go", `package dmrg; import "github.com/alecthomas/kong"`, "the core depends"},
		{"core's tests are free", "dmrg/a_test.go", `package dmrg; import "pgregory.net/rapid"`, ""},
		{"driver is free", "cmd/rundle/a.go", `package main; import "github.com/alecthomas/kong"`, ""},
		{"netlib", "internal/dense/a.go", `package dense; import "gonum.org/v1/netlib/blas/netlib"`, ""},
		{"netlib elsewhere", "mps/a.go", `package mps; import "gonum.org/v1/netlib/blas/netlib"`, "only internal/dense may"},
		{"goroutine in the core", "dmrg/a.go", "package dmrg\n\nfunc f() { go f() }", "a.go:3: starts a goroutine"},
		{"goroutine in a closure", "mps/a.go", "package mps\n\nvar f = func() { go func() {}() }", "starts a goroutine"},
		{"goroutine in a test", "dmrg/a_test.go", "package dmrg\n\nfunc f() { go f() }", ""},
		{"goroutine in the pool", "internal/task/a.go", "package task\n\nfunc f() { go f() }", ""},
		{"goroutine in the driver", "cmd/rundle/a.go", "package main\n\nfunc f() { go f() }", ""},
	} {
		t.Run(row.name, func(t *testing.T) {
			sources, err := read(fstest.MapFS{row.path: {Data: []byte(row.text)}})
			require.NoError(t, err)
			wrong := check(sources)
			if row.want == "" {
				assert.Empty(t, wrong)
				return
			}
			require.Len(t, wrong, 1)
			assert.Contains(t, wrong[0], row.want)
			assert.Contains(t, wrong[0], row.path)
		})
	}
}

func TestRead(t *testing.T) {
	sources, err := read(fstest.MapFS{
		"doc.go":                        {Data: []byte("package rundle")},
		"internal/dense/_asm/main.go":   {Data: []byte("not even Go")},
		"internal/dense/testdata/x.go":  {Data: []byte("nor this")},
		"internal/browser/go.mod":       {Data: []byte("module browser")},
		"internal/browser/main_test.go": {Data: []byte("package browser")},
		".hidden/a.go":                  {Data: []byte("nothing")},
	})
	require.NoError(t, err)
	require.Len(t, sources, 1)
	assert.Empty(t, check(sources))
	_, err = read(fstest.MapFS{"mps/a.go": {Data: []byte("package")}})
	assert.ErrorContains(t, err, "mps/a.go")
}

func TestStrangers(t *testing.T) {
	root := fstest.MapFS{
		"doc.go": {}, "mps/a.go": {}, ".ci/run": {}, "rundle": {}, "vortex.run/model.toml": {}, "notes.txt": {}, "util/a.go": {},
	}
	entries, err := fs.ReadDir(root, ".")
	require.NoError(t, err)
	assert.Equal(t, []string{"notes.txt", "util"}, strangers(entries, []string{"*.test", "*.run/", "/rundle"}))
}

// TestTable: no package stands twice, and the lists name packages of the table.
func TestTable(t *testing.T) {
	seen := map[string]bool{}
	for _, line := range layers {
		for _, entry := range line {
			assert.False(t, seen[entry], "%s stands twice", entry)
			seen[entry] = true
		}
	}
	for _, pkg := range slices.Concat(core, testOnly, starters, []string{netlibPackage}) {
		assert.True(t, seen[pkg], "%s is not in the table", pkg)
	}
}
