//go:build amd64 && !purego

package dense

import "golang.org/x/sys/cpu"

// The first includes the second, and both what they use beside the vectors.
var (
	haveAVX512 = haveAVX2 && cpu.X86.HasAVX512F && cpu.X86.HasAVX512DQ && cpu.X86.HasAVX512VL && cpu.X86.HasAVX512BW
	haveAVX2   = cpu.X86.HasAVX2 && cpu.X86.HasFMA && cpu.X86.HasBMI2
)
