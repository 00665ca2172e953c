package modelfile

import (
	"bytes"
	"strings"
	"unicode/utf8"
)

// inside returns where in the file byte k of a string's text stands, so that a fault in a formula is shown at its place even
// behind escapes.
func (s *source) inside(v *value, k int) int {
	if v.kind != text {
		return v.at
	}
	raw := s.data[v.at:v.end]
	quote, at := raw[0], 1
	if bytes.HasPrefix(raw, []byte{quote, quote, quote}) && len(raw) >= 6 {
		at = 3
		at += lineEnd(raw[at:]) // a line end right after the quotes is no part of the text
	}
	for at < len(raw) {
		width, length := 1, 1
		if raw[at] == '\\' && quote == '"' {
			width, length = escape(raw[at:])
		}
		if length > k {
			break
		}
		k -= length
		at += width
	}
	return v.at + min(at, len(raw))
}

// lineEnd is the length of the line end at the front of raw, 0 if there is none.
func lineEnd(raw []byte) int {
	switch {
	case bytes.HasPrefix(raw, []byte("\n")):
		return 1
	case bytes.HasPrefix(raw, []byte("\r\n")):
		return 2
	}
	return 0
}

// escape measures the escape at the front of raw: its bytes in the file and in the text.
func escape(raw []byte) (width, length int) {
	digits := map[byte]int{'x': 2, 'u': 4, 'U': 8}[raw[1]]
	if digits > 0 {
		var r rune
		for _, c := range raw[2 : 2+digits] {
			r = r<<4 | rune(strings.IndexByte("0123456789abcdef", c|0x20)) // the parser has seen the digits
		}
		return 2 + digits, utf8.RuneLen(r)
	}
	if strings.IndexByte(" \t\r\n", raw[1]) < 0 {
		return 2, 1
	}
	// A backslash at the end of a line swallows the white space after it.
	rest := bytes.TrimLeft(raw[1:], " \t\r\n")
	return len(raw) - len(rest), 0
}
