//go:build long

package dense

const share = 1
