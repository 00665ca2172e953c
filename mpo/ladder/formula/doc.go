// Package formula reads the formulas that physicists write for Hamiltonians and observables and turns them into a
// syntax tree, and prints such a tree back. It knows no physics: which names are operators, legs, constants or profiles is
// decided by whoever evaluates the tree.
//
// # Syntax
//
//	-J*exp(i*phi/2) b^+[a,j+1] b[a,j] + h.c.
//	U/2 n[l,j] (n[l,j] - 1)
//	sum(k=0..j-1, V/abs(j-k)^3 n[a,j] n[a,k])
//	S^z[a,j] prod(k=j+1..m-1, exp(i*pi*S^z[a,k])) S^z[a,m]
//	S[a,j].S[b,j]
//
// From loose to tight:
//
//	or                      conditions only
//	and
//	not
//	== != < <= > >=         one comparison, never a chain
//	+ -                     also "+ h.c." and "- h.c."
//	* / % and juxtaposition one level, left to right: "1/2 n[a,j]" is (1/2)*n[a,j], "a/b c" is (a/b)*c
//	- (sign)                -2^2 is -(2^2)
//	^                       to the right: 2^3^2 is 2^(3^2)
//	.                       S[a,j].S[b,j], between two names with brackets
//
// A name followed by a bracket is an [Indexed]: an operator on a site, a profile at a place. A superscript + - x y z
// directly after the name and directly before the bracket belongs to the name ("b^+[a,j]", "S^z[a,j]"); anywhere else ^ is a power,
// so a power of an indexed name stands after the bracket ("n[a,j]^2") and a name raised to an indexed name
// needs parentheses ("x^(y[j])"). The functions are those of [Functions], with sum and prod beside them; any other name
// before a parenthesis is a factor.
//
// "+ h.c." and "- h.c." add or subtract the Hermitian conjugate of all that stands before them inside the same
// parentheses, or in the whole formula if there are none.
//
// # Positions and errors
//
// Every node carries a byte offset into the source; [Error] counts columns in characters. The parser never panics,
// whatever it is given: sources longer than [MaxLength] bytes or nested deeper than [MaxDepth] are errors.
// For every tree t that Parse returns, Parse(Print(t)) is t again, up to positions.
//
// The parser is of the top-down kind (Pratt 1973).
package formula
