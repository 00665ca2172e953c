package dmrg

import (
	"fmt"
	"math"
	"time"

	"rundle/mps"
)

// Options steer a search. The zero value is the good default; every field's zero is stated beside it.
type Options struct {
	Precision           float64         // wanted error of the energy, in the Hamiltonian's units; 0: 1e-8
	ObservablePrecision float64         // wanted error of local observables, relative to one; 0: sqrt(Precision/1000/largest coupling), at most 1e-3
	Bond                int             // cap on the bond dimension; 0: 4096
	Sweeps              int             // cap on the number of sweeps; 0: 200
	Time                time.Duration   // cap on the wall time; 0: none
	Memory              int64           // cap on the bytes of state, environments and workspace, kept by moving environments to disk; 0: none
	Scratch             string          // folder for environments that do not fit Memory; \"\": that of temporary files
	Threads             int             // workers; 0: GOMAXPROCS
	Seed                uint64          // of the small noise in the first sweeps; results are the same for the same seed
	Charges             []string        // conserved charges to use; nil: the choice that cuts blocks most
	Complex             bool            // complex arithmetic even where a real gauge exists, or real modes (ladder.Modes)
	Opening             Opening         // how new states enter the bond; 0: PerturbedDensity
	Schedule            []Pass          // sweeps to do instead of those that the search would choose, for measurements and experts; nil: the search chooses
	Unprobed            bool            // call converged without a probe from another start; for measurements
	Start               *mps.State      // state to begin from, as stored; its charges stand where the sector is silent; nil: a product state chosen from the diagonal terms
	Levels              []*mps.State    // states near the levels that Lowest looks for, from which it begins: of each sector in order; nil: none known
	From                *Waypoint       // where an earlier search was saved, to go on from; nil: from the start
	WaypointEvery       time.Duration   // least time between two calls of OnWaypoint; 0: 30 s, more where saving takes long
	OnWaypoint          func(*Waypoint) // called between two updates, now and then, with what to save; nil: never
	OnSweep             func(Sweep)     // called after every sweep
	OnStage             func(Stage)     // called with the state at each settled bond dimension
	OnLevel             func(*Result)   // called by Lowest with each level that was searched for to the end
	OnBond              func(Position)  // called after every bond update
}

// Opening is the way in which states absent from the bond are let in while it grows.
type Opening int

const (
	PerturbedDensity Opening = iota // perturbation of the reduced density matrix (White 2005)
	Unperturbed                     // two-site truncation alone; for measurements
)

// settled are the options after the defaults.
type settled struct {
	Options
	weight float64 // weight that a truncation may discard for the wanted precision
	strict bool    // the user named a precision of observables
	depot  *depot  // nil without a cap on memory
	unit   float64 // of energy: a power of two near the largest coupling if squares of that are no good numbers, else 1
}

// Defaults and bounds of Options.
const (
	defaultPrecision    = 1e-8
	defaultBond         = 4096
	defaultSweeps       = 200
	loosestObservables  = 1e-3
	observablesPerPower = 1000  // energies err by this part less than the square of observables, by default
	largestWeight       = 1e-6  // discarded at a bond, whatever the precision
	leastWeight         = 1e-26 // beyond double precision
	plain               = 1e-60 // couplings from here to its inverse can be squared
)

// check refuses what no search could mean.
func (o Options) check() error {
	bad := func(name string, v any, want string) error {
		return fmt.Errorf("dmrg: option %s = %v: want %s", name, v, want)
	}
	number := func(x float64) bool { return x >= 0 && !math.IsInf(x, 0) }
	switch {
	case !number(o.Precision):
		return bad("Precision", o.Precision, "a positive number, or 0 for the default")
	case !number(o.ObservablePrecision):
		return bad("ObservablePrecision", o.ObservablePrecision, "a positive number, or 0 for the default")
	case o.Bond < 0:
		return bad("Bond", o.Bond, "a positive bond dimension, or 0 for the default")
	case o.Sweeps < 0:
		return bad("Sweeps", o.Sweeps, "a positive number of sweeps, or 0 for the default")
	case o.Time < 0:
		return bad("Time", o.Time, "a positive duration, or 0 for none")
	case o.Memory < 0:
		return bad("Memory", o.Memory, "a positive number of bytes, or 0 for none")
	case o.Threads < 0:
		return bad("Threads", o.Threads, "a positive number, or 0 for all")
	case o.WaypointEvery < 0:
		return bad("WaypointEvery", o.WaypointEvery, "a positive duration, or 0 for the default")
	case o.From != nil && o.From.real == nil && o.From.complex == nil:
		return bad("From", "an empty waypoint", "one that OnWaypoint got or that was loaded")
	case o.Opening != PerturbedDensity && o.Opening != Unperturbed:
		return bad("Opening", int(o.Opening), "PerturbedDensity or Unperturbed")
	}
	return o.checkSchedule()
}

// settle fills in the defaults of checked options. scale is the largest coupling.
func (o Options) settle(scale float64) settled {
	s := settled{Options: o, strict: o.ObservablePrecision > 0}
	if s.Precision == 0 {
		s.Precision = defaultPrecision
	}
	if !s.strict {
		s.ObservablePrecision = min(loosestObservables, math.Sqrt(s.Precision/scale/observablesPerPower))
	}
	if s.Bond == 0 {
		s.Bond = defaultBond
	}
	if s.Sweeps == 0 {
		s.Sweeps = defaultSweeps
	}
	// Observables err as the square root of the discarded weight, energies as the weight itself.
	s.weight = 1e-2 * min(s.Precision/scale, s.ObservablePrecision*s.ObservablePrecision)
	s.weight = max(leastWeight, min(largestWeight, s.weight))
	if s.Memory > 0 {
		s.depot = &depot{parent: s.Scratch}
	}
	s.unit = 1
	if scale > 1/plain || scale < plain {
		s.unit = math.Ldexp(1, math.Ilogb(scale))
	}
	return s
}
