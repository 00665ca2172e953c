package atomicfile

import (
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"github.com/stretchr/testify/require"
)

// The temporary file is a link to a device that is always full.
func TestFullDisk(t *testing.T) {
	d := disk{rename: os.Rename, syncFolder: syncFolder}
	d.create = func(folder, base string, perm fs.FileMode) (*os.File, error) {
		name := filepath.Join(folder, ".result.00000000.partial")
		require.NoError(t, os.Symlink("/dev/full", name))
		return os.OpenFile(name, os.O_WRONLY, perm)
	}
	for _, size := range []int{1, 10 * bufferSize} {
		dir, path := folder(t)
		err := write(path, 0o644, text(strings.Repeat("x", size)), d)
		require.ErrorIs(t, err, syscall.ENOSPC)
		requireOnly(t, dir, "old")
	}
	require.FileExists(t, "/dev/null")
	_, err := os.Stat("/dev/full")
	require.NoError(t, err)
}

// limitedWrite writes more than the process may: the system refuses in the midst of the file.
func limitedWrite(path string) error {
	const limit = 1 << 20
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &syscall.Rlimit{Cur: limit, Max: limit}); err != nil {
		return err
	}
	return Write(path, 0o644, func(w io.Writer) error { return text(strings.Repeat("x", 2*limit))(w) })
}

func TestRefusedInTheMidst(t *testing.T) {
	dir, path := folder(t)
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), role+"=write:"+path)
	out, err := cmd.Output()
	var exit *exec.ExitError
	require.ErrorAs(t, err, &exit)
	require.Equal(t, 3, exit.ExitCode())
	require.Contains(t, string(out), "file too large")
	requireOnly(t, dir, "old")
}
