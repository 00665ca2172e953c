package dmrg

import (
	"errors"
	"fmt"
	"hash/crc32"
	"os"
	"path/filepath"
	"unsafe"

	"rundle/internal/dense"
)

// depot is a folder for environments that do not fit the memory. It is made when the first one goes there, and removed with all that is in
// it at the end of the search.
type depot struct {
	parent string // "": that of temporary files
	dir    string // "" until it is needed
	files  int    // named so far
}

// name returns the path of a new file.
func (d *depot) name() (string, error) {
	if d.dir == "" {
		if d.parent != "" {
			if err := os.MkdirAll(d.parent, 0o777); err != nil {
				return "", err
			}
		}
		dir, err := os.MkdirTemp(d.parent, "rundle-environments-")
		if err != nil {
			return "", err
		}
		d.dir = dir
	}
	d.files++
	return filepath.Join(d.dir, fmt.Sprintf("environment-%d", d.files)), nil
}

// remove gives the disk free. What is left behind is a courtesy to nobody, but no reason to fail.
func (d *depot) remove() {
	if d != nil && d.dir != "" {
		_ = os.RemoveAll(d.dir)
		d.dir = ""
	}
}

// trouble words a failure of the disk.
func (d *depot) trouble(err error) error {
	where := d.dir
	if where == "" {
		where = d.parent
	}
	if where == "" {
		where = os.TempDir()
	}
	return fmt.Errorf("dmrg: environments beyond the cap on memory go to %s: %w; make room there, name another folder (Options.Scratch), or allow more memory", where, err)
}

// filed is an environment on disk.
type filed struct {
	path string
	sum  uint32
}

// store puts a slab into the file, whose name it has.
func store[T dense.Scalar](f *filed, slab []T) error {
	bytes := bytesOf(slab)
	f.sum = crc32.ChecksumIEEE(bytes)
	return os.WriteFile(f.path, bytes, 0o600)
}

// restore fills a slab from the file.
func restore[T dense.Scalar](f *filed, slab []T) error {
	file, err := os.Open(f.path)
	if err != nil {
		return err
	}
	defer file.Close()
	bytes := bytesOf(slab)
	for done := 0; done < len(bytes); {
		n, err := file.Read(bytes[done:])
		if done += n; err != nil && done < len(bytes) {
			return fmt.Errorf("%s: %w", f.path, err)
		}
	}
	if crc32.ChecksumIEEE(bytes) != f.sum {
		return errors.New(f.path + ": the disk returned other bytes than were written")
	}
	return nil
}

// bytesOf shows a slab as it lies in memory.
func bytesOf[T dense.Scalar](slab []T) []byte {
	if len(slab) == 0 {
		return nil
	}
	return unsafe.Slice((*byte)(unsafe.Pointer(&slab[0])), len(slab)*int(unsafe.Sizeof(slab[0])))
}
