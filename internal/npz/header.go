package npz

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

// Limits of what a header may say. NumPy itself allows 32 dimensions.
const (
	maxDims   = 32
	maxHeader = 1 << 16
)

const magic = "\x93NUMPY"

// Info is what the header of an array says.
type Info struct {
	Kind  Kind
	Shape []int

	chars   int  // code points of a Unicode element
	big     bool // high byte first
	fortran bool // first index runs fastest
}

// Len returns the number of elements, the product of the shape.
func (h Info) Len() int {
	n := 1
	for _, d := range h.Shape {
		n *= d
	}
	return n
}

// bytes returns the size of the data.
func (h Info) bytes() int64 {
	n := int64(h.Len()) * int64(kinds[h.Kind].size)
	if h.Kind == Unicode {
		n *= int64(h.chars)
	}
	return n
}

// header returns the .npy header of h, padded so that the data start at a multiple of 64 bytes.
func (h Info) header() []byte {
	descr := "<" + kinds[h.Kind].code
	switch h.Kind {
	case Bool:
		descr = "|" + kinds[h.Kind].code
	case Unicode:
		descr += strconv.Itoa(h.chars)
	}
	text := "{'descr': '" + descr + "', 'fortran_order': False, 'shape': " + shapeTuple(h.Shape) + ", }"
	const prefix = len(magic) + 4
	text += strings.Repeat(" ", 63-(prefix+len(text))%64) + "\n"
	b := append([]byte(magic), 1, 0)
	b = binary.LittleEndian.AppendUint16(b, uint16(len(text)))
	return append(b, text...)
}

