package block

import (
	"math/bits"

	"rundle/internal/dense"
)

// Scratch recycles slabs by size class, so that a plan that has run once runs again without allocating. The zero value is
// ready; a nil *Scratch allocates each time. It is not for concurrent use: one a goroutine that runs plans.
type Scratch[T dense.Scalar] struct {
	free [][][]T // by size class
	run  runner[T]
}

// sizeClass returns the smallest class that holds n > 0 elements and its size. There are four classes to a power of two, so that at
// most a quarter of a slab is wasted.
func sizeClass(n int) (class, size int) {
	if n <= 8 {
		return 0, 8
	}
	k := bits.Len(uint(n-1)) - 1 // 2^k < n <= 2^(k+1)
	quarter := 1 << (k - 2)
	step := (n - 1<<k + quarter - 1) / quarter // 1..4
	return 4*(k-3) + step, 1<<k + step*quarter
}

// Take returns a slab of n elements with arbitrary content.
func (s *Scratch[T]) Take(n int) []T {
	if n == 0 {
		return nil
	}
	class, size := sizeClass(n)
	if s == nil {
		return make([]T, n)
	}
	if class < len(s.free) {
		if last := len(s.free[class]) - 1; last >= 0 {
			x := s.free[class][last]
			s.free[class] = s.free[class][:last]
			return x[:n]
		}
	}
	return make([]T, n, size)
}

// Give returns a slab that Take handed out; the caller must not use it any more. Slabs from elsewhere are left to the collector.
func (s *Scratch[T]) Give(x []T) {
	if s == nil || cap(x) == 0 {
		return
	}
	class, size := sizeClass(cap(x))
	if size != cap(x) {
		return
	}
	for len(s.free) <= class {
		s.free = append(s.free, nil)
	}
	s.free[class] = append(s.free[class], x[:0])
}
