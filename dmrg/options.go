package dmrg

import (
	"fmt"
	"math"
	"time"

	"rundle/mps"
)

// Options steer a search. The zero value is the good default; every field's zero is stated beside it.
type Options struct {
	Precision           float64        // wanted error of the energy, in the Hamiltonian's units; 0: 1e-8
	ObservablePrecision float64        // wanted error of local observables, relative to one; 0: the square root of Precision/1000
	Bond                int            // cap on the bond dimension; 0: 4096
	Sweeps              int            // cap on the number of sweeps; 0: 200
	Time                time.Duration  // cap on the wall time; 0: none
	Memory              int64          // cap on the bytes of state and environments; 0: none
	Threads             int            // workers; 0: GOMAXPROCS
	Seed                uint64         // of the small noise in the first sweeps; results are the same for the same seed
	Charges             []string       // conserved charges to use; nil: the choice that cuts blocks most
	Complex             bool           // stay complex even where a real gauge exists
	Opening               Opening          // how new states enter the bond; 0: DensityMatrix
	Start               *mps.State     // state to begin from; nil: a product state chosen from the diagonal terms
	OnSweep             func(Sweep)    // called after every sweep
	OnStage             func(Stage)    // called with the state at each settled bond dimension
	OnBond              func(Position) // called after every bond update
}

// Opening is the way in which states absent from the bond are let in while it grows.
type Opening int

const (
	DensityMatrix Opening = iota // perturbation of the reduced density matrix (White 2005)
	Unperturbed                    // two-site truncation alone; for measurements
)

// Sweep reports one sweep: right and left again.
type Sweep struct {
	Number      int     // from 1
	Bond        int     // cap on the bond dimension in this sweep
	Mixing      float64 // weight of the perturbation, 0 in clean sweeps
	Energy      float64
	Discarded   float64 // largest discarded weight of a bond in the left-going half
	Residual    float64 // largest norm of H psi - E psi left by a bond's eigensolver in the left-going half
	LargestBond int
	Seconds     float64
}

// Position tells where in a sweep the engine stands.
type Position struct {
	Sweep, Bond, Bonds int
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

const (
	Converged  Verdict = "converged"
	BondCap    Verdict = "bond cap"
	TimeCap    Verdict = "time cap"
	MemoryCap  Verdict = "memory cap"
	SweepCap   Verdict = "sweep cap"
	Suspect    Verdict = "suspect"
	unfinished Verdict = ""
)

// Result is what a search found.
type Result struct {
	State            *mps.State
	Energy           float64 // <H> of State
	EnergyLimit      float64 // extrapolated to zero discarded weight
	EnergyError      float64 // bounds |EnergyLimit - exact|
	Variance         float64 // <(H - E)^2>, NaN where it was not computed
	VarianceRounding float64 // rounding error of Variance
	DiscardedWeight  float64 // largest of the last sweep
	LargestBond      int
	Sweeps           []Sweep
	Stages           []Stage            // without states
	Sector           map[string]float64 // the values of the conserved charges
	OperatorBonds    []int              // bond dimensions of the matrix-product operator
	Verdict          Verdict
	Reason           string
}

// settled are the options after the defaults.
type settled struct {
	Options
	weight float64 // weight that a truncation may discard for the wanted precision
	strict bool    // the user named a precision of observables
}

func (o Options) settle(scale float64) (settled, error) {
	bad := func(name string, v any, want string) error {
		return fmt.Errorf("dmrg: option %s = %v: want %s", name, v, want)
	}
	s := settled{Options: o}
	switch {
	case math.IsNaN(o.Precision) || math.IsInf(o.Precision, 0) || o.Precision < 0:
		return s, bad("Precision", o.Precision, "a positive number")
	case math.IsNaN(o.ObservablePrecision) || math.IsInf(o.ObservablePrecision, 0) || o.ObservablePrecision < 0:
		return s, bad("ObservablePrecision", o.ObservablePrecision, "a positive number")
	case o.Bond < 0:
		return s, bad("Bond", o.Bond, "a positive bond dimension, or 0 for the default")
	case o.Sweeps < 0:
		return s, bad("Sweeps", o.Sweeps, "a positive number of sweeps, or 0 for the default")
	case o.Time < 0:
		return s, bad("Time", o.Time, "a positive duration, or 0 for none")
	case o.Memory < 0:
		return s, bad("Memory", o.Memory, "a positive number of bytes, or 0 for none")
	case o.Threads < 0:
		return s, bad("Threads", o.Threads, "a positive number, or 0 for all")
	}
	if s.Precision == 0 {
		s.Precision = 1e-8
	}
	s.strict = s.ObservablePrecision > 0
	if s.ObservablePrecision == 0 {
		s.ObservablePrecision = math.Sqrt(s.Precision / 1000)
	}
	if s.Bond == 0 {
		s.Bond = 4096
	}
	if s.Sweeps == 0 {
		s.Sweeps = 200
	}
	// Observables err as the square root of the discarded weight, energies as the weight itself.
	s.weight = min(1e-2*s.Precision/scale, 1e-2*s.ObservablePrecision*s.ObservablePrecision)
	s.weight = max(s.weight, 1e-26)
	return s, nil
}
