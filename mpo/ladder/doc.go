// Package ladder says what a Hamiltonian is before any tensor exists: sites on legs and rungs, sums of products of their
// operators with complex coefficients, the formulas that stand for them, the charges they conserve and the frames in
// which they are stored.
//
// # Sites and their operators
//
// A [Site] is a fermion, a two-component fermion with or without double occupation, a boson, a spin or a clock. Each has a basis of
// local operators, numbered by [OpID], closed under products and adjoints:
//
//	fermion    1, c, c^+, n
//	electron   u d with u of the mode up left of d of the mode down: 16
//	boson      (b^+)^p f(n) b^q, f the exponential of a polynomial
//	spin       phi(mid) (S^+)^r and phi(mid) (S^-)^r: (2s+1)^2
//	clock      Z^a X^b: q^2
//
// Here phi runs over polynomials and mid is the mean of S^z before and after the step, so that S^z S^+ is
// (mid + 1/2) S^+ and the adjoint of every element is a single element. Up to s = 2 the polynomials are powers; above that they are
// orthogonal on the values of S^z (Gram's discrete polynomials), because powers of equally spaced numbers are hopelessly
// ill-conditioned at s = 25.
//
// Formulas mean the algebra without a cut: what they say is normal-ordered first and only [Site.Matrix] cuts, so b b^+ is n+1 at
// n = max too, and c_up c_up^+ is 1 - n_up on a site that forbids double occupation.
//
// A string such as prod(k=1..m, exp(i*pi*n[a,k])) would have 2^m terms in this basis. Sums within a product of the formula are therefore interned
// as compounds, elements that stand for a sum; they behave like any other through Mul, Adjoint, Matrix, Raise and Odd. Strings
// that spell out to at most 64 terms are spelled out, which keeps everything short in one canonical form; longer ones stay compounds.
//
// # Polynomials
//
// A [Polynomial] is a sorted list of products of basis elements in the order of the sites, with a coefficient each, packed into two slabs: 8
// bytes a factor, 20 a term. Products of fermion operators are brought into this order with their signs; nothing later has to know
// the order in which a formula was written. Elements of different sites commute, or anticommute if both are odd.
//
// # Formulas
//
// A [Scope] is what the names in a formula mean. Terms are compiled once and evaluated place by place into products that are sorted and merged at the
// end: a million pairs take under a second. An index j runs over the rungs, the indices of [Each] over what they are given; a place is left out where
// the ladder is open and an index leads to a site that does not exist, and wraps where it is a ring. Constant rungs must exist. An index
// that stands for a leg counts as the leg's position, from 0, where a number is expected.
//
// # Errors and ownership
//
// What a user wrote wrong is an [*Error] with the term, the byte in its formula, and a way out; nothing in formulas, constants or
// profiles panics, and sizes are bounded ([MaxSites], [MaxTerms]). Misuse by code (a site out of range, polynomials of different ladders)
// panics. All exported values except [Builder] are immutable once made and may be shared between goroutines; slices that methods
// return without a copy say so. The zero values of Ladder, Scope, Site and Polynomial are not usable.
package ladder
