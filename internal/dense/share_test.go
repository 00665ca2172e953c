//go:build !long

package dense

// share is the part, one in so many (odd, as there are sixteen pairs of operations), of the combinations of sizes and operations that tests of products try.
const share = 3
