package runfolder

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

const modelText = `title = "Vortices"   # a comment
[constants]
K = 1.3
phi = "0.8*pi"
`

var model = Origin{Text: []byte(modelText), Hash: "4f2a"}

func open(t *testing.T, dir string, origin Origin, opt Options) *Folder {
	t.Helper()
	f, err := Open(dir, origin, opt)
	require.NoError(t, err)
	t.Cleanup(func() { assert.NoError(t, f.Close()) })
	return f
}

// finish runs a model to its end.
func finish(t *testing.T, dir string, origin Origin) {
	t.Helper()
	f, err := Open(dir, origin, Options{})
	require.NoError(t, err)
	for k := range sample().States {
		require.NoError(t, os.WriteFile(f.StatePath(k), []byte("state"), 0o600))
	}
	r := sample()
	r.Model.Hash = origin.Hash
	require.NoError(t, f.WriteResult(r))
	require.NoError(t, f.Close())
}

// snapshot reads all files of a folder but the lock.
func snapshot(t *testing.T, dir string) map[string]string {
	t.Helper()
	files := map[string]string{}
	require.NoError(t, filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() || d.Name() == lockFile {
			return err
		}
		text, err := os.ReadFile(path)
		files[strings.TrimPrefix(path, dir)] = string(text)
		return err
	}))
	return files
}

func TestNewFolder(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "deep", "vortex.run")
	f := open(t, dir, model, Options{})
	assert.Equal(t, Empty, f.Standing())
	assert.Equal(t, dir, f.Dir())
	assert.Empty(t, f.Moved())
	text, err := ReadModel(dir)
	require.NoError(t, err)
	assert.Equal(t, modelText, string(text))
	s, err := ReadStatus(dir)
	require.NoError(t, err)
	assert.Equal(t, Starting, s.Phase)
	assert.Equal(t, "4f2a", s.Hash)
	assert.Equal(t, os.Getpid(), s.Process)
	assert.Equal(t, filepath.Join(dir, "state-3.npz"), f.StatePath(3))
	assert.Equal(t, "a/vortex.run", Default("a/vortex.toml"))
}

// TestResume goes through the life of a run: begun, stopped, finished.
func TestResume(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	f, err := Open(dir, model, Options{})
	require.NoError(t, err)
	checkpoint, err := f.Checkpoint()
	require.NoError(t, err)
	require.NoError(t, os.WriteFile(filepath.Join(checkpoint, "state.npz"), []byte("half"), 0o600))
	assert.ErrorContains(t, f.DropCheckpoint(), "stays until the results are written")
	require.NoError(t, f.Close())

	f, err = Open(dir, model, Options{})
	require.NoError(t, err)
	assert.Equal(t, Unfinished, f.Standing())
	r := sample()
	require.NoError(t, f.WriteResult(r))
	require.NoError(t, f.DropCheckpoint())
	assert.NoDirExists(t, checkpoint)
	require.NoError(t, f.Close())

	f, err = Open(dir, model, Options{}) // results, but the state's file is gone
	require.NoError(t, err)
	assert.Equal(t, Unfinished, f.Standing())
	require.NoError(t, f.Close())

	finish(t, dir, model)
	before := snapshot(t, dir)
	respelled := Origin{Text: []byte(modelText + "# the same\n"), Hash: model.Hash}
	f = open(t, dir, respelled, Options{})
	assert.Equal(t, Finished, f.Standing())
	assert.Equal(t, before, snapshot(t, dir))
}

// TestKilledEarly: a kill between any two of the first writes leaves a folder
// that the same command takes up.
func TestKilledEarly(t *testing.T) {
	for _, name := range []string{ModelFile, StatusFile} {
		dir := filepath.Join(t.TempDir(), "vortex.run")
		f, err := Open(dir, model, Options{})
		require.NoError(t, err)
		require.NoError(t, f.Close())
		if name == ModelFile {
			require.NoError(t, os.Remove(filepath.Join(dir, ModelFile)))
		} else { // nothing but a lock and half a file
			require.NoError(t, os.Remove(filepath.Join(dir, ModelFile)))
			require.NoError(t, os.Rename(filepath.Join(dir, StatusFile), filepath.Join(dir, ".status.json.01234567.partial")))
		}
		f = open(t, dir, model, Options{})
		text, err := ReadModel(dir)
		require.NoError(t, err)
		assert.Equal(t, modelText, string(text))
		assert.NoFileExists(t, filepath.Join(dir, ".status.json.01234567.partial"))
		assert.NotEqual(t, Finished, f.Standing())
	}
}

