package atomicfile

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
)

// bufferSize makes small writes cheap; larger ones pass through.
const bufferSize = 1 << 18

// Temporary files are called .NAME.NUMBER.partial.
const partial = ".partial"

// Write replaces the file at path by what fill writes, or leaves it as it was and returns an error. A new file has the
// permissions perm, before umask. Errors name the file.
func Write(path string, perm fs.FileMode, fill func(io.Writer) error) error {
	return write(path, perm, fill, disk{create: createPartial, rename: os.Rename, syncFolder: syncFolder})
}

// disk is what write asks of the system; tests put failures in its way.
type disk struct {
	create     func(folder, base string, perm fs.FileMode) (*os.File, error)
	rename     func(from, to string) error
	syncFolder func(folder string) error
}

func write(path string, perm fs.FileMode, fill func(io.Writer) error, d disk) (err error) {
	defer func() {
		if err != nil {
			err = fmt.Errorf("write %s: %w", path, err)
		}
	}()
	// Found out now rather than after an hour of writing.
	if info, err := os.Lstat(path); err == nil && !info.Mode().IsRegular() && info.Mode()&fs.ModeSymlink == 0 {
		return errors.New("there is something else of this name that is not a regular file; choose another name")
	}
	folder, base := filepath.Split(path)
	if folder == "" {
		folder = "."
	}
	f, err := d.create(folder, base, perm)
	if err != nil {
		return err
	}
	done := false
	defer func() { // also when fill panics
		if !done {
			f.Close()
			os.Remove(f.Name())
		}
	}()
	if err := fillFile(f, fill); err != nil {
		return err
	}
	if err := d.rename(f.Name(), path); err != nil {
		return err
	}
	done = true
	return d.syncFolder(folder)
}

// fillFile writes, syncs and closes. An error of any of the three means that the content is not safe.
func fillFile(f *os.File, fill func(io.Writer) error) error {
	w := bufio.NewWriterSize(f, bufferSize)
	if err := fill(w); err != nil {
		return err
	}
	if err := w.Flush(); err != nil {
		return err
	}
	if err := f.Sync(); err != nil {
		return err
	}
	return f.Close()
}

// createPartial makes a new file beside base. It is opened with its final permissions, so that the umask counts.
func createPartial(folder, base string, perm fs.FileMode) (*os.File, error) {
	const attempts = 100
	for i := 0; ; i++ {
		name := filepath.Join(folder, fmt.Sprintf(".%s.%08x%s", base, rand.Uint32(), partial))
		f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, perm)
		if err == nil || !errors.Is(err, fs.ErrExist) || i == attempts {
			return f, err
		}
	}
}

// RemoveLeftovers removes the temporary files that killed processes left in a folder. Nobody may be writing there.
func RemoveLeftovers(folder string) error {
	entries, err := os.ReadDir(folder)
	if err != nil {
		return err
	}
	var all []error
	for _, e := range entries {
		if isPartial(e.Name()) && e.Type().IsRegular() {
			all = append(all, os.Remove(filepath.Join(folder, e.Name())))
		}
	}
	return errors.Join(all...)
}

// isPartial recognizes the names that createPartial gives.
func isPartial(name string) bool {
	stem, ok := strings.CutSuffix(name, partial)
	dot := strings.LastIndexByte(stem, '.')
	return ok && dot > 0 && stem[0] == '.' && len(stem)-dot == 9 && strings.Trim(stem[dot+1:], "0123456789abcdef") == ""
}
