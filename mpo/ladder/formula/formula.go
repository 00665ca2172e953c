package formula

import "errors"

// Functions holds the functions of a formula and how many arguments each takes. sum and prod are syntax of their own (Fold).
var Functions = map[string]int{"exp": 1, "sin": 1, "cos": 1, "sqrt": 1, "abs": 1, "bessel": 2}

const (
	MaxLength = 1 << 16 // bytes of one formula
	MaxDepth  = 200     // parentheses, brackets and powers inside each other
)

// Parse reads a formula. The error is an *Error.
func Parse(src string) (Node, error) { return nil, errors.New("to come") }

// ParseCondition reads a condition such as "j % 2 == 0 and l != a". The error is an *Error.
func ParseCondition(src string) (Node, error) { return nil, errors.New("to come") }

// ParseRange reads "1..rungs-1", both ends included. The error is an *Error.
func ParseRange(src string) (from, to Node, err error) { return nil, nil, errors.New("to come") }

// Print writes n as a formula that reads back as n.
func Print(n Node) string { return "" }