func TestConflict(t *testing.T) {
	for _, row := range []struct {
		name     string
		text     string
		settings map[string]string
		want     []string
	}{
		{"a value", strings.Replace(modelText, "1.3", "1.4", 1), nil, []string{"line 3: there K = 1.3, here K = 1.4"}},
		{"a new line", modelText + "U = 4\n", nil, []string{"line 5 is new here: U = 4"}},
		{"a lost line", strings.Replace(modelText, "K = 1.3\n", "", 1), nil, []string{"line 3 of the run's model.toml is not here: K = 1.3"}},
		{"spaces do not count", strings.ReplaceAll(strings.Replace(modelText, "1.3", "2", 1), " = ", "   =  "), nil,
			[]string{"line 3: there K = 1.3, here K = 2"}},
		{"a hash in quotes", strings.Replace(modelText, "Vortices", "Vortices #2", 1), nil,
			[]string{`line 1: there title = "Vortices", here title = "Vortices #2"`}},
		{"settings", modelText, map[string]string{"start": "old.run"}, []string{`start: there not given, here "old.run"`}},
		{"nothing to see", modelText, nil, []string{"the model files say the same", "there 4f2a, here 77aa", "another version"}},
		{"many", "a = 1\nb = 2\nc = 3\nd = 4\ne = 5\n", nil, []string{"and 2 more"}},
	} {
		t.Run(row.name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "vortex.run")
			finish(t, dir, model)
			before := snapshot(t, dir)
			_, err := Open(dir, Origin{[]byte(row.text), "77aa", row.settings}, Options{})
			var conflict *Conflict
			require.ErrorAs(t, err, &conflict)
			for _, want := range append(row.want, dir, "--fresh", "--out") {
				assert.ErrorContains(t, err, want)
			}
			assert.Equal(t, before, snapshot(t, dir))
		})
	}
}

func TestFresh(t *testing.T) {
	parent := t.TempDir()
	dir := filepath.Join(parent, "vortex.run")
	f := open(t, dir, model, Options{Fresh: true}) // nothing there
	assert.Empty(t, f.Moved())
	require.NoError(t, f.Close())
	finish(t, dir, model)
	before := snapshot(t, dir)
	other := Origin{Text: []byte("K = 2\n"), Hash: "77aa"}
	f = open(t, dir, other, Options{Fresh: true})
	assert.Equal(t, filepath.Join(parent, "vortex.old-1.run"), f.Moved())
	assert.Equal(t, before, snapshot(t, f.Moved()))
	assert.Equal(t, Empty, f.Standing())
	require.NoError(t, f.Close())
	f = open(t, dir, other, Options{Fresh: true})
	assert.Equal(t, filepath.Join(parent, "vortex.old-2.run"), f.Moved())
	require.NoError(t, f.Close())

	plain := filepath.Join(parent, "results")
	finish(t, plain, model)
	f = open(t, plain, other, Options{Fresh: true})
	assert.Equal(t, filepath.Join(parent, "results.old-1"), f.Moved())
}

// TestForeign: what is no run folder is left alone, with Fresh too.
func TestForeign(t *testing.T) {
	dir := t.TempDir()
	require.NoError(t, os.WriteFile(filepath.Join(dir, "thesis.tex"), []byte("dear"), 0o600))
	file := filepath.Join(dir, "thesis.tex")
	for _, opt := range []Options{{}, {Fresh: true}} {
		_, err := Open(dir, model, opt)
		assert.ErrorContains(t, err, `is no run folder: it holds "thesis.tex"`)
		assert.ErrorContains(t, err, "--out")
		_, err = Open(file, model, opt)
		assert.ErrorContains(t, err, "not a directory")
		_, err = Open(filepath.Join(file, "x.run"), model, opt)
		assert.ErrorContains(t, err, "not a directory")
	}
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	assert.Len(t, entries, 1)
	_, err = ReadModel(dir)
	assert.ErrorContains(t, err, "is no run folder")
}

func TestDamaged(t *testing.T) {
	for _, row := range []struct{ file, text, want string }{
		{ResultFile, "{", "result.json is damaged"},
		{ResultFile, strings.Replace(string(encode(t, sample())), "4f2a", "0000", 1), "has the hash 0000"},
		{StatusFile, "?", "status.json is damaged"},
		{StatusFile, `{"format": "x"}`, `has the format "x"`},
	} {
		dir := filepath.Join(t.TempDir(), "vortex.run")
		finish(t, dir, model)
		require.NoError(t, os.WriteFile(filepath.Join(dir, row.file), []byte(row.text), 0o600))
		before := snapshot(t, dir)
		_, err := Open(dir, model, Options{})
		assert.ErrorContains(t, err, row.want)
		assert.ErrorContains(t, err, "--fresh")
		assert.Equal(t, before, snapshot(t, dir))
		f := open(t, dir, model, Options{Fresh: true})
		assert.Equal(t, before, snapshot(t, f.Moved()))
	}
}

func TestInUse(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "vortex.run")
	f, err := Open(dir, model, Options{})
	require.NoError(t, err)
	for _, opt := range []Options{{}, {Fresh: true}} {
		_, err := Open(dir, model, opt)
		assert.ErrorContains(t, err, "is in use by process")
	}
	require.NoError(t, f.Close())
	require.NoError(t, f.Close(), "closing twice does no harm")
	open(t, dir, model, Options{})
}

// TestScratch: what a killed run left goes when the folder is opened; that of a run at work stays, whoever asks.
func TestScratch(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "a.run")
	f := open(t, dir, model, Options{})
	file := filepath.Join(f.ScratchPath(), "x")
	fill := func() {
		require.NoError(t, os.MkdirAll(f.ScratchPath(), 0o777))
		require.NoError(t, os.WriteFile(file, nil, 0o666))
	}
	fill()
	_, err := Open(dir, model, Options{})
	require.ErrorContains(t, err, "in use")
	require.FileExists(t, file)
	require.NoError(t, f.Close())
	require.NoDirExists(t, f.ScratchPath())
	fill()
	f = open(t, dir, model, Options{})
	require.NoDirExists(t, f.ScratchPath())
	require.NoError(t, f.Close())
}
