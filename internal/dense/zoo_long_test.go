//go:build long

package dense

// Sizes past the last change of a block width.
func init() { zooLargeSizes = append(zooLargeSizes, 256, 301, 400, 512) }
