package npz

import (
	"archive/zip"
	"errors"
	"fmt"
	"io"
	"os"
	"slices"
	"strings"
)

// Reader reads the arrays of an .npz archive in any order.
type Reader struct {
	names   []string
	entries map[string]*zip.File
	size    int64
	file    *os.File // nil unless opened by Open
}

// Open opens an archive. Close it after use. Errors name the file.
func Open(path string) (*Reader, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	r, err := openFile(f)
	if err != nil {
		f.Close()
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	r.file = f
	return r, nil
}

func openFile(f *os.File) (*Reader, error) {
	info, err := f.Stat()
	if err != nil {
		return nil, err
	}
	if !info.Mode().IsRegular() {
		return nil, errors.New("it is not a regular file; expected an .npz archive")
	}
	return NewReader(f, info.Size())
}

// NewReader reads the directory of an archive of the given size.
func NewReader(r io.ReaderAt, size int64) (*Reader, error) {
	z, err := zip.NewReader(r, size)
	if err != nil {
		return nil, fmt.Errorf("not an .npz archive, or its end is missing: %w", err)
	}
	out := &Reader{entries: make(map[string]*zip.File), size: size}
	for _, f := range z.File {
		name, ok := strings.CutSuffix(f.Name, ".npy")
		if !ok {
			continue
		}
		if out.entries[name] != nil {
			return nil, fmt.Errorf("array %q is in the archive twice", name)
		}
		out.entries[name] = f
		out.names = append(out.names, name)
	}
	slices.Sort(out.names)
	return out, nil
}

// Close closes the file that Open opened.
func (r *Reader) Close() error {
	if r.file == nil {
		return nil
	}
	return r.file.Close()
}

// Names returns the names of the arrays, sorted.
func (r *Reader) Names() []string { return slices.Clone(r.names) }

// Has reports whether there is an array of this name.
func (r *Reader) Has(name string) bool { return r.entries[name] != nil }

// Digest returns the checksum of all arrays but those named, as Writer.Digest gave it. It reads the directory only; each array
// is held against it when read.
func (r *Reader) Digest(without ...string) uint32 {
	sums := make(map[string]uint32)
	for name, f := range r.entries {
		if !slices.Contains(without, name) {
			sums[name] = f.CRC32
		}
	}
	return digest(sums)
}

// Info returns kind and shape of an array. The data are not read and the checksum is not verified.
func (r *Reader) Info(name string) (Info, error) {
	var info Info
	err := r.visit(name, func(_ io.Reader, h Info) error {
		info = h
		return errUnread
	})
	if errors.Is(err, errUnread) {
		err = nil
	}
	return info, err
}

// Read returns shape and elements, in C order, of an array of T.
func Read[T Element](r *Reader, name string) (shape []int, data []T, err error) {
	err = r.visit(name, func(from io.Reader, h Info) error {
		shape = h.Shape
		data, err = readData[T](from, h, r.size)
		return err
	})
	if err != nil {
		return nil, nil, err
	}
	return shape, data, nil
}

// ReadText returns a single string.
func (r *Reader) ReadText(name string) (string, error) {
	var s string
	err := r.visit(name, func(from io.Reader, h Info) (err error) {
		s, err = readText(from, h)
		return err
	})
	if err != nil {
		return "", err
	}
	return s, nil
}

var errUnread = errors.New("the data were not asked for")

// visit calls read at the start of the data of an array, then verifies that they end there and have the right checksum.
func (r *Reader) visit(name string, read func(io.Reader, Info) error) (err error) {
	defer func() {
		if err != nil {
			err = fmt.Errorf("array %q: %w", name, err)
		}
	}()
	entry := r.entries[name]
	if entry == nil {
		return errors.New("it is not in the archive")
	}
	from, err := entry.Open()
	if err != nil {
		return damaged(err)
	}
	defer from.Close()
	h, used, err := readHeader(from)
	if err != nil {
		return damaged(err)
	}
	if want := uint64(used) + uint64(h.bytes()); entry.UncompressedSize64 != want {
		return fmt.Errorf("its entry has %d bytes; shape %s of %v needs %d", entry.UncompressedSize64, shapeTuple(h.Shape), h.Kind, want)
	}
	if err := read(from, h); err != nil {
		return damaged(err)
	}
	switch n, err := io.ReadFull(from, make([]byte, 1)); {
	case n > 0:
		return errors.New("its data are longer than announced: the file is damaged")
	case err != io.EOF:
		return damaged(err)
	}
	return nil
}

// damaged puts the package errors of the zip reader into words.
func damaged(err error) error {
	switch {
	case errors.Is(err, zip.ErrChecksum):
		return errors.New("its checksum is wrong: the file is damaged")
	case errors.Is(err, zip.ErrFormat):
		return errors.New("its entry is malformed: the file is damaged")
	case errors.Is(err, zip.ErrAlgorithm):
		return errors.New("its compression method is unknown; expected a stored or deflated entry")
	}
	return err
}
