package ladder

import (
	"fmt"
	"slices"
)

// Limits of the site kinds.
const (
	MaxOccupation = 255 // largest maximum of a boson site
	MaxTwoS       = 50  // largest 2s of a spin
	MaxClock      = 64  // largest q of a clock
)

// Kind is the kind of a site.
type Kind uint8

// The kinds of sites.
const (
	KindFermion Kind = iota + 1
	KindElectron
	KindBoson
	KindSpin
	KindClock
)

// String returns the word that errors use.
func (k Kind) String() string {
	switch k {
	case KindFermion:
		return "fermion"
	case KindElectron:
		return "two-component fermion"
	case KindBoson:
		return "boson"
	case KindSpin:
		return "spin"
	case KindClock:
		return "clock"
	}
	return "unknown"
}

// Site is a kind of site with its local states and operators: a small value, copied freely. On a ladder, sites of one kind
// and size compare equal and share their operator basis; OpIDs of different ladders must not be mixed.
type Site struct {
	kind   Kind
	size   int // boson: largest occupation; spin: 2s; clock: q
	single bool
	ops    *local
}

// Label is a quantity that basis operators raise by a definite amount.
type Label struct {
	Name    string // "N", "N up", "N down", "Sz" or "Q"
	Modulus int    // 0, or q for a label that counts modulo q
	Twice   bool   // the integers are twice the value (Sz)
}

// Fermion is a spinless fermion: states |0>, |1>; operators c, c^+, n.
func Fermion() Site { return newSite(KindFermion, 0, false) }

// ElectronOption changes the two-component fermion.
type ElectronOption func(*Site)

// Double(false) forbids double occupation; Double(true) is the default.
func Double(allowed bool) ElectronOption { return func(s *Site) { s.single = !allowed } }

// Electron is a two-component fermion: states |0>, |up>, |down>, |up,down> = c_up^+ c_down^+ |0>. With Double(false) the last state is missing.
// A formula then still means the full algebra, and what it becomes is cut, as for bosons: c_up c_up^+ is 1 - n_up, and
// c_up^+ c_down^+ is nothing.
func Electron(options ...ElectronOption) Site {
	s := Site{kind: KindElectron}
	for _, o := range options {
		o(&s)
	}
	return newSite(KindElectron, 0, s.single)
}

// Boson is a boson with states n = 0..max. Its operator algebra knows no cut: b b^+ is n+1, at n = max too.
func Boson(max int) Site { return newSite(KindBoson, max, false) }

// Spin is a spin s = twoS/2 with states m = s, s-1, ..., -s.
func Spin(twoS int) Site { return newSite(KindSpin, twoS, false) }

// Clock is a q-state clock with states m = 0..q-1, Z|m> = exp(2 pi i m/q)|m>, X|m> = |m+1 mod q>.
func Clock(q int) Site { return newSite(KindClock, q, false) }

// newSite leaves ops nil where the size is out of bounds; New reports that.
func newSite(kind Kind, size int, single bool) Site {
	s := Site{kind: kind, size: size, single: single}
	if s.check() != nil {
		return s
	}
	var r rules
	switch kind {
	case KindFermion:
		r = fermionRules{}
	case KindElectron:
		if single {
			r = singleRules{}
		} else {
			r = electronRules{}
		}
	case KindBoson:
		r = newBosonRules(size)
	case KindSpin:
		r = newSpinRules(size)
	case KindClock:
		r = newClockRules(size)
	}
	s.ops = newLocal(r)
	return s
}

// check reports a size out of bounds.
func (s Site) check() error {
	switch s.kind {
	case KindFermion, KindElectron:
		return nil
	case KindBoson:
		if s.size < 1 || s.size > MaxOccupation {
			return fmt.Errorf("largest occupation %d; expected 1 to %d", s.size, MaxOccupation)
		}
		return nil
	case KindSpin:
		if s.size < 1 || s.size > MaxTwoS {
			return fmt.Errorf("spin %s; expected s = 1/2, 1, ... up to %d", half(s.size), MaxTwoS/2)
		}
		return nil
	case KindClock:
		if s.size < 2 || s.size > MaxClock {
			return fmt.Errorf("clock with q = %d; expected 2 to %d", s.size, MaxClock)
		}
		return nil
	}
	return fmt.Errorf("a site of no kind; use Fermion, Electron, Boson, Spin or Clock")
}

