package formula_test

import (
	"errors"
	"fmt"

	"rundle/mpo/ladder/formula"
)

func ExampleParse() {
	n, err := formula.Parse("(U/2) * n[l,j] ((n[l,j]) - 1)")
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Println(formula.Print(n))
	// Output: U/2*n[l,j] (n[l,j] - 1)
}

func ExampleError() {
	_, err := formula.Parse("-J*(b^+[a,j+1] b[a,j] + h.c.")
	var fault *formula.Error
	if errors.As(err, &fault) {
		fmt.Println(fault)
		fmt.Println(fault.Caret())
	}
	// Output:
	// column 4: parenthesis opened here is not closed
	// -J*(b^+[a,j+1] b[a,j] + h.c.
	//    ^
}
