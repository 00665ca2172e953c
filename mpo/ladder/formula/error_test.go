package formula

import (
	"errors"
	"strings"
	"testing"
)

func TestFaults(t *testing.T) {
	for _, c := range []struct{ name, src, want string }{
		{"empty", "  ", "column 3: empty formula"},
		{"open parenthesis", "a*(b + (c", "column 8: parenthesis opened here is not closed"},
		{"open bracket", "n[a,j", "column 2: bracket opened here is not closed"},
		{"open call", "exp(x", "column 4: parenthesis opened here is not closed"},
		{"stray parenthesis", "a + b)", "column 6: parenthesis closed here was not opened"},
		{"stray bracket", "a]", "column 2: bracket closed here was not opened"},
		{"wrong closing", "(a]", `column 3: expected an operator sign or ")", found "]"`},
		{"nothing inside", "a ()", "column 3: nothing between the parentheses"},
		{"no indices", "n[]", "column 2: nothing between the brackets (write [leg,rung])"},
		{"bracket alone", "(a)[j]", "column 4: bracket without a name before it (indices follow a name, as in n[leg,rung])"},
		{"operator without bracket", "b^+ b[a,j]", `column 1: operator "b^+" without [leg,rung] (write b^+[leg,rung])`},
		{"superscript after the bracket", "b[a,j]^+", "column 8: superscript + in the wrong place (the superscript stands between the name and its bracket, as in b^+[leg,rung])"},
		{"missing operand", "a *", `column 4: expected a number, a name or "(" after "*", found the end of the formula`},
		{"two signs", "a * / b", `column 5: expected a number, a name or "(" after "*", found "/"`},
		{"begins with a sign", "* a", `column 1: a formula cannot begin with "*"`},
		{"two numbers", "φ + 2 3", "column 7: two numbers side by side (put a sign between them)"},
		{"conjugate as a factor", "2*h.c.", `column 3: h.c. is no factor: it stands alone after a + or - (write "+ h.c." or "- h.c." at the end of the formula or before a closing parenthesis)`},
		{"conjugate times something", "a + h.c. b", `column 5: h.c. is no factor: it stands alone after a + or - (write "+ h.c." or "- h.c." at the end of the formula or before a closing parenthesis)`},
		{"conjugate in a bracket", "n[a,j + h.c.]", "column 9: h.c. among numbers"},
		{"conjugate misspelt", "a + H.c.", "column 5: the Hermitian conjugate is written h.c. (small letters, two points)"},
		{"conjugate without its last point", "a + h.c", "column 5: the Hermitian conjugate is written h.c. (small letters, two points)"},
		{"operator in a bracket", "n[a,n[a,j]]", `column 5: "n" with brackets among numbers`},
		{"function without parentheses", "exp x", `column 1: function "exp" without its parentheses (write exp(...))`},
		{"function with bracket", "sin[x]", `column 1: function "sin" with a bracket (write sin(...))`},
		{"arguments", "bessel(1)", `column 1: function "bessel" takes 2 argument(s), not 1`},
		{"sum without index", "sum(n[a,j])", "column 5: sum without its index (write sum(k=first..last, ...))"},
		{"sum over a reserved name", "sum(exp=0..3, x)", `column 5: "exp" cannot be an index (choose another name)`},
		{"sum without range", "prod(k=3, x)", `column 9: expected ".." after the first value, found "," (write prod(k=first..last, ...))`},
		{"sum without body", "sum(k=0..3)", `column 11: expected a comma after the range, found ")" (write sum(k=first..last, ...))`},
		{"scalar product with a number", "S[a,j].2", `column 7: number begins with its decimal point (write a digit before the point, as in 0.5)`},
		{"scalar product with a name", "S[a,j].x", "column 7: a point joins two vectors of operators (write S[leg,rung].S[leg,rung])"},
		{"scalar product with superscript", "S[a,j].S^z[b,j]", "column 8: vector of operators with a superscript in a scalar product (write S without it)"},
		{"point before a digit", ".5 x", "column 1: number begins with its decimal point (write a digit before the point, as in 0.5)"},
		{"point after digits", "1. x", "column 2: number ends with its decimal point (write a digit after the point, as in 1.0, or leave the point out)"},
		{"too large", "1e999", "column 1: number out of range (the largest is about 1.8e308)"},
		{"comparison", "a == b", `column 3: comparison "==" in a formula (conditions belong into where)`},
		{"equation", "H = a", "column 3: = in a formula (write only what stands to the right of it)"},
		{"logic", "a and b", `column 3: "and" in a formula (conditions belong into where)`},
		{"dagger", "b†[a,j]", `column 2: "†" has no meaning here (the adjoint of an operator is written b^+[leg,rung])`},
		{"double star", "a**2", `column 2: "**" has no meaning here (a power is written ^)`},
		{"foreign character", "a § b", `column 3: character '§' has no meaning here`},
		{"not UTF-8", "φ\xff", "column 2: byte 0xff is not valid UTF-8 (save the file as UTF-8)"},
		{"second line", "a +\n  b)", "column 4: parenthesis closed here was not opened"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n, err := Parse(c.src)
			if err == nil {
				t.Fatalf("Parse(%q) = %s", c.src, shape(n))
			}
			if err.Error() != c.want {
				t.Errorf("Parse(%q)\n got %s\nwant %s", c.src, err, c.want)
			}
			if n != nil {
				t.Error("a tree came with the error")
			}
		})
	}
}

