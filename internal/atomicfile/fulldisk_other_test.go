//go:build !linux

package atomicfile

func limitedWrite(string) error { return nil }
