package runfolder

// ResultFormat names the layout of result.json.
const ResultFormat = "rundle-result/1"

// A Verdict says how a state's calculation ended.
type Verdict string

// The verdicts. All but Converged carry a reason beside them.
const (
	Converged Verdict = "converged"
	BondCap   Verdict = "bond cap"
	TimeCap   Verdict = "time cap"
	MemoryCap Verdict = "memory cap"
	SweepCap  Verdict = "sweep cap"
	Suspect   Verdict = "suspect"
)

// Verdicts lists all verdicts.
func Verdicts() []Verdict {
	return []Verdict{Converged, BondCap, TimeCap, MemoryCap, SweepCap, Suspect}
}

// A Result is the content of result.json.
type Result struct {
	Format     string      `json:"format"`
	Model      Model       `json:"model"`
	States     []State     `json:"states"`
	Multiplets []Multiplet `json:"multiplets,omitempty"` // of States, where several were asked for
	Resources  Resources   `json:"resources"`
}

// Converged tells whether every state is converged.
func (r *Result) Converged() bool {
	for _, s := range r.States {
		if s.Verdict != Converged {
			return false
		}
	}
	return true
}

// A Model says what was solved.
type Model struct {
	Title      string   `json:"title"`
	Hash       string   `json:"hash"`
	Sites      int      `json:"sites"`
	Charges    []Charge `json:"charges"`
	Arithmetic string   `json:"arithmetic"` // Real or Complex
	MPOBonds   []int    `json:"mpo_bonds"`
}

// The arithmetics.
const (
	Real    = "real"
	Complex = "complex"
)

// A Charge is a conserved number.
type Charge struct {
	Name    string `json:"name"`
	Modulus int    `json:"modulus"` // 0: an integer or half-integer; q: counted modulo q
	Meaning string `json:"meaning,omitempty"`
}

// Numbers are values of charges by name; those of a half-integer spin may be
// half-integer.
type Numbers map[string]float64

// A State is one eigenstate found.
type State struct {
	Sector          Numbers                  `json:"sector"`
	Index           int                      `json:"index"`     // within the sector, from 0
	Multiplet       int                      `json:"multiplet"` // states of equal energy share it
	Energy          float64                  `json:"energy"`    // <H> of the saved state
	EnergyLimit     float64                  `json:"energy_limit"`
	EnergyError     float64                  `json:"energy_error"`
	Gap             *float64                 `json:"gap,omitempty"` // energy_limit above that of the first state; nil where one state was asked for
	GapError        *float64                 `json:"gap_error,omitempty"`
	Variance        *float64                 `json:"variance,omitempty"` // nil where it was left out
	DiscardedWeight float64                  `json:"discarded_weight"`
	LargestBond     int                      `json:"largest_bond"`
	TopOccupation   *float64                 `json:"top_occupation,omitempty"` // nil without bosons
	Sweeps          int                      `json:"sweeps"`
	Verdict         Verdict                  `json:"verdict"`
	Reason          string                   `json:"reason,omitempty"`
	Seconds         float64                  `json:"seconds"`
	Observations    map[string][]Observation `json:"observations"`
	Entanglement    *Entanglement            `json:"entanglement,omitempty"`
}

// A Multiplet is a group of states that their error bars do not tell apart: States[First : First+Count]. Observations are means over it.
type Multiplet struct {
	First          int                      `json:"first"`
	Count          int                      `json:"count"`
	Energy         float64                  `json:"energy"` // mean of the limits
	EnergyError    float64                  `json:"energy_error"`
	Splitting      float64                  `json:"splitting"`       // highest limit less lowest one
	SplittingBound float64                  `json:"splitting_bound"` // bounds the exact splitting
	Observations   map[string][]Observation `json:"observations,omitempty"`
}

// An Observation is one value of an observed formula.
type Observation struct {
	At    At      `json:"at"`
	Value Value   `json:"value"`
	Error float64 `json:"error"`
}

// Entanglement holds what is read at every cut.
type Entanglement struct {
	Cuts []Cut `json:"cuts"`
}

// A Cut lies after a site, counting from 0.
type Cut struct {
	AfterSite    int     `json:"after_site"`
	RungEdge     bool    `json:"rung_edge"` // no rung is cut through
	Entropy      float64 `json:"entropy"`   // nats
	EntropyError float64 `json:"entropy_error"`
	Renyi2       float64 `json:"renyi2"`
	Spectrum     []Level `json:"spectrum"`
}

// A Level of the entanglement spectrum: xi = -ln(lambda^2), with the charges
// left of the cut.
type Level struct {
	Xi     float64 `json:"xi"`
	Charge Numbers `json:"charge"`
}

// Resources says what the run took.
type Resources struct {
	WallSeconds     float64  `json:"wall_seconds"`
	CPUSeconds      float64  `json:"cpu_seconds"`
	PeakMemoryBytes int64    `json:"peak_memory_bytes"`
	GemmFlops       *float64 `json:"gemm_flops,omitempty"` // nil where nothing counts them
	Threads         int      `json:"threads"`
	Kernels         string   `json:"kernels"`
	Version         string   `json:"version"`
}
