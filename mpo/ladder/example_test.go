package ladder_test

import (
	"errors"
	"fmt"

	"rundle/mpo/ladder"
)

func Example() {
	l, err := ladder.New(2, ladder.Open, ladder.Leg("a", ladder.Boson(3)), ladder.Leg("b", ladder.Boson(3)))
	if err != nil {
		fmt.Println(err)
		return
	}
	h, err := l.Hamiltonian(ladder.Constants{"J": 1, "K": 0.5, "U": 4},
		ladder.Term{Formula: "i*J*b^+[a,j+1] b[a,j] + h.c."},
		ladder.Term{Formula: "-K b^+[a,j] b[b,j] + h.c."},
		ladder.Term{Formula: "U/2 n[l,j] (n[l,j] - 1)", Each: ladder.Each{"l": "legs"}})
	if err != nil {
		fmt.Println(err)
		return
	}
	for i := range h.Poly.NumTerms() {
		fmt.Println(h.Poly.Format(i))
	}
	// Output:
	// -0.5 b^+[a,0] b[b,0]
	// -1*i b^+[a,0] b[a,1]
	// -0.5 b[a,0] b^+[b,0]
	// 1*i b[a,0] b^+[a,1]
	// 2 b^+[a,0]^2 b[a,0]^2
	// 2 b^+[b,0]^2 b[b,0]^2
	// -0.5 b^+[a,1] b[b,1]
	// -0.5 b[a,1] b^+[b,1]
	// 2 b^+[a,1]^2 b[a,1]^2
	// 2 b^+[b,1]^2 b[b,1]^2
}

func ExampleError() {
	l, _ := ladder.New(4, ladder.Open, ladder.Leg("a", ladder.Boson(3)))
	_, err := l.Hamiltonian(ladder.Constants{"J": 1}, ladder.Term{Name: "hopping", Formula: "J d^+[a,j+1] b[a,j] + h.c."})
	fmt.Println(err)
	var fault *ladder.Error
	if errors.As(err, &fault) {
		fmt.Println(fault.Caret())
	}
	// Output:
	// "hopping": column 3: unknown operator "d^+" on leg "a" (boson: b, b^+, n)
	// J d^+[a,j+1] b[a,j] + h.c.
	//   ^
}

func ExampleScope_Places() {
	l, _ := ladder.New(3, ladder.Open, ladder.Leg("s", ladder.Spin(1)))
	s, _ := ladder.NewScope(l, nil, ladder.Profile{Name: "h", Formula: "0.5*j"})
	places, _ := s.Places(ladder.Term{Formula: "h[j] S^z[s,j] S^z[s,j+d]", Each: ladder.Each{"d": "1..rungs-1"}})
	for _, p := range places {
		fmt.Println(p.At, p.Poly)
	}
	// Output:
	// [j = 0 d = 1] 0
	// [j = 0 d = 2] 0
	// [j = 1 d = 1] 0.5 S^z[s,1] S^z[s,2]
}

func ExampleSite_Mul() {
	b := ladder.Boson(5)
	lower, _ := b.Symbol("b", "")
	raise, _ := b.Symbol("b", "+")
	for _, w := range b.Mul(lower[0].Op, raise[0].Op) {
		fmt.Println(real(w.Coef), b.Format(w.Op, "a", 0))
	}
	// Output:
	// 1 1
	// 1 n[a,0]
}
