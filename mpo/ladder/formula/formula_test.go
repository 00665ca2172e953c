package formula

import (
	"fmt"
	"strconv"
	"strings"
	"testing"
)

// shape writes a tree with every pair of parentheses and no positions: the tests' own reading of a tree.
func shape(n Node) string {
	list := func(nodes []Node) string {
		var s []string
		for _, n := range nodes {
			s = append(s, shape(n))
		}
		return strings.Join(s, " ")
	}
	switch n := n.(type) {
	case *Number:
		return strconv.FormatFloat(n.Value, 'x', -1, 64)
	case *Name:
		return n.Ident
	case *Indexed:
		return fmt.Sprintf("<%s%s %s>", n.Name, n.Super, list(n.Indices))
	case *Dot:
		return "(dot " + shape(n.A) + " " + shape(n.B) + ")"
	case *Unary:
		return "(neg " + shape(n.X) + ")"
	case *Binary:
		op := string(n.Op)
		if n.Implicit {
			op = "_"
		}
		return "(" + op + " " + shape(n.X) + " " + shape(n.Y) + ")"
	case *Call:
		return "(" + n.Name + " " + list(n.Args) + ")"
	case *Fold:
		return fmt.Sprintf("(fold %v %s %s %s %s)", n.Product, n.Var, shape(n.From), shape(n.To), shape(n.Body))
	case *Conj:
		return fmt.Sprintf("(conj %v %s)", n.Minus, shape(n.X))
	case *Compare:
		return "(" + n.Op + " " + shape(n.X) + " " + shape(n.Y) + ")"
	case *Logic:
		return fmt.Sprintf("(logic %v %s %s)", n.Or, shape(n.X), shape(n.Y))
	case *Not:
		return "(not " + shape(n.X) + ")"
	}
	panic(fmt.Sprintf("node %T", n))
}

func TestParseShape(t *testing.T) {
	// Numbers appear as %x: 1 is 0x1p+00, 2 0x1p+01, 3 0x1.8p+01.
	num := strings.NewReplacer("#1", "0x1p+00", "#2", "0x1p+01", "#3", "0x1.8p+01")
	for _, c := range []struct{ name, src, want string }{
		{"juxtaposition binds like a product", "1/2 n[a,j]", "(_ (/ #1 #2) <n a j>)"},
		{"division to the left", "a/b c", "(_ (/ a b) c)"},
		{"remainder", "j % 2*3", "(* (% j #2) #3)"},
		{"sign is looser than power", "-2^2", "(neg (^ #2 #2))"},
		{"sign is tighter than product", "-a b", "(_ (neg a) b)"},
		{"power to the right", "2^3^2", "(^ #2 (^ #3 #2))"},
		{"sign in an exponent", "2^-3^2*x", "(* (^ #2 (neg (^ #3 #2))) x)"},
		{"differences to the left", "a-b-c", "(- (- a b) c)"},
		{"plus sign is dropped", "+a + b", "(+ a b)"},
		{"number against name", "2x", "(_ #2 x)"},
		{"exponent against name", "2e", "(_ #2 e)"},
		{"name before a parenthesis is a factor", "J(a+b)", "(_ J (+ a b))"},
		{"bracket then parenthesis", "U/2 n[l,j] (n[l,j]-1)", "(_ (_ (/ U #2) <n l j>) (- <n l j> #1))"},
		{"power after a bracket", "X[a,j]^2", "(^ <X a j> #2)"},
		{"superscript", "Z^+[a,j] S^z[b,j+1]", "(_ <Z+ a j> <Sz b (+ j #1)>)"},
		{"superscript minus, space before bracket", "S^- [a,j]", "<S- a j>"},
		{"superscript or power", "x^y[j] + x^(y[j]) + x^yy[j]", "(+ (+ <xy j> (^ x <y j>)) (^ x <yy j>))"},
		{"power of a name", "x^y", "(^ x y)"},
		{"subscript", "c_up^+[a,j]", "<c_up+ a j>"},
		{"scalar product", "-J S[a,j].S[b,j]^2", "(_ (neg J) (^ (dot <S a j> <S b j>) #2))"},
		{"conjugate of everything", "a + b c + h.c.", "(conj false (+ a (_ b c)))"},
		{"conjugate inside parentheses", "i*(b^+[a,j] - h.c.)", "(* i (conj true <b+ a j>))"},
		{"conjugate in an argument", "exp(x + h.c.)", "(exp (conj false x))"},
		{"terms after a conjugate", "a + h.c. - b", "(- (conj false a) b)"},
		{"sum", "sum(k=1..j-1, n[a,k])", "(fold false k #1 (- j #1) <n a k>)"},
		{"product", "prod(k=j+1..m-1, exp(i*pi*S^z[a,k]))", "(fold true k (+ j #1) (- m #1) (exp (* (* i pi) <Sz a k>)))"},
		{"two arguments", "bessel(1, 2)", "(bessel #1 #2)"},
		{"profile", "trap[j] h[a,j]", "(_ <trap j> <h a j>)"},
		{"several lines and letters", "φ +\n\tb_1", "(+ φ b_1)"},
		{"exponents", "1e0+1.0E+0", "(+ #1 #1)"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n, err := Parse(c.src)
			if err != nil {
				t.Fatal(err)
			}
			if got, want := shape(n), num.Replace(c.want); got != want {
				t.Errorf("Parse(%q) = %s, want %s", c.src, got, want)
			}
		})
	}
}

