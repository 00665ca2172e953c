package examples

import (
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

// root is the folder of the module.
const root = ".."

func read(t *testing.T, path ...string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(append([]string{root}, path...)...))
	require.NoError(t, err)
	return string(text)
}

// block returns what README shows between fences after the given beginning of a block.
func block(t *testing.T, beginning string) string {
	t.Helper()
	_, after, found := strings.Cut(read(t, "README.md"), "```"+beginning)
	require.True(t, found, "README shows %q", beginning)
	text, _, _ := strings.Cut(after, "```")
	return text
}

// rundle runs the driver in the module's root, as README does, and returns all that it says.
func rundle(t *testing.T, args ...string) string {
	t.Helper()
	c := exec.Command(driver, args...)
	c.Dir = root
	out, err := c.CombinedOutput()
	if err != nil {
		var exit *exec.ExitError
		require.ErrorAs(t, err, &exit)
	}
	return string(out)
}

// The program that README prints, the one in the package's comment and the one that CI builds in a module of its own are the same.
func TestReadmeProgram(t *testing.T) {
	_, built, found := strings.Cut(read(t, ".ci", "library", "main.go"), "package main\n")
	require.True(t, found)
	require.Equal(t, built, block(t, "go\npackage main\n"))
	var shown []string
	for line := range strings.Lines(read(t, "doc.go")) {
		if code, ok := strings.CutPrefix(line, "//\t"); ok {
			shown = append(shown, "\t"+code)
		}
	}
	program := shown[:len(shown)-1]
	require.Contains(t, shown[len(shown)-1], "go mod edit")
	require.Greater(t, len(program), 10)
	require.Contains(t, built, strings.Join(program, ""))
}

func TestReadmeModel(t *testing.T) {
	require.Contains(t, read(t, "examples", "frustrated-ladder", "model.toml"), block(t, "toml\n"))
}

func TestReadmeCheck(t *testing.T) {
	const command = "check examples/frustrated-ladder/model.toml"
	shown := strings.TrimSuffix(block(t, "\n$ ./rundle "+command+"\n"), "...\n")
	require.Greater(t, len(shown), 500)
	require.Contains(t, rundle(t, strings.Fields(command)...), shown)
}

func TestReadmeSlip(t *testing.T) {
	file := model(t, "frustrated-ladder", "Jrung S[a,j].S[b,j]", "Jrung S[a,j].S[c,j]")
	said := strings.ReplaceAll(rundle(t, "check", file), file, "slip.toml")
	require.Equal(t, block(t, "\n$ ./rundle check slip.toml\n"), said)
}

var energyLine = regexp.MustCompile(`(?m)^energy: +(\S+) ± (\S+)$`)

func TestReadmeSolve(t *testing.T) {
	shown := energyLine.FindStringSubmatch(block(t, "\n$ ./rundle solve examples/frustrated-ladder/model.toml\n"))
	require.Len(t, shown, 3)
	energy, err := strconv.ParseFloat(shown[1], 64)
	require.NoError(t, err)
	width, err := strconv.ParseFloat(shown[2], 64)
	require.NoError(t, err)
	s, _, _ := solve(t, "frustrated-ladder")
	require.InDelta(t, s.EnergyLimit, energy, width+s.EnergyError)
}

// The twist that README reads out of the saved state stays the same whatever the number of rungs.
func TestReadmeTwist(t *testing.T) {
	_, _, out := solve(t, "frustrated-ladder")
	_, added, _ := strings.Cut(block(t, "\n$ cp examples/frustrated-ladder/model.toml twist.toml\n"), "<<'EOF'\n")
	added, shown, _ := strings.Cut(added, "EOF\n")
	file := filepath.Join(t.TempDir(), "twist.toml")
	require.NoError(t, os.WriteFile(file, []byte(read(t, "examples", "frustrated-ladder", "model.toml")+added), 0o644))
	said := rundle(t, "read", out, file)
	_, said, found := strings.Cut(said, "\ntwist\n")
	require.True(t, found)
	want := values(t, shown[strings.Index(shown, "twist\n")+len("twist\n"):])
	require.Len(t, want, 8)
	got := values(t, said)
	for m, v := range want {
		require.InDelta(t, v, got[m], 1e-4, m)
	}
}

// values reads the lines "index value error" of a table.
func values(t *testing.T, table string) map[string]float64 {
	t.Helper()
	out := map[string]float64{}
	for line := range strings.Lines(table) {
		f := strings.Fields(line)
		if len(f) < 3 {
			break
		}
		if f[1] == "value" {
			continue
		}
		v, err := strconv.ParseFloat(f[1], 64)
		require.NoError(t, err)
		out[f[0]] = v
	}
	return out
}
