//go:build !unix

package atomicfile

// syncFolder does nothing: these systems do not sync folders.
func syncFolder(string) error { return nil }
