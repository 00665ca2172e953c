// Package mpo holds matrix-product operators: a sum of operator strings written as one tensor a site, its algebra, its expectation
// values, and the projected Hamiltonians and environments that the search for ground states is made of.
//
// # Form
//
// An Operator on L sites has L+1 bonds and, for each site, a sparse list of entries: W[Left, Right] is a local operator between
// an index of the bond before and one of the bond behind the site, and
//
//	O = sum over paths i0 i1 ... iL of W0[i0, i1] W1[i1, i2] ... (a Kronecker product, site 0 running slowest).
//
// An index stands for a string of operators to the left of its bond and for what may follow it on the right. Two are special:
// Vacant, nothing placed yet, whose left part is the identity, and Done, all placed, whose right part is the identity.
// Both are exact, never the result of a compression, and absent where no term needs them. All others cross the bond. An index
// carries the charge that its left string adds; indices are sorted by it, and a bond is an axis of package block. The first
// bond is the one index Vacant of charge zero, the last the one index Done, whose charge is what O adds to a state.
//
// Jordan-Wigner signs are in the strings (package mpo/ladder writes them), so that tensors know of no fermions. Operators are
// immutable: every function returns a new one. The zero value is of no use.
//
// # Building
//
// Build walks the cuts from left to right. At each cut the terms that cross it are the edges of a graph between left strings and
// right strings; a minimum vertex cover (matching of Hopcroft and Karp 1973, Koenig's theorem) chooses which strings become
// indices, and gives the smallest bond that the pattern of terms allows (Ren, Li, Jiang, Shuai 2020). Strings are interned, a
// factor at a time, and known by numbers: no string is ever compared as a whole.
//
// Couplings may be tuned, as those of long-range interactions are, and local operators dependent as matrices, such as n and n²
// on a fermion site. So local operators are written in a basis of each site with the identity as its first element,
// and two sweeps remove indices whose left (right) strings depend on others: exact multiples first, then by elimination with the largest
// pivot, which leaves ones in the pivot rows; sets of strings that have nothing to do with each other are treated apart,
// and independent ones are left as they are, with the couplings as given. A dependence on the identity is handed to the Vacant (Done)
// index. Bonds then have the operator Schmidt rank of the crossing strings, plus the special indices.
//
// Rank is judged against the largest coupling in the set of strings at hand, never against the norm of the operator, which grows
// exponentially with the sites (Parker, Cao, Zaletel 2020): a weak link survives beside strong terms.
//
// # Values
//
// MatrixElement and Expectation contract from the left. Variance takes the energy off inside the operator and reports its own rounding
// error; how it is estimated stands there.
//
// # Errors
//
// Build returns an error for couplings that are not finite, terms of different charge, and complex strings in real arithmetic.
// Operators and states that do not fit together panic with both shapes, as do malformed strings.
package mpo
