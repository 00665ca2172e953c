//go:build !long

package mpo

// seeds is the number of random cases of each kind.
const seeds = 3