func TestParseConditionShape(t *testing.T) {
	num := strings.NewReplacer("#0", "0x0p+00", "#2", "0x1p+01", "#3", "0x1.8p+01")
	for _, c := range []struct{ name, src, want string }{
		{"comparison and conjunction", "j % 2 == 0 and l != a", "(logic false (== (% j #2) #0) (!= l a))"},
		{"and before or", "j==0 or j==2 and l<=a", "(logic true (== j #0) (logic false (== j #2) (<= l a)))"},
		{"not before and", "not j<2 and l>a", "(logic false (not (< j #2)) (> l a))"},
		{"parentheses of both sorts", "not (j==0 or (j+2)*3>=m)", "(not (logic true (== j #0) (>= (* (+ j #2) #3) m)))"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n, err := ParseCondition(c.src)
			if err != nil {
				t.Fatal(err)
			}
			if got, want := shape(n), num.Replace(c.want); got != want {
				t.Errorf("ParseCondition(%q) = %s, want %s", c.src, got, want)
			}
			again, err := ParseCondition(Print(n))
			if err != nil || shape(again) != shape(n) {
				t.Errorf("printed as %q: %v", Print(n), err)
			}
		})
	}
}

func TestParseRange(t *testing.T) {
	from, to, err := ParseRange("0..rungs-2")
	if err != nil {
		t.Fatal(err)
	}
	if got := Print(from) + " | " + Print(to); got != "0 | rungs - 2" {
		t.Error(got)
	}
	for _, src := range []string{"", "3", "0..", "..3", "0..3..4", "0..3)", "0..n[a,j]", "0.3"} {
		if _, _, err := ParseRange(src); err == nil {
			t.Errorf("ParseRange(%q) gave no error", src)
		}
	}
}

func TestPrint(t *testing.T) {
	for _, c := range []struct{ name, src, want string }{
		{"as written", "-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c.", ""},
		{"inner conjugate", "i*J*(exp(i*phi/2) b^+[a,j+1] b[a,j] - h.c.)", ""},
		{"needless parentheses go", "((U/2)) (n[l,(j)]) ((n[l,j]) - 1)", "U/2 n[l,j] (n[l,j] - 1)"},
		{"needed ones stay", "a/(b c) - (d - e)", ""},
		{"tight in brackets", "n[a, j + 1]", "n[a,j+1]"},
		{"tight in bounds", "sum(k = 0 .. j-1, V/abs(j - k)^3 n[a,j] n[a,k])", "sum(k=0..j-1, V/abs(j - k)^3 n[a,j] n[a,k])"},
		{"power of a sum and of a sign", "(a + b)^2 (-2)^2", ""},
		{"power of a power", "(a^b)^c^d", ""},
		{"numbers do not meet", "2 (3) (4)^2 + 2 (4)^2", "2 (3) 4^2 + 2 (4)^2"},
		{"sign on the right", "a - -b*-c (-d)", ""},
		{"superscript does not arise", "x^(y[j])^2 + x^(z[j].S[j])", ""},
		{"conjugate as a summand", "a + (b + h.c.)", ""},
		{"small numbers", "0.00000001 x", "1e-08 x"},
	} {
		t.Run(c.name, func(t *testing.T) {
			n, err := Parse(c.src)
			if err != nil {
				t.Fatal(err)
			}
			want := c.want
			if want == "" {
				want = c.src
			}
			if got := Print(n); got != want {
				t.Errorf("Print(Parse(%q)) = %q, want %q", c.src, got, want)
			}
			again, err := Parse(want)
			if err != nil || shape(again) != shape(n) {
				t.Errorf("%q reads back as another tree (%v)", want, err)
			}
		})
	}
}

func TestPositions(t *testing.T) {
	src := "φ*n[a,j] + b^+[a,j+1] x - h.c."
	n, err := Parse(src)
	if err != nil {
		t.Fatal(err)
	}
	var got []string
	Walk(n, func(n Node) bool {
		got = append(got, fmt.Sprintf("%T@%s", n, strings.TrimSpace(src[n.Pos():])[:1]))
		return true
	})
	want := "*formula.Conj@- *formula.Binary@+ *formula.Binary@* *formula.Name@\xcf *formula.Indexed@n *formula.Name@a *formula.Name@j " +
		"*formula.Binary@x *formula.Indexed@b *formula.Name@a *formula.Binary@+ *formula.Name@j *formula.Number@1 *formula.Name@x"
	if g := strings.Join(got, " "); g != want {
		t.Errorf("got  %s\nwant %s", g, want)
	}
}
