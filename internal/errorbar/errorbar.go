package errorbar

import (
	"math"
	"math/cmplx"
)

// Figures of the error bars, set on the tuning half of internal/calibration.
const (
	leastRatio  = 0.06 // bounds on the ratio of the square roots of two discarded weights
	mostRatio   = 0.8  //
	leastSpread = 0.6  // of the root mean square of an observation's changes
	truncates   = 3    // residual of truncation, in roots of the discarded weight
	rounding    = 1e-13
)

// Kind is what the bars are for.
type Kind struct {
	excess   float64 // part of the excess of energy over the gap
	dilution float64 // the power of the number of sites that divides it
	residual float64 // part of the residual over the gap
	root     float64 // part of the root of the discarded weight
}

// The kinds. A truncated state is the exact one but for a part of norm² e/g at most, where it lies e above it and the next level lies g above
// (Eckart 1930). That part is spread over the whole ladder, though not evenly where the ladder is not, so that a local value sees a share of it; an
// entropy sees it several times, by its logarithm. What a cut of the bond drops is orthogonal to what it keeps on both sides of
// the cut: to first order no operator on one side sees it, but one that reaches over the cut does, and a correlation over many cuts sees them all. What the
// eigensolver left, of norm r/g, counts once, as far as it is more than what truncating leaves at every visit: see left.
var (
	Values       = Kind{excess: 1.6, dilution: 2. / 3, residual: 0.05} // of operators that reach no further than the next rung
	Correlations = Kind{excess: 0.2, residual: 0.05, root: 0.4}        // of operators that reach further
	Entropies    = Kind{excess: 6, residual: 0.1}
)

// Quality is what a search knows of the state it found; energies are in units of the largest coupling.
type Quality struct {
	Sites    int
	Weight   float64 // discarded weight
	Residual float64 // norm that the eigensolver left
	Energy   float64 // by which the energy may lie above the exact one
	Gap      float64 // to the next level, as far as it was seen; 0: it was not
}

// floor is the error that no change between two bond dimensions tells of, for an operator of norm one.
func (k Kind) floor(q Quality) float64 {
	gap := min(1, q.Gap)
	if q.Gap <= 0 {
		gap = 1
	}
	share := k.excess / math.Pow(float64(max(1, q.Sites)), k.dilution)
	return share*min(1, max(0, q.Energy)/gap) + k.residual*q.left()/gap + k.root*math.Sqrt(q.Weight) + rounding
}

// left is the residual without that of truncation. What one bond drops the next one finds missing: residuals of about
// the root of the weight come anew in every sweep, and tell nothing of an eigensolver that stopped early.
func (q Quality) left() float64 {
	if q.Residual <= 0 {
		return 0
	}
	return q.Residual * q.Residual / math.Hypot(q.Residual, truncates*math.Sqrt(q.Weight))
}

// Spread returns the errors of an observation, given its values now and at the settled bond dimension before, whose discarded weight was
// weight. norms bound the norms of the operators. |now - earlier| counts as at least a part of its root mean square over all places,
// so that no place gains from an accident.
func (k Kind) Spread(now, earlier []complex128, norms []float64, q Quality, weight float64) []float64 {
	ratio := mostRatio
	if weight > 0 {
		ratio = math.Sqrt(q.Weight / weight)
	} else if q.Weight == 0 {
		ratio = leastRatio
	}
	ratio = min(mostRatio, max(leastRatio, ratio))
	var squares float64
	for i := range earlier {
		d := cmplx.Abs(now[i] - earlier[i])
		squares += d * d
	}
	typical := math.Sqrt(squares / float64(max(1, len(earlier))))
	floor := k.floor(q)
	bars := make([]float64, len(earlier))
	for i := range bars {
		d := max(leastSpread*typical, cmplx.Abs(now[i]-earlier[i]))
		bars[i] = d*ratio/(1-ratio) + norms[i]*floor
	}
	return bars
}

// Lone returns the errors of an observation where one bond dimension is all there is: a state that lies e above the ground state, which is
// alone below a gap of one, differs from it by sqrt(e) at most (Eckart 1930).
func Lone(norms []float64, q Quality) []float64 {
	bars := make([]float64, len(norms))
	for i, norm := range norms {
		bars[i] = norm * (2*(math.Sqrt(q.Weight)+math.Sqrt(min(1, q.Energy))+q.Residual) + rounding)
	}
	return bars
}
