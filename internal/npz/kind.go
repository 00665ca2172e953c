package npz

import (
	"fmt"
	"unsafe"
)

// Element is the type of an array's elements.
type Element interface {
	float64 | complex128 | int64 | bool
}

// Kind is what an array holds.
type Kind byte

// The kinds of arrays.
const (
	Float64 Kind = iota + 1
	Complex128
	Int64
	Bool
	Unicode // text; only single strings can be read and written
)

// kinds lists the names and NumPy's type codes without byte order. The Unicode code is followed by the length.
var kinds = [...]struct {
	name, code string
	size       int // bytes an element; Unicode: bytes a code point
}{
	Float64:    {"float64", "f8", 8},
	Complex128: {"complex128", "c16", 16},
	Int64:      {"int64", "i8", 8},
	Bool:       {"bool", "b1", 1},
	Unicode:    {"unicode", "U", 4},
}

// String returns the name NumPy uses.
func (k Kind) String() string {
	if k < Float64 || k > Unicode {
		return fmt.Sprintf("kind(%d)", byte(k))
	}
	return kinds[k].name
}

// kindOf returns the kind of T.
func kindOf[T Element]() Kind {
	var zero T
	switch any(zero).(type) {
	case float64:
		return Float64
	case complex128:
		return Complex128
	case int64:
		return Int64
	}
	return Bool
}

// littleHost reports whether this machine stores the low byte first.
func littleHost() bool {
	one := uint16(1)
	return *(*byte)(unsafe.Pointer(&one)) == 1
}

// bytesOf returns the memory of x.
func bytesOf[T Element](x []T) []byte {
	if len(x) == 0 {
		return nil
	}
	return unsafe.Slice((*byte)(unsafe.Pointer(&x[0])), len(x)*int(unsafe.Sizeof(x[0])))
}

// swap reverses the bytes of every word of width 4 or 8 in place; width 1 leaves b as it is.
func swap(b []byte, width int) {
	for ; len(b) >= width && width > 1; b = b[width:] {
		for i, j := 0, width-1; i < j; i, j = i+1, j-1 {
			b[i], b[j] = b[j], b[i]
		}
	}
}

// word returns the width of the machine words an element consists of: complex numbers are two of them.
func (k Kind) word() int { return min(kinds[k].size, 8) }
