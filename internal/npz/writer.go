package npz

import (
	"archive/zip"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"io"
	"maps"
	"math"
	"slices"
	"strings"
)

// Writer writes the arrays of an .npz archive one after the other.
type Writer struct {
	zip  *zip.Writer
	sums map[string]uint32 // checksum by array
}

// NewWriter returns a writer of an archive. Without Close the archive cannot be read.
func NewWriter(w io.Writer) *Writer {
	return &Writer{zip: zip.NewWriter(w), sums: make(map[string]uint32)}
}

// Write appends an array: its name, which may contain slashes, its shape, and its elements in C order.
func Write[T Element](w *Writer, name string, shape []int, data []T) error {
	if err := checkShape(shape, len(data)); err != nil {
		return fmt.Errorf("npz: array %q: %w", name, err)
	}
	h := Info{Kind: kindOf[T](), Shape: shape}
	return w.entry(name, h, func(to io.Writer) error { return writeData(to, data) })
}

// WriteText appends a single string as a zero-dimensional array.
func (w *Writer) WriteText(name, s string) error {
	h, b, err := encodeText(s)
	if err != nil {
		return fmt.Errorf("npz: array %q: %w", name, err)
	}
	return w.entry(name, h, func(to io.Writer) error {
		_, err := to.Write(b)
		return err
	})
}

// entry runs fill twice: once into the checksum, which a stored entry has before its data, and once into the archive.
func (w *Writer) entry(name string, h Info, fill func(io.Writer) error) error {
	if name == "" || len(name) > maxHeader/2 || strings.HasPrefix(name, "/") || strings.ContainsAny(name, "\x00\\") {
		return fmt.Errorf("npz: array name %q; expected a relative, slash-separated name", name)
	}
	if _, ok := w.sums[name]; ok {
		return fmt.Errorf("npz: array %q is written twice", name)
	}
	sum, head := crc32.NewIEEE(), h.header()
	sum.Write(head)
	if err := fill(sum); err != nil {
		return err
	}
	w.sums[name] = sum.Sum32()
	to, err := createStored(w.zip, name+".npy", uint64(len(head))+uint64(h.bytes()), sum.Sum32())
	if err == nil {
		_, err = to.Write(head)
	}
	if err == nil {
		err = fill(to)
	}
	if err != nil {
		return fmt.Errorf("npz: array %q: %w", name, err)
	}
	return nil
}

// createStored begins an uncompressed entry. In raw mode archive/zip leaves the zip64 field out of the local header and adds it
// to the directory on its own, so it is given for the first and taken back for the second.
func createStored(z *zip.Writer, name string, size uint64, crc uint32) (io.Writer, error) {
	h := &zip.FileHeader{Name: name, Method: zip.Store, CRC32: crc, CompressedSize64: size, UncompressedSize64: size,
		ReaderVersion: 20, CreatorVersion: 20}
	h.ModifiedDate = 1<<5 | 1 //lint:ignore SA1019 CreateRaw writes this field only: the first day of zip's calendar
	if size >= math.MaxUint32 {
		h.ReaderVersion = 45
		h.Extra = binary.LittleEndian.AppendUint16(nil, 1)
		h.Extra = binary.LittleEndian.AppendUint16(h.Extra, 16)
		h.Extra = binary.LittleEndian.AppendUint64(h.Extra, size)
		h.Extra = binary.LittleEndian.AppendUint64(h.Extra, size)
	}
	to, err := z.CreateRaw(h)
	h.Extra = nil
	return to, err
}

// Digest returns a checksum of all arrays written so far, their names and contents: the CRC-32 of a line "name checksum" for each,
// sorted by name, the array's CRC-32 in eight hexadecimal digits.
func (w *Writer) Digest() uint32 { return digest(w.sums) }

func digest(sums map[string]uint32) uint32 {
	all := crc32.NewIEEE()
	for _, name := range slices.Sorted(maps.Keys(sums)) {
		fmt.Fprintf(all, "%s %08x\n", name, sums[name])
	}
	return all.Sum32()
}

// Close writes the directory of the archive. It does not close the underlying writer.
func (w *Writer) Close() error { return w.zip.Close() }
