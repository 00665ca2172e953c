package dense

import (
	"sync"
	"unsafe"
)

// packBuffer is scratch memory of a product, kept between calls.
type packBuffer struct{ data []float64 }

var packPool = sync.Pool{New: func() any { return new(packBuffer) }}

// room returns space for n numbers, aligned to a cache line.
func (b *packBuffer) room(n int) unsafe.Pointer {
	if len(b.data) < n+8 {
		b.data = make([]float64, max(2*len(b.data), n+8, 4096))
	}
	at := unsafe.Pointer(&b.data[0])
	if off := int(uintptr(at) & 63); off != 0 {
		at = unsafe.Add(at, 64-off)
	}
	return at
}
