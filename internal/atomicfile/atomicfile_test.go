package atomicfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
)

// The test binary, started again with this variable set, plays another process.
const role = "ATOMICFILE_TEST_ROLE"

func TestMain(m *testing.M) {
	switch what, path, _ := strings.Cut(os.Getenv(role), ":"); what {
	case "":
		os.Exit(m.Run())
	case "hold": // take the lock, say so, keep it until standard input closes
		if _, err := Acquire(path); err != nil {
			fmt.Println(err)
			os.Exit(1)
		}
		fmt.Println("held")
		io.Copy(io.Discard, os.Stdin)
		os.Exit(0) // without Release, as a killed process
	case "write":
		if err := limitedWrite(path); err != nil {
			fmt.Println(err)
			os.Exit(3)
		}
		os.Exit(0)
	}
}

func text(s string) func(io.Writer) error {
	return func(w io.Writer) error {
		_, err := io.WriteString(w, s)
		return err
	}
}

// folder returns a folder with a file "result" of content "old".
func folder(t *testing.T) (dir, path string) {
	dir = t.TempDir()
	path = filepath.Join(dir, "result")
	require.NoError(t, Write(path, 0o644, text("old")))
	return dir, path
}

// requireOnly checks that the folder holds nothing but the file "result" of the given content.
func requireOnly(t *testing.T, dir, content string) {
	t.Helper()
	entries, err := os.ReadDir(dir)
	require.NoError(t, err)
	require.Len(t, entries, 1)
	b, err := os.ReadFile(filepath.Join(dir, "result"))
	require.NoError(t, err)
	require.Equal(t, content, string(b))
}

func TestWriteReplaces(t *testing.T) {
	dir, path := folder(t)
	requireOnly(t, dir, "old")
	large := strings.Repeat("new ", bufferSize)
	require.NoError(t, Write(path, 0o644, text(large)))
	requireOnly(t, dir, large)
	require.NoError(t, Write(path, 0o640, text("")))
	requireOnly(t, dir, "")
	info, err := os.Stat(path)
	require.NoError(t, err)
	require.Equal(t, fs.FileMode(0o640), info.Mode().Perm()|0o640)
}

func TestWriteInTheCurrentFolder(t *testing.T) {
	dir := t.TempDir()
	t.Chdir(dir)
	require.NoError(t, Write("result", 0o644, text("here")))
	requireOnly(t, dir, "here")
}

func TestAReaderSeesTheOldContentUntilTheEnd(t *testing.T) {
	dir, path := folder(t)
	require.NoError(t, Write(path, 0o644, func(w io.Writer) error {
		for range 3 {
			if err := text(strings.Repeat("x", bufferSize))(w); err != nil {
				return err
			}
			b, err := os.ReadFile(path)
			require.NoError(t, err)
			require.Equal(t, "old", string(b))
		}
		return nil
	}))
	requireOnly(t, dir, strings.Repeat("x", 3*bufferSize))
}

func TestFailuresKeepTheOldContent(t *testing.T) {
	broken := errors.New("broken")
	good := disk{create: createPartial, rename: os.Rename, syncFolder: syncFolder}
	closed := good
	closed.create = func(folder, base string, perm fs.FileMode) (*os.File, error) {
		f, err := createPartial(folder, base, perm)
		f.Close() // writing, syncing and closing fail from now on
		return f, err
	}
	unnamed := good
	unnamed.rename = func(string, string) error { return broken }
	uncreated := good
	uncreated.create = func(string, string, fs.FileMode) (*os.File, error) { return nil, broken }
	for _, row := range []struct {
		name string
		disk disk
		fill func(io.Writer) error
		want error
	}{
		{"the caller fails at once", good, func(io.Writer) error { return broken }, broken},
		{"the caller fails after a megabyte", good, func(w io.Writer) error {
			return errors.Join(text(strings.Repeat("x", 1<<20))(w), broken)
		}, broken},
		{"no file can be made", uncreated, text("new"), broken},
		{"nothing can be written", closed, text("new"), fs.ErrClosed},
		{"nothing can be synced", closed, text(""), fs.ErrClosed},
		{"the rename fails", unnamed, text("new"), broken},
	} {
		t.Run(row.name, func(t *testing.T) {
			dir, path := folder(t)
			err := write(path, 0o644, row.fill, row.disk)
			require.ErrorIs(t, err, row.want)
			require.ErrorContains(t, err, "write "+path)
			requireOnly(t, dir, "old")
		})
	}
	t.Run("the caller panics", func(t *testing.T) {
		dir, path := folder(t)
		require.Panics(t, func() { _ = Write(path, 0o644, func(io.Writer) error { panic("oh") }) })
		requireOnly(t, dir, "old")
	})
	t.Run("the folder cannot be synced", func(t *testing.T) {
		dir, path := folder(t)
		d := good
		d.syncFolder = func(string) error { return broken }
		require.ErrorIs(t, write(path, 0o644, text("new"), d), broken)
		requireOnly(t, dir, "new")
	})
}

