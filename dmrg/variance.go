package dmrg

import "rundle/internal/dense"

// The variance is computed where it takes no more than varianceShare of the operations of the search, or of a blink, varianceBlink, and no more than
// varianceRoom times the memory of the search, or a little room.
const (
	varianceShare = 0.25
	varianceBlink = 1e9
	varianceRoom  = 1
	littleRoom    = 64 << 20 // bytes
)

// varianceIsCheap forecasts mpo.Variance, two passes with the product of H with itself. That has up to the square of the bonds of H, of which about half
// remain when equal factors are merged: against the environments of H a factor of half the bond.
func (s *search[T]) varianceIsCheap() bool {
	e := s.engine
	var widest, elements, entries float64
	for i, b := range e.op.Bonds {
		d := float64(b.Dim())
		widest = max(widest, d)
		if i < len(e.op.Sites) {
			entries = max(entries, float64(len(e.op.Sites[i])))
		}
		if i > 0 && i < len(e.op.Sites) {
			chi := float64(e.psi.Bond(i - 1).Dim())
			elements = max(elements, chi*chi*d*d/2)
		}
	}
	flops := 2*e.growth*widest/2 + entries*entries
	size := 8.0
	if dense.IsComplex[T]() {
		size = 16
	}
	return flops <= max(varianceShare*e.flops, varianceBlink) && size*elements <= max(varianceRoom*s.present(), littleRoom)
}
