package mps

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"

	"rundle/internal/dense"
	"rundle/internal/task"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// State is a matrix-product state of a ladder, real or complex, with the frames that its local bases are written in and the scope that
// gives formulas their meaning. Make one with NewReal, NewComplex, ProductState, RandomState or Load.
type State struct {
	real    *Chain[float64]
	complex *Chain[complex128]
	frames  *ladder.Frames
	scope   *ladder.Scope
}

// NewReal makes a state of a real chain, which it keeps. It is an error if the chain does not live on the sites that the frames
// and the scope describe, or holds numbers that are not finite.
func NewReal(c *Chain[float64], f *ladder.Frames, s *ladder.Scope) (*State, error) {
	if err := checkState(c, f, s); err != nil {
		return nil, err
	}
	return &State{real: c, frames: f, scope: s}, nil
}

// NewComplex makes a state of a complex chain; see NewReal.
func NewComplex(c *Chain[complex128], f *ladder.Frames, s *ladder.Scope) (*State, error) {
	if err := checkState(c, f, s); err != nil {
		return nil, err
	}
	return &State{complex: c, frames: f, scope: s}, nil
}

// newState makes a state of a chain of either kind.
func newState[T dense.Scalar](c *Chain[T], f *ladder.Frames, s *ladder.Scope) (*State, error) {
	if r, ok := any(c).(*Chain[float64]); ok {
		return NewReal(r, f, s)
	}
	return NewComplex(any(c).(*Chain[complex128]), f, s)
}

func checkState[T dense.Scalar](c *Chain[T], f *ladder.Frames, s *ladder.Scope) error {
	switch {
	case c == nil || f == nil || s == nil:
		return errors.New("mps: a state needs a chain, frames and a scope")
	case f.Group != c.Group:
		return fmt.Errorf("mps: a chain with the charges %v in frames with %v", c.Group, f.Group)
	case len(f.Sites) != c.Len() || s.Ladder().Sites() != c.Len():
		return fmt.Errorf("mps: a chain of %d sites, frames of %d, a ladder of %d; expected equal numbers", c.Len(), len(f.Sites), s.Ladder().Sites())
	}
	for i, t := range c.Sites {
		if a := f.Sites[i].Axis(); !t.Axes[1].Equal(a) {
			return fmt.Errorf("mps: site %d has the states %v, its frame %v", i, t.Axes[1], a)
		}
		if d := s.Ladder().Site(i).Dim(); d != f.Sites[i].Dim() {
			return fmt.Errorf("mps: site %d has %d states, that of the ladder %d", i, f.Sites[i].Dim(), d)
		}
		for _, x := range t.Data {
			if a := dense.Abs(x); math.IsNaN(a) || math.IsInf(a, 0) {
				return fmt.Errorf("mps: site %d holds the number %v; expected finite ones", i, x)
			}
		}
	}
	return nil
}

// ProductState returns the product of one basis state a site, of norm one. states[i] counts the local basis of site i as its kind
// does (boson and fermion: the occupation; two components: none, up, down, both; spin: m = s, s-1, ..., -s; clock: m), along the
// axis to which the frames turn the site.
func ProductState(f *ladder.Frames, s *ladder.Scope, states []int) (*State, error) {
	if len(states) != len(f.Sites) {
		return nil, fmt.Errorf("mps: %d states given for %d sites", len(states), len(f.Sites))
	}
	axes, stored := frameAxes(f), make([]int, len(states))
	for i, frame := range f.Sites {
		stored[i] = -1
		for k, state := range frame.Order {
			if state == states[i] {
				stored[i] = k
			}
		}
		if stored[i] < 0 {
			return nil, fmt.Errorf("mps: site %d has states 0..%d, got %d", i, frame.Dim()-1, states[i])
		}
	}
	if f.Real {
		return build(f, s, func() (*Chain[float64], error) { return Product[float64](f.Group, axes, stored) })
	}
	return build(f, s, func() (*Chain[complex128], error) { return Product[complex128](f.Group, axes, stored) })
}

// RandomState returns a random state of a total charge (ladder.Frames.Target finds it from the user's words), of norm one and bond dimension
// up to bond. The same seed gives the same state.
func RandomState(f *ladder.Frames, s *ladder.Scope, total block.Charge, bond int, seed uint64) (*State, error) {
	rng := rand.New(rand.NewPCG(seed, 0))
	if f.Real {
		return build(f, s, func() (*Chain[float64], error) { return Random[float64](f.Group, frameAxes(f), total, bond, rng) })
	}
	return build(f, s, func() (*Chain[complex128], error) { return Random[complex128](f.Group, frameAxes(f), total, bond, rng) })
}

func build[T dense.Scalar](f *ladder.Frames, s *ladder.Scope, chain func() (*Chain[T], error)) (*State, error) {
	c, err := chain()
	if err != nil {
		return nil, err
	}
	return newState(c, f, s)
}

func frameAxes(f *ladder.Frames) []block.Axis {
	axes := make([]block.Axis, len(f.Sites))
	for i, frame := range f.Sites {
		axes[i] = frame.Axis()
	}
	return axes
}

// Real returns the chain of a real state. It shares the state's memory.
func (s *State) Real() (*Chain[float64], bool) { return s.real, s.real != nil }

// Complex returns the chain of a complex state. It shares the state's memory.
func (s *State) Complex() (*Chain[complex128], bool) { return s.complex, s.complex != nil }

