package block

import "fmt"

// Frame describes how the stored basis of a site relates to the user's local basis: plain data, which travels with states and
// files. What rotations and angles mean is up to the package that knows the site kinds.
type Frame struct {
	Rotation int       // number of the site kind's basis rotation; 0: none
	Angles   []float64 // phases of the gauge change, radians, one per species of the site; nil: none
	Charges  []Charge  // charge of each stored state, nondecreasing
	Order    []int     // stored state i is state Order[i] of the rotated basis
}

// Dim returns the number of states.
func (f Frame) Dim() int { return len(f.Charges) }

// Axis returns the site's axis, with flow In. Charges that decrease panic.
func (f Frame) Axis() Axis {
	s := make([]Sector, len(f.Charges))
	for i, c := range f.Charges {
		if i > 0 && f.Charges[i-1].Compare(c) > 0 {
			panic(fmt.Sprintf("block: frame with charge %v of state %d after %v; states are sorted by charge", c, i, f.Charges[i-1]))
		}
		s[i] = Sector{Charge: c, Dim: 1}
	}
	return NewAxis(In, s...)
}