// shapeTuple writes a shape as Python does: (), (3,), (2, 3).
func shapeTuple(shape []int) string {
	parts := make([]string, len(shape))
	for i, d := range shape {
		parts[i] = strconv.Itoa(d)
	}
	if len(parts) == 1 {
		return "(" + parts[0] + ",)"
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

// checkShape returns an error unless the shape can be written and has want elements.
func checkShape(shape []int, want int) error {
	if len(shape) > maxDims {
		return fmt.Errorf("%d dimensions; at most %d can be stored", len(shape), maxDims)
	}
	n, err := product(shape)
	if err != nil {
		return err
	}
	if n != want {
		return fmt.Errorf("shape %v asks for %d elements, got %d", shape, n, want)
	}
	return nil
}

// product multiplies the dimensions, refusing negative ones and more elements than could ever be addressed.
func product(shape []int) (int, error) {
	n := int64(1)
	for _, d := range shape {
		if d < 0 {
			return 0, fmt.Errorf("shape %v has a negative dimension", shape)
		}
		if d > 0 && n > math.MaxInt64/32/int64(d) {
			return 0, fmt.Errorf("shape %v has too many elements", shape)
		}
		n *= int64(d)
	}
	if n > math.MaxInt {
		return 0, fmt.Errorf("shape %v has too many elements", shape)
	}
	return int(n), nil
}

// readHeader reads the header of an .npy array, versions 1 to 3.
func readHeader(r io.Reader) (Info, int, error) {
	var start [12]byte
	if _, err := io.ReadFull(r, start[:10]); err != nil {
		return Info{}, 0, fmt.Errorf("not a NumPy array: the header is cut short: %w", noEOF(err))
	}
	if string(start[:6]) != magic {
		return Info{}, 0, errors.New("not a NumPy array: it does not begin with the .npy signature")
	}
	size, used := int(binary.LittleEndian.Uint16(start[8:])), 10
	switch version := start[6]; version {
	case 1:
	case 2, 3:
		if _, err := io.ReadFull(r, start[10:]); err != nil {
			return Info{}, 0, fmt.Errorf("the header is cut short: %w", noEOF(err))
		}
		used = 12
		if long := binary.LittleEndian.Uint32(start[8:]); long <= maxHeader {
			size = int(long)
		} else {
			return Info{}, 0, fmt.Errorf("the header has %d bytes; at most %d were expected", long, maxHeader)
		}
	default:
		return Info{}, 0, fmt.Errorf(".npy version %d.%d; versions 1 to 3 can be read", version, start[7])
	}
	text := make([]byte, size)
	if _, err := io.ReadFull(r, text); err != nil {
		return Info{}, 0, fmt.Errorf("the header is cut short: %w", noEOF(err))
	}
	h, err := parseHeader(string(text))
	return h, used + size, err
}

// noEOF keeps the end of the data from being taken for a regular end of a stream.
func noEOF(err error) error {
	if errors.Is(err, io.EOF) {
		return io.ErrUnexpectedEOF
	}
	return err
}

// headerFields are the keys of a header.
var headerFields = [...]string{"descr", "fortran_order", "shape"}

// parseHeader reads the Python dictionary of a header.
func parseHeader(text string) (Info, error) {
	p := literal{rest: text}
	var h Info
	seen := make(map[string]bool)
	p.want("{")
	for p.err == nil && !p.accept("}") {
		key := p.text()
		p.want(":")
		seen[key] = true
		switch key {
		case "descr":
			if p.accept("[") {
				p.err = errors.New("its elements are records; expected " + expectedTypes)
			} else if descr := p.text(); p.err == nil {
				p.err = h.setDescr(descr)
			}
		case "fortran_order":
			h.fortran = p.boolean()
		case "shape":
			h.Shape = p.tuple()
		default:
			p.fail("one of the keys %q", headerFields)
		}
		if !p.accept(",") {
			p.want("}")
			break
		}
	}
	if p.err == nil && strings.TrimSpace(p.rest) != "" {
		p.fail("the end of the header")
	}
	if p.err != nil {
		return Info{}, p.err
	}
	for _, key := range headerFields {
		if !seen[key] {
			return Info{}, fmt.Errorf("the header lacks %q", key)
		}
	}
	if _, err := product(h.Shape); err != nil {
		return Info{}, err
	}
	if h.chars > 1 && h.Len() > math.MaxInt/4/h.chars {
		return Info{}, fmt.Errorf("shape %v of strings of length %d has too many elements", h.Shape, h.chars)
	}
	return h, nil
}

const expectedTypes = "float64 (<f8), complex128 (<c16), int64 (<i8), bool (|b1) or unicode (<U...)"

// setDescr reads a type code such as <f8.
func (h *Info) setDescr(descr string) error {
	order, code := "", descr
	if descr != "" {
		order, code = descr[:1], descr[1:]
	}
	switch order {
	case "<", "|":
	case ">":
		h.big = true
	default:
		code = ""
	}
	for k := Float64; k < Unicode; k++ {
		if code == kinds[k].code {
			h.Kind = k
			return nil
		}
	}
	if length, ok := strings.CutPrefix(code, kinds[Unicode].code); ok {
		if n, err := strconv.ParseUint(length, 10, 28); err == nil {
			h.Kind, h.chars = Unicode, int(n)
			return nil
		}
	}
	return fmt.Errorf("its elements are of NumPy type %q; expected %s", descr, expectedTypes)
}

// literal is a reader of the few Python literals that occur in a header. After a mistake err is set and all else does nothing.
type literal struct {
	rest string
	err  error
}

func (p *literal) fail(format string, args ...any) {
	if p.err == nil {
		near := p.rest
		if len(near) > 20 {
			near = near[:20]
		}
		p.err = fmt.Errorf("the header is malformed at %q: expected %s", near, fmt.Sprintf(format, args...))
	}
}

func (p *literal) accept(token string) bool {
	if p.err != nil {
		return false
	}
	p.rest = strings.TrimLeft(p.rest, " \t\n")
	rest, ok := strings.CutPrefix(p.rest, token)
	if ok {
		p.rest = rest
	}
	return ok
}

func (p *literal) want(token string) {
	if !p.accept(token) {
		p.fail("%q", token)
	}
}

// text reads a quoted string. Escapes do not occur in headers and stand for themselves.
func (p *literal) text() string {
	quote := "'"
	if !p.accept(quote) {
		quote = `"`
		p.want(quote)
	}
	end := strings.Index(p.rest, quote)
	if end < 0 {
		p.fail("a closing quote")
	}
	if p.err != nil {
		return ""
	}
	s := p.rest[:end]
	p.rest = p.rest[end+1:]
	return s
}

func (p *literal) boolean() bool {
	if p.accept("True") {
		return true
	}
	p.want("False")
	return false
}

// tuple reads a tuple of non-negative integers.
func (p *literal) tuple() []int {
	shape := []int{}
	p.want("(")
	for p.err == nil && !p.accept(")") {
		if len(shape) == maxDims {
			p.fail("at most %d dimensions", maxDims)
			break
		}
		shape = append(shape, p.integer())
		if !p.accept(",") {
			p.want(")")
			break
		}
	}
	return shape
}

func (p *literal) integer() int {
	p.rest = strings.TrimLeft(p.rest, " ")
	end := 0
	for end < len(p.rest) && '0' <= p.rest[end] && p.rest[end] <= '9' {
		end++
	}
	n, err := strconv.Atoi(p.rest[:end])
	if err != nil {
		p.fail("a dimension")
		return 0
	}
	p.rest = p.rest[end:]
	return n
}