func TestWriteRefusesOtherThings(t *testing.T) {
	dir := t.TempDir()
	require.ErrorContains(t, Write(dir, 0o644, text("x")), "not a regular file")
	require.ErrorIs(t, Write(filepath.Join(dir, "absent", "x"), 0o644, text("x")), fs.ErrNotExist)
}

func TestRemoveLeftovers(t *testing.T) {
	dir, path := folder(t)
	f, err := createPartial(dir, "result", 0o644)
	require.NoError(t, err)
	require.NoError(t, f.Close())
	keep := []string{"a.partial", ".result.partial", ".result.1234567g.partial", ".result.12345678"}
	for _, name := range keep {
		require.NoError(t, os.WriteFile(filepath.Join(dir, name), nil, 0o644))
	}
	require.NoError(t, RemoveLeftovers(dir))
	require.NoFileExists(t, f.Name())
	require.FileExists(t, path)
	for _, name := range keep {
		require.FileExists(t, filepath.Join(dir, name))
	}
	require.ErrorIs(t, RemoveLeftovers(filepath.Join(dir, "absent")), fs.ErrNotExist)
}

func TestLockWithinAProcess(t *testing.T) {
	path := filepath.Join(t.TempDir(), "lock")
	l, err := Acquire(path)
	require.NoError(t, err)
	var held *HeldError
	_, err = Acquire(path)
	require.ErrorAs(t, err, &held)
	require.Contains(t, held.Holder, fmt.Sprintf("process %d on ", os.Getpid()))
	require.ErrorContains(t, err, path+": in use by process")
	require.NoError(t, l.Release())
	l, err = Acquire(path)
	require.NoError(t, err)
	require.NoError(t, l.Release())
	_, err = Acquire(filepath.Join(path, "x"))
	require.Error(t, err)
}

func TestLockBetweenProcesses(t *testing.T) {
	path := filepath.Join(t.TempDir(), "lock")
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), role+"=hold:"+path)
	in, err := cmd.StdinPipe()
	require.NoError(t, err)
	out, err := cmd.StdoutPipe()
	require.NoError(t, err)
	require.NoError(t, cmd.Start())
	said := make([]byte, 5)
	_, err = io.ReadFull(out, said)
	require.NoError(t, err)
	require.Equal(t, "held\n", string(said))

	var held *HeldError
	_, err = Acquire(path)
	require.ErrorAs(t, err, &held)
	require.Contains(t, held.Holder, fmt.Sprintf("process %d on ", cmd.Process.Pid))
	require.NoError(t, in.Close())
	require.NoError(t, cmd.Wait())
	l, err := Acquire(path)
	require.NoError(t, err, "the lock ends with its process")
	require.NoError(t, l.Release())
}

func TestHolderOfAForeignFile(t *testing.T) {
	for _, content := range []string{"", "nonsense", "process 1\x1b[2J on x", strings.Repeat("x", 1000)} {
		path := filepath.Join(t.TempDir(), "lock")
		require.NoError(t, os.WriteFile(path, []byte(content), 0o644))
		f, err := os.Open(path)
		require.NoError(t, err)
		require.Empty(t, holder(f))
		require.NoError(t, f.Close())
	}
	require.ErrorContains(t, &HeldError{Path: "p"}, "in use by another process")
}

func ExampleWrite() {
	dir, err := os.MkdirTemp("", "")
	if err != nil {
		panic(err)
	}
	defer os.RemoveAll(dir)
	path := filepath.Join(dir, "result.json")
	for _, energy := range []string{"-1.0", "-1.5"} {
		err := Write(path, 0o644, func(w io.Writer) error {
			_, err := fmt.Fprintf(w, "{\"energy\": %s}\n", energy)
			return err
		})
		if err != nil {
			panic(err)
		}
	}
	b, _ := os.ReadFile(path)
	fmt.Print(string(bytes.TrimSpace(b)))
	// Output: {"energy": -1.5}
}
