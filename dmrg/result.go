package dmrg

import "rundle/mps"

// Sweep reports one sweep: right and left again.
type Sweep struct {
	Number       int     // from 1
	Bond         int     // cap on the bond dimension in this sweep
	Perturbation float64 // weight of the perturbation, 0 in clean sweeps
	Energy       float64 // of the last update
	Discarded    float64 // largest discarded weight of a bond in the left-going half
	Residual     float64 // largest norm of H psi - E psi left by a bond's eigensolver in the left-going half
	LargestBond  int
	Products     int     // of a vector with the projected Hamiltonian
	Flops        float64 // real operations of environments and projected Hamiltonians
	Seconds      float64
}

// Position tells where in a sweep the engine stands.
type Position struct {
	Sweep, Bond, Bonds int
	Done               int // updates of this sweep, this one included
	Energy             float64
}

// Stage is a settled bond dimension.
type Stage struct {
	Bond      int
	Energy    float64
	Discarded float64
	State     *mps.State // valid only during the call
}

// Verdict says how a search ended. Not converged is a verdict, not an error.
type Verdict string

// The verdicts. All but the first come with a reason.
const (
	Converged  Verdict = "converged"  // the error estimate is below the wanted precision
	BondCap    Verdict = "bond cap"   // a cap was met first
	TimeCap    Verdict = "time cap"   //
	MemoryCap  Verdict = "memory cap" //
	SweepCap   Verdict = "sweep cap"  //
	Suspect    Verdict = "suspect"    // the wanted precision cannot be vouched for
	unfinished Verdict = ""
)

// Result is what a search found.
type Result struct {
	State            *mps.State
	Energy           float64            // <H> of State; NaN where the context ended the search
	EnergyLimit      float64            // extrapolated to no truncation; Energy where nothing tells
	EnergyError      float64            // bounds |EnergyLimit - exact|; +Inf before two sweeps have settled a bond dimension
	Variance         float64            // <(H - E)^2> of State; NaN where it would have cost more than a fair part of the search
	VarianceRounding float64            // rounding error of Variance
	TwoSiteVariance  float64            // the part of Variance that changes of two neighbouring sites see, all of it where no term is longer; NaN where the search did not end between sweeps
	Gap              float64            // smallest distance to a next level that the Krylov spaces of the bonds told, an upper bound on the gap above State in its sector; 0: none did
	DiscardedWeight  float64            // largest of a bond in the last whole sweep
	LargestBond      int                // of State
	Sweeps           []Sweep            // whole ones
	Stages           []Stage            // without states
	Sector           map[string]float64 // the values of the conserved charges
	Real             bool               // the search ran in real arithmetic; State may be complex all the same, see ladder.Modes
	OperatorBonds    []int              // bond dimensions of the matrix-product operator
	Flops            float64            // real operations of environments, projected Hamiltonians and the variance
	Escapes          int                // times that another start led to a lower state, which the search then went on from
	Verdict          Verdict            // "" where the context ended the search
	Reason           string
	Waypoint         *Waypoint // where the search ended, to go on from with other caps, or if the context ended it; nil where the time was up while free charges were still being chosen
}
