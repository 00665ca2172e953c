package exact

import (
	"fmt"
	"math/bits"
	"slices"
)

// A Number is a conserved quantity that is a sum over sites.
type Number struct {
	Name    string
	Modulus int     // 0: an integer; q >= 2: counted modulo q
	Weights [][]int // Weights[site][state]
}

// NewNumber tabulates the weights of a conserved number.
func NewNumber(name string, modulus int, sites []Site, weight func(i int, s Site, state int) int) Number {
	w := make([][]int, len(sites))
	for i, s := range sites {
		w[i] = make([]int, s.Dim())
		for state := range w[i] {
			w[i][state] = weight(i, s, state)
		}
	}
	return Number{name, modulus, w}
}

// Particles counts fermions, electrons and bosons on the given sites, or on
// all of them if none is given.
func Particles(sites []Site, on ...int) Number {
	return NewNumber("N", 0, sites, func(i int, s Site, state int) int {
		if len(on) > 0 && !slices.Contains(on, i) {
			return 0
		}
		if s.Kind == KindBoson {
			return state
		}
		return s.fermions(state)
	})
}

// UpParticles and DownParticles count one component of the electrons.
func UpParticles(sites []Site) Number {
	return NewNumber("N_up", 0, sites, func(_ int, s Site, state int) int {
		if s.Kind != KindElectron {
			return 0
		}
		return state & upBit
	})
}

// DownParticles counts electrons of component down.
func DownParticles(sites []Site) Number {
	return NewNumber("N_down", 0, sites, func(_ int, s Site, state int) int {
		if s.Kind != KindElectron {
			return 0
		}
		return state & downBit >> 1
	})
}

// TwiceSz is 2 S^z of all spins and electrons.
func TwiceSz(sites []Site) Number {
	return NewNumber("2Sz", 0, sites, func(_ int, s Site, state int) int {
		switch s.Kind {
		case KindSpin:
			return s.Param - 2*state
		case KindElectron:
			return state&upBit - state&downBit>>1
		}
		return 0
	})
}

// ClockCharge is the sum of the clock positions modulo q.
func ClockCharge(sites []Site, q int) Number {
	return NewNumber("Q", q, sites, func(_ int, s Site, state int) int {
		if s.Kind != KindClock {
			return 0
		}
		return state
	})
}

// Modulo returns the same number counted modulo q.
func (n Number) Modulo(q int) Number { return Number{n.Name, q, n.Weights} }

func (n Number) reduce(v int) int {
	if n.Modulus == 0 {
		return v
	}
	return (v%n.Modulus + n.Modulus) % n.Modulus
}

// maxNumbers bounds the conserved numbers of one basis.
const maxNumbers = 6

type charge [maxNumbers]int

// A Basis lists the states of a sector. States are ordered lexicographically,
// site 0 first.
type Basis struct {
	Sites   []Site
	Numbers []Number
	stride  []uint64
	codes   []uint64
	total   charge
}

// NewBasis lists the states with the given values of the given numbers.
func NewBasis(sites []Site, numbers []Number, values []int) (*Basis, error) {
	if len(numbers) != len(values) || len(numbers) > maxNumbers {
		return nil, fmt.Errorf("exact: %d numbers (at most %d), %d values", len(numbers), maxNumbers, len(values))
	}
	b := &Basis{Sites: sites, Numbers: numbers, stride: make([]uint64, len(sites))}
	size := uint64(1)
	for i := len(sites) - 1; i >= 0; i-- {
		b.stride[i] = size
		hi, lo := bits.Mul64(size, uint64(sites[i].Dim()))
		if hi != 0 {
			return nil, fmt.Errorf("exact: the states of %d sites do not fit into 64 bits", len(sites))
		}
		size = lo
	}
	for i, n := range numbers {
		if len(n.Weights) != len(sites) {
			return nil, fmt.Errorf("exact: number %q has weights for %d of %d sites", n.Name, len(n.Weights), len(sites))
		}
		b.total[i] = n.reduce(values[i])
	}
	b.list(b.suffixes(), 0, 0, charge{})
	if len(b.codes) == 0 {
		return nil, fmt.Errorf("exact: no state has the values %v", values)
	}
	return b, nil
}

func (b *Basis) add(c charge, site, state int) charge {
	for i, n := range b.Numbers {
		c[i] = n.reduce(c[i] + n.Weights[site][state])
	}
	return c
}

// suffixes returns, for every site, the charges that the sites from it on can
// hold.
func (b *Basis) suffixes() []map[charge]bool {
	sets := make([]map[charge]bool, len(b.Sites)+1)
	sets[len(b.Sites)] = map[charge]bool{{}: true}
	for i := len(b.Sites) - 1; i >= 0; i-- {
		sets[i] = map[charge]bool{}
		for c := range sets[i+1] {
			for state := range b.Sites[i].Dim() {
				sets[i][b.add(c, i, state)] = true
			}
		}
	}
	return sets
}

func (b *Basis) list(reach []map[charge]bool, site int, code uint64, have charge) {
	var missing charge
	for i, n := range b.Numbers {
		missing[i] = n.reduce(b.total[i] - have[i])
	}
	if !reach[site][missing] {
		return
	}
	if site == len(b.Sites) {
		b.codes = append(b.codes, code)
		return
	}
	for state := range b.Sites[site].Dim() {
		b.list(reach, site+1, code+uint64(state)*b.stride[site], b.add(have, site, state))
	}
}

// Dim returns the number of states.
func (b *Basis) Dim() int { return len(b.codes) }

// State returns the local states of basis state i.
func (b *Basis) State(i int) []int {
	out := make([]int, len(b.Sites))
	b.decode(out, i)
	return out
}

func (b *Basis) decode(out []int, i int) {
	code := b.codes[i]
	for k, stride := range b.stride {
		out[k] = int(code / stride)
		code %= stride
	}
}

// Index finds a state by its local states.
func (b *Basis) Index(state []int) (int, bool) {
	i, where := b.find(state)
	return i, where == inside
}

type place byte

const (
	inside  place = iota
	beyond        // a local state is past the cut
	outside       // the state has other conserved numbers
)

func (b *Basis) find(state []int) (int, place) {
	var code uint64
	for k, s := range state {
		if s < 0 || s >= b.Sites[k].Dim() {
			return 0, beyond
		}
		code += uint64(s) * b.stride[k]
	}
	if i, ok := slices.BinarySearch(b.codes, code); ok {
		return i, inside
	}
	return 0, outside
}
