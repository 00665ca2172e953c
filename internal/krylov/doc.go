// Package krylov finds extreme eigenpairs of Hermitian operators that are known by their action alone: apply(dst, src) on flat
// slices.
//
// Lowest is Lanczos' iteration (Lanczos 1950) with full reorthogonalization. The space stays small in its use (some tens of vectors),
// so that the orthogonality that finite arithmetic loses can simply be restored: after the two terms of the recurrence one round of classical
// Gram-Schmidt against all vectors, and another where the first took away much, are enough (Giraud, Langou, Rozloznik, van den Eshof 2005). No ghost eigenvalues appear and the residual
// comes for free from the tridiagonal matrix (Paige 1980).
//
// Memory. All vectors live in a Workspace: zero value ready, grown to what a call needs, kept for the next, for one caller at a
// time. apply may keep nothing it was given; dst and src never overlap and dst arrives with old numbers in it.
//
// Not converging is a result, not an error: see Result and Reason. A wrong length panics.
package krylov
