package ladder

// Constants are the named numbers of formulas.
type Constants map[string]float64

// Each gives the values of a term's further indices: "legs", "rungs", a range such as "1..rungs-1", a list of
// numbers or of leg names.
type Each map[string]any

// Term is a formula with the places where it is put.
type Term struct {
	Name    string // for errors; empty: the formula itself
	Formula string
	Each    Each
	Where   string // condition on the indices; empty: none
}

// Profile gives numbers that depend on the place: a formula of j and leg, "uniform(lo, hi)" or "normal(mean, sigma)", or Values.
type Profile struct {
	Name    string
	Formula string    // empty: Values
	Values  []float64 // one per rung, or one per site
	Seed    uint64    // of a random profile
}

// IndexValue is the value of an index at a place.
type IndexValue struct {
	Name   string
	Leg    string  // the leg's name, empty if the value is a number
	Number float64 // else the number
}

// Place is one assignment of a term's indices and what the formula is there.
type Place struct {
	At   []IndexValue
	Poly *Polynomial
}

// Scope is what the names in formulas mean: a ladder, constants and profiles.
type Scope struct {
	ladder    *Ladder
	constants Constants
	profiles  []Profile
}

// NewScope checks constants and profiles.
func NewScope(l *Ladder, constants Constants, profiles ...Profile) (*Scope, error) {
	return &Scope{ladder: l, constants: constants, profiles: profiles}, nil
}

// Ladder returns the ladder.
func (s *Scope) Ladder() *Ladder { return s.ladder }

// Polynomial sums a term over all its places.
func (s *Scope) Polynomial(t Term) (*Polynomial, error) { return Zero(s.ladder), nil }

// Places returns the term at each of its places.
func (s *Scope) Places(t Term) ([]Place, error) { return nil, nil }

// Number evaluates a formula without operators and indices.
func (s *Scope) Number(src string) (float64, error) { return 0, nil }

func constantRange(span string, rungs int) (from, to int, err *Error) { return 0, 0, nil }