// ChainOf returns the chain of a state in arithmetic T: the state's own, which shares its memory, or a complex copy of a real one. A
// complex state has no real chain: an error.
func ChainOf[T dense.Scalar](s *State) (*Chain[T], error) {
	var own any = s.real
	if s.complex != nil {
		own = s.complex
	} else if dense.IsComplex[T]() {
		own = Promote(s.real)
	}
	if c, ok := own.(*Chain[T]); ok {
		return c, nil
	}
	return nil, errors.New("mps: a complex state where real arithmetic is needed; ask for complex arithmetic")
}

// Frames returns the frames of the local bases.
func (s *State) Frames() *ladder.Frames { return s.frames }

// Scope returns the ladder, constants and profiles that the state was made with.
func (s *State) Scope() *ladder.Scope { return s.scope }

// numbers is what both kinds of chain can do.
type numbers interface {
	Len() int
	BondDims() []int
	MaxBond() int
	Charge() block.Charge
	Norm() float64
	Normalize() float64
	Schmidt(b int, pool *task.Pool) (block.Spectrum, error)
	Spectra(pool *task.Pool) ([]block.Spectrum, error)
	Truncate(cut block.Cut, pool *task.Pool) (float64, error)
}

func (s *State) numbers() numbers {
	if s.real != nil {
		return s.real
	}
	return s.complex
}

// Sites returns the number of sites.
func (s *State) Sites() int { return s.numbers().Len() }

// BondDims returns the dimensions of the Sites()-1 bonds.
func (s *State) BondDims() []int { return s.numbers().BondDims() }

// MaxBond returns the largest bond dimension.
func (s *State) MaxBond() int { return s.numbers().MaxBond() }

// Charge returns the total charge as stored.
func (s *State) Charge() block.Charge { return s.numbers().Charge() }

// Charges returns the total charges by name, in the user's units.
func (s *State) Charges() map[string]float64 { return s.frames.Values(s.Charge()) }

// Norm returns the norm.
func (s *State) Norm() float64 { return s.numbers().Norm() }

// Normalize divides the state by its norm and returns the norm; see Chain.Normalize.
func (s *State) Normalize() float64 { return s.numbers().Normalize() }

// Clone returns a copy that shares frames and scope.
func (s *State) Clone() *State {
	c := &State{frames: s.frames, scope: s.scope}
	if s.real != nil {
		c.real = s.real.Clone()
	} else {
		c.complex = s.complex.Clone()
	}
	return c
}

// Schmidt returns the Schmidt values of the cut after site b; see Chain.Schmidt. A zero state has none: an empty spectrum of norm zero. The numbers
// of a state are finite, so that nothing else can fail; if it does, it panics with the *block.SVDError.
func (s *State) Schmidt(b int) block.Spectrum {
	spectrum, err := s.numbers().Schmidt(b, task.New(0))
	if errors.Is(err, block.ErrZero) {
		return block.Spectrum{Axis: block.NewAxis(block.In)}
	}
	if err != nil {
		panic(err)
	}
	return spectrum
}

// Spectra returns the Schmidt values of all cuts in one pass; see Schmidt.
func (s *State) Spectra() []block.Spectrum {
	all, err := s.numbers().Spectra(task.New(0))
	if errors.Is(err, block.ErrZero) {
		all = make([]block.Spectrum, s.Sites()-1)
		for b := range all {
			all[b].Axis = block.NewAxis(block.In)
		}
		return all
	}
	if err != nil {
		panic(err)
	}
	return all
}

// Truncate drops small Schmidt values and returns the weight discarded in all; see Chain.Truncate.
func (s *State) Truncate(cut block.Cut) (discarded float64, err error) {
	return s.numbers().Truncate(cut, task.New(0))
}

// Overlap returns <a|b>. It is an error if the states are not written in the same frames.
func (a *State) Overlap(b *State) (complex128, error) {
	if err := sameFrames(a, b); err != nil {
		return 0, err
	}
	if a.real != nil && b.real != nil {
		return complex(Overlap(a.real, b.real, task.New(0)), 0), nil
	}
	return Overlap(a.asComplex(), b.asComplex(), task.New(0)), nil
}

// Superpose returns alpha a + beta b, not normalized; see Add. The result is real if both states and both numbers are. It is an
// error if the states are not written in the same frames or have different charges.
func Superpose(alpha complex128, a *State, beta complex128, b *State) (*State, error) {
	if err := sameFrames(a, b); err != nil {
		return nil, err
	}
	if a.Charge() != b.Charge() {
		return nil, fmt.Errorf("mps: a sum of states with the charges %v and %v; expected equal ones", a.Charges(), b.Charges())
	}
	if a.real != nil && b.real != nil && imag(alpha) == 0 && imag(beta) == 0 {
		return NewReal(Add(real(alpha), a.real, real(beta), b.real), a.frames, a.scope)
	}
	return NewComplex(Add(alpha, a.asComplex(), beta, b.asComplex()), a.frames, a.scope)
}

func (s *State) asComplex() *Chain[complex128] {
	if s.complex != nil {
		return s.complex
	}
	return Promote(s.real)
}

func sameFrames(a, b *State) error {
	f, g := a.frames, b.frames
	switch {
	case f == g:
	case len(f.Sites) != len(g.Sites):
		return fmt.Errorf("mps: states of %d and %d sites", len(f.Sites), len(g.Sites))
	case f.Group != g.Group:
		return fmt.Errorf("mps: states with the charges %v and %v; ask for the same charges", f.Group, g.Group)
	default:
		for i := range f.Sites {
			if !reflect.DeepEqual(f.Sites[i], g.Sites[i]) {
				return fmt.Errorf("mps: the states are written in different bases at site %d; make both with the same Hamiltonian and arithmetic", i)
			}
		}
	}
	return nil
}
