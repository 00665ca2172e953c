package formula

import (
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

type kind byte

const (
	end kind = iota
	number
	name
	sign      // one of the punctuation marks in text
	conjugate // "h.c."
)

// token is a piece of the source. text is what stands there; super is the superscript of a name that a bracket follows, already
// taken out of the stream.
type token struct {
	kind  kind
	at    int
	text  string
	super string
	value float64
}

func (t token) is(text string) bool { return t.kind == sign && t.text == text }

// describe names the token in an error.
func (t token) describe() string {
	if t.kind == end {
		return "the end of the formula"
	}
	return strconv.Quote(t.text)
}

// signs lists the punctuation, longer marks first.
var signs = []string{"..", "==", "!=", "<=", ">=", "+", "-", "*", "/", "%", "^", "(", ")", "[", "]", ",", ".", "=", "<", ">"}

// strangers maps what people write by habit to how it is written here.
var strangers = []struct{ text, hint string }{
	{"**", "a power is written ^"},
	{"&&", "write and"}, {"||", "write or"}, {"!", "write not"},
	{"†", "the adjoint of an operator is written b^+[leg,rung]"},
	{"·", "write * or nothing"}, {"×", "write * or nothing"}, {"−", "write the plain minus sign -"}, {"–", "write the plain minus sign -"},
	{"≤", "write <="}, {"≥", "write >="}, {"≠", "write !="},
	{"{", "use parentheses"}, {"}", "use parentheses"},
	{"\"", "names stand without quotes"}, {"'", "names stand without quotes"},
	{"\u00a0", "use plain spaces"},
	{"_", "a name begins with a letter"},
}

// scan cuts the whole source into tokens; the last one has kind end.
func scan(src string) ([]token, error) {
	if len(src) > MaxLength {
		return nil, Errorf(src, MaxLength, "split it into several terms", "formula longer than %d bytes", MaxLength)
	}
	var tokens []token
	for at := 0; ; {
		for at < len(src) && strings.IndexByte(" \t\r\n", src[at]) >= 0 {
			at++
		}
		if at == len(src) {
			return append(tokens, token{kind: end, at: at}), nil
		}
		t, next, err := scanOne(src, at)
		if err != nil {
			return nil, err
		}
		tokens = append(tokens, t)
		at = next
	}
}

// scanOne reads the token that begins at the given byte and returns where the next may begin.
func scanOne(src string, at int) (token, int, error) {
	r, size := utf8.DecodeRuneInString(src[at:])
	switch {
	case r == utf8.RuneError && size <= 1:
		return token{}, 0, Errorf(src, at, "save the file as UTF-8", "byte 0x%02x is not valid UTF-8", src[at])
	case digit(src, at):
		return scanNumber(src, at)
	case unicode.IsLetter(r):
		return scanName(src, at)
	}
	for _, s := range strangers {
		if strings.HasPrefix(src[at:], s.text) && !strings.HasPrefix(src[at:], "!=") {
			return token{}, 0, Errorf(src, at, s.hint, "%q has no meaning here", s.text)
		}
	}
	for _, s := range signs {
		if strings.HasPrefix(src[at:], s) {
			if s == "." && digit(src, at+1) {
				return token{}, 0, Errorf(src, at, "write a digit before the point, as in 0.5", "number begins with its decimal point")
			}
			return token{kind: sign, at: at, text: s}, at + len(s), nil
		}
	}
	return token{}, 0, Errorf(src, at, "", "character %q has no meaning here", r)
}

func digit(src string, at int) bool { return at < len(src) && src[at] >= '0' && src[at] <= '9' }

// scanNumber reads digits, a fraction and an exponent. "0..3" is the number 0 and a range, "2e" the number 2 and a name.
func scanNumber(src string, at int) (token, int, error) {
	to := at
	digits := func() {
		for digit(src, to) {
			to++
		}
	}
	digits()
	if to < len(src) && src[to] == '.' && !strings.HasPrefix(src[to:], "..") {
		if !digit(src, to+1) {
			return token{}, 0, Errorf(src, to, "write a digit after the point, as in 1.0, or leave the point out", "number ends with its decimal point")
		}
		to++
		digits()
	}
	if to < len(src) && (src[to] == 'e' || src[to] == 'E') {
		k := to + 1
		if k < len(src) && (src[k] == '+' || src[k] == '-') {
			k++
		}
		if digit(src, k) {
			to = k
			digits()
		}
	}
	v, err := strconv.ParseFloat(src[at:to], 64)
	if err != nil {
		return token{}, 0, Errorf(src, at, "the largest is about 1.8e308", "number out of range")
	}
	return token{kind: number, at: at, text: src[at:to], value: v}, to, nil
}

// scanName reads a name, with its superscript where a bracket follows, or "h.c.".
func scanName(src string, at int) (token, int, error) {
	to := at
	for to < len(src) {
		r, size := utf8.DecodeRuneInString(src[to:])
		if r != '_' && !unicode.IsLetter(r) && !digit(src, to) {
			break
		}
		to += size
	}
	text := src[at:to]
	switch {
	case text == "h" && strings.HasPrefix(src[to:], ".c."):
		return token{kind: conjugate, at: at, text: "h.c."}, to + len(".c."), nil
	case (text == "h" || text == "H") && (strings.HasPrefix(src[to:], ".c") || strings.HasPrefix(src[to:], ".C")):
		return token{}, 0, Errorf(src, at, "", "the Hermitian conjugate is written h.c. (small letters, two points)")
	}
	t := token{kind: name, at: at, text: text}
	if to+1 < len(src) && src[to] == '^' && strings.IndexByte("+-xyz", src[to+1]) >= 0 {
		if rest := strings.TrimLeft(src[to+2:], " \t\r\n"); strings.HasPrefix(rest, "[") {
			t.super = src[to+1 : to+2]
			to += 2
		}
	}
	return t, to, nil
}
