package runfolder

import (
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"strings"
)

// A Conflict is the error of a folder that holds a run of another model.
type Conflict struct {
	Dir         string
	Differences []string // the first ones, in words
}

func (e *Conflict) Error() string {
	return fmt.Sprintf("%s holds a run of another model:\n  %s\nuse --fresh to move that run aside, or --out to name another folder",
		e.Dir, strings.Join(e.Differences, "\n  "))
}

// shownDifferences is how many lines a Conflict names at most.
const shownDifferences = 3

// compare finds out how a run folder stands to a model.
func compare(dir string, origin Origin) (Standing, error) {
	status, err := ReadStatus(dir)
	if err != nil {
		return Empty, fmt.Errorf("%s: %w; use --fresh to move that run aside", dir, err)
	}
	if status.Hash != origin.Hash {
		there, err := os.ReadFile(filepath.Join(dir, ModelFile))
		if err != nil && !os.IsNotExist(err) {
			return Empty, unusable(dir, err)
		}
		return Empty, &Conflict{dir, differences(status, there, origin)}
	}
	if !exists(filepath.Join(dir, ResultFile)) {
		return Unfinished, nil
	}
	result, err := ReadResult(dir)
	if err != nil {
		return Empty, fmt.Errorf("%w; use --fresh to move that run aside", err)
	}
	if result.Model.Hash != origin.Hash {
		return Empty, fmt.Errorf("%s: %s has the hash %s, %s has %s; use --fresh to move that run aside",
			dir, ResultFile, result.Model.Hash, StatusFile, status.Hash)
	}
	for k := range result.States {
		if !exists(StatePath(dir, k)) {
			return Unfinished, nil
		}
	}
	return Finished, nil
}

// differences names what tells two runs apart: lines of the model files, or
// settings beside them.
func differences(status Status, there []byte, here Origin) []string {
	out := lineDifferences(meaningful(there), meaningful(here.Text))
	names := maps.Clone(here.Settings)
	if names == nil {
		names = map[string]string{}
	}
	maps.Copy(names, status.Settings)
	for _, name := range sortedKeys(names) {
		a, b := status.Settings[name], here.Settings[name]
		if a != b {
			out = append(out, fmt.Sprintf("%s: there %s, here %s", name, quoted(a), quoted(b)))
		}
	}
	if len(out) == 0 {
		return []string{fmt.Sprintf("the model files say the same, but their hashes differ: there %s, here %s; "+
			"that run was made by another version of the program", status.Hash, here.Hash)}
	}
	if more := len(out) - shownDifferences; more > 0 {
		out = append(out[:shownDifferences], fmt.Sprintf("and %d more", more))
	}
	return out
}

func quoted(s string) string {
	if s == "" {
		return "not given"
	}
	return fmt.Sprintf("%q", s)
}

// A line is a line of a model file without its comment and its spaces.
type line struct {
	number int
	text   string
}

// meaningful returns the lines that say something, their spaces evened out.
func meaningful(text []byte) []line {
	var out []line
	for i, raw := range strings.Split(string(text), "\n") {
		if s := strings.Join(strings.Fields(uncomment(raw)), " "); s != "" {
			out = append(out, line{i + 1, s})
		}
	}
	return out
}

// uncomment cuts a TOML comment off a line; a # within quotes is none.
func uncomment(s string) string {
	var quote rune
	for i, c := range s {
		switch {
		case quote == 0 && c == '#':
			return s[:i]
		case quote == 0 && (c == '"' || c == '\''):
			quote = c
		case c == quote:
			quote = 0
		}
	}
	return s
}

// lineDifferences pairs the lines that a longest common subsequence leaves
// over, in the order of the files.
func lineDifferences(there, here []line) []string {
	n, m := len(there), len(here)
	common := make([][]int32, n+1)
	for i := range common {
		common[i] = make([]int32, m+1)
	}
	for i := n - 1; i >= 0; i-- {
		for j := m - 1; j >= 0; j-- {
			if there[i].text == here[j].text {
				common[i][j] = common[i+1][j+1] + 1
			} else {
				common[i][j] = max(common[i+1][j], common[i][j+1])
			}
		}
	}
	var out []string
	var a, b []line
	flush := func() {
		for k := range max(len(a), len(b)) {
			out = append(out, pairDifference(a, b, k))
		}
		a, b = nil, nil
	}
	i, j := 0, 0
	for i < n || j < m {
		switch {
		case i < n && j < m && there[i].text == here[j].text:
			flush()
			i, j = i+1, j+1
		case j == m || i < n && common[i+1][j] >= common[i][j+1]:
			a, i = append(a, there[i]), i+1
		default:
			b, j = append(b, here[j]), j+1
		}
	}
	flush()
	return out
}

func pairDifference(there, here []line, k int) string {
	switch {
	case k >= len(there):
		return fmt.Sprintf("line %d is new here: %s", here[k].number, here[k].text)
	case k >= len(here):
		return fmt.Sprintf("line %d of the run's %s is not here: %s", there[k].number, ModelFile, there[k].text)
	}
	return fmt.Sprintf("line %d: there %s, here %s", here[k].number, there[k].text, here[k].text)
}
