package npz

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"
)

// chunk is the number of bytes that are read before more memory is asked for, and the size of conversion buffers.
const chunk = 1 << 20

// WriteArray writes data as one .npy array of the given shape, in C order.
func WriteArray[T Element](w io.Writer, shape []int, data []T) error {
	if err := checkShape(shape, len(data)); err != nil {
		return fmt.Errorf("npz: %w", err)
	}
	if _, err := w.Write(Info{Kind: kindOf[T](), Shape: shape}.header()); err != nil {
		return err
	}
	return writeData(w, data)
}

// ReadArray reads one .npy array up to the end of its data: its shape and its elements in C order.
func ReadArray[T Element](r io.Reader) (shape []int, data []T, err error) {
	h, _, err := readHeader(r)
	if err == nil {
		data, err = readData[T](r, h, chunk)
	}
	if err != nil {
		return nil, nil, fmt.Errorf("npz: %w", err)
	}
	return h.Shape, data, nil
}

func writeData[T Element](w io.Writer, data []T) error {
	if littleHost() {
		_, err := w.Write(bytesOf(data))
		return err
	}
	return writeSwapped(w, bytesOf(data), kindOf[T]().word())
}

// writeSwapped writes b with the bytes of each word reversed.
func writeSwapped(w io.Writer, b []byte, width int) error {
	buf := make([]byte, min(len(b), chunk))
	for len(b) > 0 {
		n := copy(buf, b)
		swap(buf[:n], width)
		if _, err := w.Write(buf[:n]); err != nil {
			return err
		}
		b = b[n:]
	}
	return nil
}

// readData reads the elements that h announces. No more than about limit bytes are allocated ahead of what has arrived.
func readData[T Element](r io.Reader, h Info, limit int64) ([]T, error) {
	kind := kindOf[T]()
	if h.Kind != kind {
		return nil, fmt.Errorf("it holds %v; expected %v", h.Kind, kind)
	}
	size := kinds[kind].size
	n := h.Len()
	data := make([]T, 0, min(int64(n), max(limit, chunk)/int64(size)))
	for len(data) < n {
		have := len(data)
		if have == cap(data) {
			data = slices.Grow(data, min(n-have, have))
		}
		next := data[have:min(n, cap(data))]
		b := bytesOf(next)
		if _, err := io.ReadFull(r, b); err != nil {
			clear(next)
			return nil, fmt.Errorf("its data are cut short: %w", noEOF(err))
		}
		if kind == Bool {
			// A Go bool other than 0 or 1 is undefined behaviour: it must not be looked at as one.
			for _, x := range b {
				if x > 1 {
					clear(b)
					return nil, fmt.Errorf("a bool is stored as %d; expected 0 or 1", x)
				}
			}
		}
		if h.big == littleHost() {
			swap(b, kind.word())
		}
		data = data[:have+len(next)]
	}
	if h.fortran && len(h.Shape) > 1 {
		data = fromFortran(data, h.Shape)
	}
	return data, nil
}

// fromFortran reorders data whose first index runs fastest to C order.
func fromFortran[T Element](data []T, shape []int) []T {
	out := make([]T, len(data))
	strides := make([]int, len(shape))
	step := 1
	for k, d := range shape {
		strides[k] = step
		step *= d
	}
	index := make([]int, len(shape))
	at := 0
	for i := range out {
		out[i] = data[at]
		for k := len(shape) - 1; k >= 0; k-- {
			index[k]++
			at += strides[k]
			if index[k] < shape[k] {
				break
			}
			at -= strides[k] * index[k]
			index[k] = 0
		}
	}
	return out
}

// encodeText returns s as NumPy stores it, four bytes a code point. NumPy drops zeros at the end of a string, hence none is taken.
func encodeText(s string) (Info, []byte, error) {
	switch {
	case !utf8.ValidString(s):
		return Info{}, nil, errors.New("the text is not valid UTF-8")
	case strings.HasSuffix(s, "\x00"):
		return Info{}, nil, errors.New("the text ends in a zero character, which NumPy would drop")
	}
	n := utf8.RuneCountInString(s)
	b := make([]byte, 0, 4*max(n, 1))
	for _, c := range s {
		b = binary.LittleEndian.AppendUint32(b, uint32(c))
	}
	if n == 0 {
		b = append(b, 0, 0, 0, 0)
	}
	return Info{Kind: Unicode, Shape: []int{}, chars: max(n, 1)}, b, nil
}

// readText reads the single string that h announces.
func readText(r io.Reader, h Info) (string, error) {
	if h.Kind != Unicode || len(h.Shape) > 0 {
		return "", fmt.Errorf("it holds %v of shape %s; expected a single unicode string", h.Kind, shapeTuple(h.Shape))
	}
	var s strings.Builder
	buf := make([]byte, min(4*h.chars, chunk))
	zeros := 0
	for left := 4 * h.chars; left > 0; left -= len(buf) {
		buf = buf[:min(left, len(buf))]
		if _, err := io.ReadFull(r, buf); err != nil {
			return "", fmt.Errorf("its text is cut short: %w", noEOF(err))
		}
		if h.big {
			swap(buf, 4)
		}
		for b := buf; len(b) > 0; b = b[4:] {
			c := binary.LittleEndian.Uint32(b)
			if c == 0 {
				zeros++
				continue
			}
			for ; zeros > 0; zeros-- {
				s.WriteByte(0)
			}
			if c > math.MaxInt32 || !utf8.ValidRune(rune(c)) {
				return "", fmt.Errorf("its text has the code point %#x, which is not a character", c)
			}
			s.WriteRune(rune(c))
		}
	}
	return s.String(), nil
}
