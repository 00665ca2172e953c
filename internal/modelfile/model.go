package modelfile

import (
	"time"

	"rundle/mpo/ladder"
)

// Model is what a model file says, checked.
type Model struct {
	File        string // the name that errors show
	Source      []byte // the file as read
	Title       string
	Ladder      *ladder.Ladder
	Scope       *ladder.Scope
	Hamiltonian *ladder.Hamiltonian
	Frames      *ladder.Frames // for the charges that Solve names
	Sector      ladder.Sector
	Solve       Solve
	Observe     []Observation
	Hash        string // see Content
	content     []fact
}

// Solve holds the settings of [solve]; a zero means that the file does not say and the default holds.
type Solve struct {
	Precision           float64
	ObservablePrecision float64
	States              int
	Bond                int
	Sweeps              int
	Time                time.Duration
	Memory              int64 // bytes
	Seed                uint64
	Charges             []string
}

// Kind says what an observation asks for.
type Kind string

// The kinds of observations.
const (
	Values       Kind = "values"       // the expectation value of a formula at all its places
	Correlations Kind = "correlations" // a two-point function over all pairs of places
	Entanglement Kind = "entanglement" // how the entanglement of every cut is written
)

// Observation is one [[observe]] section.
type Observation struct {
	Name       string // of Entanglement: "entanglement" unless the file names it
	Kind       Kind
	Term       ladder.Term // Values; Correlations: the first operator
	Second     ladder.Term // Correlations: the second operator
	Connected  bool        // Correlations: without the product of the two expectation values
	SpectrumTo float64     // Entanglement: levels below this xi are written; 0: the default
}
