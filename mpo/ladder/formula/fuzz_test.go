package formula

import "testing"

var seeds = []string{
	"-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c.", "U/2 n[l,j] (n[l,j]-1)", "S[a,j].S[b,j]", "i*J*(exp(i*phi/2) b^+[a,j+1] b[a,j] - h.c.)",
	"sum(k=0..j-1, V/abs(j-k)^3 n[a,k])", "prod(k=j+1..m-1, exp(i*pi*S^z[a,k]))", "Z^+[a,j] X[a,j]^2", "bessel(0, 2.4)", "2 (3) (4)^2 x^(y[j]) -2^-3^2",
	"j % 2 == 0 and l != a", "not (j==0 or j>=3)", "((((", "1..rungs-1", "φ 2e 3e+5", "a + h.c. - h.c. + (b + h.c.)", "\xff", "x^y[j].S[a] x^(S[a].S[b])", "a--b*-c/(-d)",
}

// FuzzParse holds that the parsers do not panic and that what is printed reads back as the same tree.
func FuzzParse(f *testing.F) {
	for _, s := range seeds {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, src string) {
		for _, parse := range []func(string) (Node, error){Parse, ParseCondition} {
			n, err := parse(src)
			if err != nil {
				e := err.(*Error)
				if e.Offset < 0 || e.Offset > len(src) || e.Caret() == "" || e.Msg == "" {
					t.Errorf("%q: error out of place: %#v", src, e)
				}
				continue
			}
			text := Print(n)
			again, err := parse(text)
			if err != nil {
				if len(text) > MaxLength {
					continue
				}
				t.Fatalf("%q is printed as %q, which does not read: %v", src, text, err)
			}
			if shape(again) != shape(n) {
				t.Errorf("%q is printed as %q\n%s\n%s", src, text, shape(n), shape(again))
			}
		}
		if _, _, err := ParseRange(src); err != nil {
			_ = err.(*Error)
		}
	})
}