// half writes x/2 as a formula does.
func half(x int) string {
	if x%2 == 0 {
		return fmt.Sprint(x / 2)
	}
	return fmt.Sprintf("%d/2", x)
}

// like reports whether two sites are of one kind and size.
func (s Site) like(t Site) bool { return s.kind == t.kind && s.size == t.size && s.single == t.single }

// Kind returns the kind of the site.
func (s Site) Kind() Kind { return s.kind }

// Size is the largest occupation of a boson, 2s of a spin, q of a clock, else 0.
func (s Site) Size() int { return s.size }

// Double reports whether a two-component fermion allows double occupation.
func (s Site) Double() bool { return s.kind == KindElectron && !s.single }

// String describes the site: "boson (max 3)", "spin 1/2".
func (s Site) String() string {
	switch s.kind {
	case KindElectron:
		if s.single {
			return "two-component fermion without double occupation"
		}
	case KindBoson:
		return fmt.Sprintf("boson (max %d)", s.size)
	case KindSpin:
		return "spin " + half(s.size)
	case KindClock:
		return fmt.Sprintf("clock (q = %d)", s.size)
	}
	return s.kind.String()
}

// Dim returns the number of local states.
func (s Site) Dim() int { return s.ops.dim() }

// Labels returns the quantities that operators raise: N; N up and N down; Sz; Q.
func (s Site) Labels() []Label { return s.ops.labels() }

// StateLabels returns the labels of a local state: occupations, 2m for spins, m for clocks.
func (s Site) StateLabels(state int) []int {
	if state < 0 || state >= s.Dim() {
		panic(fmt.Sprintf("ladder: state %d of a site with %d states", state, s.Dim()))
	}
	return s.ops.stateLabels(state)
}

// Raise returns by how much op changes each label, in the units of StateLabels (clock: 0..q-1); of a compound, its first element.
func (s Site) Raise(op OpID) []int { return s.ops.raise(s.ops.leader(op)) }

// Odd reports whether op anticommutes with the odd operators of other sites.
func (s Site) Odd(op OpID) bool { return s.ops.odd(s.ops.leader(op)) }

// Diagonal reports whether op is diagonal in the site's states.
func (s Site) Diagonal(op OpID) bool {
	return !slices.ContainsFunc(s.ops.spread(op), func(w Weighted) bool { return !s.ops.diagonal(w.Op) })
}

// Parts returns the sum of basis elements that op stands for: itself, unless it is a compound. The slice is shared.
func (s Site) Parts(op OpID) []Weighted { return s.ops.spread(op) }

// Mul returns a·b in the basis, like elements merged, sorted by element. The slice is shared: do not change it. Boson products beyond the
// largest power panic.
func (s Site) Mul(a, b OpID) []Weighted {
	w, err := s.ops.multiply(a, b)
	if err != nil {
		panic("ladder: " + err.Error())
	}
	return w
}

// Adjoint returns the Hermitian conjugate of a in the basis: for every kind one element. The slice is shared.
func (s Site) Adjoint(a OpID) []Weighted {
	w, err := s.ops.conjugate(a)
	if err != nil {
		panic("ladder: " + err.Error())
	}
	return w
}

// Matrix returns <out|op|in> as a Dim×Dim row-major array in the order of the site's states, cut after normal ordering. The slice is shared.
func (s Site) Matrix(op OpID) []complex128 { return s.ops.cachedMatrix(op) }

// Vanishes reports whether nothing is left of op after the cut, as of n_up n_down without double occupation.
func (s Site) Vanishes(op OpID) bool {
	return !slices.ContainsFunc(s.Matrix(op), func(z complex128) bool { return z != 0 })
}

// Format writes op on a site as a formula would: "b^+[a,3]".
func (s Site) Format(op OpID, leg string, rung int) string {
	return s.ops.write(op, fmt.Sprintf("[%s,%d]", leg, rung))
}

// Symbol returns the operator that a formula writes as name^super ("b", "+"; "S", "z"; "n", ""), false if the site has none.
func (s Site) Symbol(name, super string) ([]Weighted, bool) { return s.ops.symbol(name, super) }

// Symbols lists the operators that formulas may use: "b, b^+, n".
func (s Site) Symbols() string { return s.ops.symbols() }
