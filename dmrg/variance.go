package dmrg

import (
	"math"

	"rundle/internal/dense"
	"rundle/mpo"
)

// The variance is computed where it takes no more than varianceShare of the operations of the search, or a blink of an eye, and no more memory than
// the search, or a little.
const (
	varianceShare  = 0.25
	varianceBlink  = 1e9      // operations
	varianceLittle = 64 << 20 // bytes
)

// varianceIsCheap forecasts mpo.Variance: two passes with the product of H with itself. Of the D² indices that a bond of the product begins with about
// half remain, for H and H commute. Environments then take D/2 times the operations of those of H, and compressing the product 2 D^6 a
// bond (measured on random pair couplings of 8 to 32 sites, D = 14 to 50).
func (s *search[T]) varianceIsCheap() bool {
	e := s.engine
	var widest, elements, compress float64
	for i := 1; i < len(e.op.Sites); i++ {
		d, chi := float64(e.op.Bonds[i].Dim()), float64(e.psi.Bond(i-1).Dim())
		widest = max(widest, d)
		elements = max(elements, chi*chi*d*d/2)
		compress += 2 * math.Pow(d, 6)
	}
	size := 8.0
	if dense.IsComplex[T]() {
		size = 16
	}
	return e.growth*widest+compress <= max(varianceShare*e.flops, varianceBlink) && size*elements <= max(s.present().whole(), varianceLittle)
}

// twoSiteVariance is that of mpo.TwoSiteVariance, from the environments that stand after a whole sweep; NaN where they do not. It takes about as
// much as half a sweep with one product a bond, and is not counted among the operations of the search.
func (e *engine[T]) twoSiteVariance() (float64, error) {
	if e.psi.Center != 0 || !e.envs.stand(0, 0) || e.unit != 1 {
		return math.NaN(), nil
	}
	v, _, err := mpo.TwoSiteVarianceFrom(e.psi, e.plan, e.envs.right, &e.work, e.pool)
	return v, err
}