func TestConditionFaults(t *testing.T) {
	for _, c := range []struct{ name, src, want string }{
		{"number", "j", "column 1: number where a condition is expected (compare it with something, as in j % 2 == 0)"},
		{"single =", "j = 2", "column 3: single = in a condition (equality is written ==)"},
		{"chain", "0 <= j < 3", "column 8: chain of comparisons (join two comparisons by and)"},
		{"condition as number", "(j == 0) + 1 == 2", "column 4: condition where a number is expected"},
		{"number as condition", "j == 0 and 1", "column 12: number where a condition is expected (compare it with something, as in j % 2 == 0)"},
		{"C spelling", "j == 0 && l == a", `column 8: "&&" has no meaning here (write and)`},
		{"exclamation mark", "!(j == 0)", `column 1: "!" has no meaning here (write not)`},
		{"quotes", `l == "a"`, `column 6: "\"" has no meaning here (names stand without quotes)`},
		{"word without left side", "and j == 0", `column 1: "and" without a condition before it`},
		{"conjugate", "j == 0 + h.c.", "column 10: h.c. in a condition"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := ParseCondition(c.src)
			if err == nil || err.Error() != c.want {
				t.Errorf("ParseCondition(%q)\n got %v\nwant %s", c.src, err, c.want)
			}
		})
	}
}

func TestLimits(t *testing.T) {
	deep := strings.Repeat("(", MaxDepth) + "x" + strings.Repeat(")", MaxDepth)
	if _, err := Parse(deep); err != nil {
		t.Errorf("nested %d deep: %v", MaxDepth, err)
	}
	for name, src := range map[string]string{
		"parentheses": "(" + deep + ")",
		"signs":       strings.Repeat("-", 50000) + "x",
		"powers":      strings.Repeat("x^", 30000) + "x",
		"calls":       strings.Repeat("exp(", 1000),
	} {
		if _, err := Parse(src); err == nil || !strings.Contains(err.Error(), "nested more than") {
			t.Errorf("%s: %v", name, err)
		}
	}
	if _, err := Parse(strings.Repeat(" ", MaxLength+1)); err == nil || !strings.Contains(err.Error(), "longer than") {
		t.Errorf("long source: %v", err)
	}
	long := strings.Repeat("x+", MaxLength/2-1) + "x"
	n, err := Parse(long)
	if err != nil {
		t.Fatal(err)
	}
	if again, err := Parse(strings.ReplaceAll(Print(n), " ", "")); err != nil || shape(again.(*Binary).Y) != "x" {
		t.Errorf("long sum: %v", err)
	}
}

func TestCaret(t *testing.T) {
	_, err := Parse("a\nφ*(\tb\nc")
	var e *Error
	if !errors.As(err, &e) {
		t.Fatal(err)
	}
	if got, want := e.Caret(), "φ*(?b\n  ^"; got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	outside := Errorf("ab", 99, "", "beyond")
	if got := outside.Caret() + outside.Error(); got != "ab\n  ^column 3: beyond" {
		t.Error(got)
	}
}
