// Package acceptance holds the checks of the whole line, from formulas to error-barred numbers, against answers that do not come
// from it: exact diagonalization written for the tests, free fermions, Bethe-ansatz equations, closed forms. It has test files
// only. The default suite runs small sizes; the tag long runs the full ones.
package acceptance
