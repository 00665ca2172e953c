package exact

import (
	"fmt"
	"math"
	"math/bits"
)

// A Kind says what lives on a site.
type Kind byte

// The kinds of sites.
const (
	KindFermion Kind = iota
	KindElectron
	KindBoson
	KindSpin
	KindClock
)

// A Site is one local Hilbert space.
type Site struct {
	Kind Kind
	// Param is the largest occupation of a boson, 2s of a spin, q of a clock,
	// and the largest occupation (1 or 2) of an electron site.
	Param int
}

// Fermion returns a site that holds at most one spinless fermion.
func Fermion() Site { return Site{KindFermion, 1} }

// Electron returns a site of two-component fermions, with or without double
// occupation.
func Electron(double bool) Site {
	if double {
		return Site{KindElectron, 2}
	}
	return Site{KindElectron, 1}
}

// Boson returns a site that holds up to max bosons.
func Boson(max int) Site { return Site{KindBoson, max} }

// Spin returns a spin of length s = twoS/2.
func Spin(twoS int) Site { return Site{KindSpin, twoS} }

// Clock returns a clock of q positions.
func Clock(q int) Site { return Site{KindClock, q} }

// Dim returns the number of local states.
func (s Site) Dim() int {
	switch s.Kind {
	case KindFermion:
		return 2
	case KindElectron:
		return 2 + s.Param
	case KindBoson, KindSpin:
		return s.Param + 1
	case KindClock:
		return s.Param
	}
	panic(fmt.Sprintf("exact: unknown site kind %d", s.Kind))
}

// fermions returns the number of fermions in a local state.
func (s Site) fermions(state int) int {
	if s.Kind == KindFermion || s.Kind == KindElectron {
		return bits.OnesCount(uint(state))
	}
	return 0
}

// A step is one elementary operator that takes a local state to at most one
// other. Several steps with weights make up an operator such as S^x.
type step struct {
	site int
	act  func(state int) (to int, coef complex128) // coef 0: annihilated
	odd  bool
	mode int // occupied bits of the site below this mask count for the sign
}

type weightedStep struct {
	coef complex128
	step step
}

func diagonal(site int, f func(state int) complex128) []weightedStep {
	return []weightedStep{{1, step{site: site, act: func(state int) (int, complex128) {
		return state, f(state)
	}}}}
}

func single(site int, act func(state int) (int, complex128)) []weightedStep {
	return []weightedStep{{1, step{site: site, act: act}}}
}

// create and annihilate act on the fermion mode of the given bit.
func create(site, bit int) []weightedStep {
	return []weightedStep{{1, step{site: site, odd: true, mode: bit - 1, act: func(state int) (int, complex128) {
		if state&bit != 0 {
			return 0, 0
		}
		return state | bit, 1
	}}}}
}

func annihilate(site, bit int) []weightedStep {
	return []weightedStep{{1, step{site: site, odd: true, mode: bit - 1, act: func(state int) (int, complex128) {
		if state&bit == 0 {
			return 0, 0
		}
		return state &^ bit, 1
	}}}}
}

// steps resolves an operator by its name.
func (s Site) steps(op Op) ([]weightedStep, error) {
	if op.Diagonal != nil {
		return diagonal(op.Site, op.Diagonal), nil
	}
	var out []weightedStep
	switch s.Kind {
	case KindFermion:
		out = fermionSteps(op)
	case KindElectron:
		out = electronSteps(op)
	case KindBoson:
		out = bosonSteps(op)
	case KindSpin:
		out = spinSteps(op, s.Param)
	case KindClock:
		out = clockSteps(op, s.Param)
	}
	if out == nil {
		return nil, fmt.Errorf("exact: site %d has no operator %q", op.Site, op.Name)
	}
	return out, nil
}

func fermionSteps(op Op) []weightedStep {
	switch op.Name {
	case "c":
		return annihilate(op.Site, 1)
	case "c^+":
		return create(op.Site, 1)
	case "n":
		return diagonal(op.Site, func(state int) complex128 { return complex(float64(state), 0) })
	}
	return nil
}

const upBit, downBit = 1, 2

func electronSteps(op Op) []weightedStep {
	up := func(state int) float64 { return float64(state & upBit) }
	down := func(state int) float64 { return float64(state & downBit >> 1) }
	flip := func(from, to int) []weightedStep {
		return single(op.Site, func(state int) (int, complex128) {
			if state != from {
				return 0, 0
			}
			return to, 1
		})
	}
	switch op.Name {
	case "c_up":
		return annihilate(op.Site, upBit)
	case "c_up^+":
		return create(op.Site, upBit)
	case "c_down":
		return annihilate(op.Site, downBit)
	case "c_down^+":
		return create(op.Site, downBit)
	case "n_up":
		return diagonal(op.Site, func(state int) complex128 { return complex(up(state), 0) })
	case "n_down":
		return diagonal(op.Site, func(state int) complex128 { return complex(down(state), 0) })
	case "n":
		return diagonal(op.Site, func(state int) complex128 { return complex(up(state)+down(state), 0) })
	case "S^z":
		return diagonal(op.Site, func(state int) complex128 { return complex((up(state)-down(state))/2, 0) })
	case "S^+":
		return flip(downBit, upBit)
	case "S^-":
		return flip(upBit, downBit)
	}
	return nil
}

func bosonSteps(op Op) []weightedStep {
	switch op.Name {
	case "b":
		return single(op.Site, func(n int) (int, complex128) {
			return n - 1, complex(math.Sqrt(float64(n)), 0)
		})
	case "b^+":
		return single(op.Site, func(n int) (int, complex128) {
			return n + 1, complex(math.Sqrt(float64(n+1)), 0)
		})
	case "n":
		return diagonal(op.Site, func(n int) complex128 { return complex(float64(n), 0) })
	}
	return nil
}

func spinSteps(op Op, twoS int) []weightedStep {
	s := float64(twoS) / 2
	raise := func(state int) (int, complex128) {
		m := s - float64(state)
		if state == 0 {
			return 0, 0
		}
		return state - 1, complex(math.Sqrt(s*(s+1)-m*(m+1)), 0)
	}
	lower := func(state int) (int, complex128) {
		m := s - float64(state)
		if state == twoS {
			return 0, 0
		}
		return state + 1, complex(math.Sqrt(s*(s+1)-m*(m-1)), 0)
	}
	up, down := step{site: op.Site, act: raise}, step{site: op.Site, act: lower}
	switch op.Name {
	case "S^z":
		return diagonal(op.Site, func(state int) complex128 { return complex(s-float64(state), 0) })
	case "S^+":
		return []weightedStep{{1, up}}
	case "S^-":
		return []weightedStep{{1, down}}
	case "S^x":
		return []weightedStep{{0.5, up}, {0.5, down}}
	case "S^y":
		return []weightedStep{{-0.5i, up}, {0.5i, down}}
	}
	return nil
}

func clockSteps(op Op, q int) []weightedStep {
	phase := func(sign float64) []weightedStep {
		return diagonal(op.Site, func(m int) complex128 {
			sin, cos := math.Sincos(2 * math.Pi * float64(m) / float64(q))
			return complex(cos, sign*sin)
		})
	}
	turn := func(by int) []weightedStep {
		return single(op.Site, func(m int) (int, complex128) { return (m + by + q) % q, 1 })
	}
	switch op.Name {
	case "Z":
		return phase(1)
	case "Z^+":
		return phase(-1)
	case "X":
		return turn(1)
	case "X^+":
		return turn(-1)
	}
	return nil
}
