package block

import (
	"fmt"
	"slices"
	"sort"
	"strings"
)

// Flow is the direction in which an axis carries its charge.
type Flow int8

// In counts a charge positively, Out negatively.
const (
	In  Flow = +1
	Out Flow = -1
)

// String returns "in" or "out".
func (f Flow) String() string {
	switch f {
	case In:
		return "in"
	case Out:
		return "out"
	}
	return fmt.Sprintf("flow(%d)", int8(f))
}

// Sector is a set of Dim states of one charge.
type Sector struct {
	Charge Charge
	Dim    int
}

// Axis is one index of a tensor: its states sorted by charge. Sectors increase strictly by charge and have positive dimension.
// Axes share their sectors freely: never write into them.
type Axis struct {
	Flow    Flow
	Sectors []Sector
}

// NewAxis sorts the sectors by charge, merges those of equal charge and drops empty ones. A negative dimension panics.
func NewAxis(flow Flow, sectors ...Sector) Axis {
	if flow != In && flow != Out {
		panic(fmt.Sprintf("block: axis with flow %d; want In (+1) or Out (-1)", flow))
	}
	s := make([]Sector, 0, len(sectors))
	for _, x := range sectors {
		if x.Dim < 0 {
			panic(fmt.Sprintf("block: sector %v with dimension %d", x.Charge, x.Dim))
		}
		if x.Dim > 0 {
			s = append(s, x)
		}
	}
	slices.SortStableFunc(s, func(x, y Sector) int { return x.Charge.Compare(y.Charge) })
	n := 0
	for _, x := range s {
		if n > 0 && s[n-1].Charge == x.Charge {
			s[n-1].Dim += x.Dim
			continue
		}
		s[n] = x
		n++
	}
	return Axis{Flow: flow, Sectors: s[:n:n]}
}

// Charges lists the charge of every state.
func (a Axis) Charges() []Charge {
	out := make([]Charge, 0, a.Dim())
	for _, s := range a.Sectors {
		for range s.Dim {
			out = append(out, s.Charge)
		}
	}
	return out
}

// Dim returns the number of states.
func (a Axis) Dim() int { return a.Offset(len(a.Sectors)) }

// Offset returns the dense index of the first state of sector pos.
func (a Axis) Offset(pos int) int {
	n := 0
	for _, s := range a.Sectors[:pos] {
		n += s.Dim
	}
	return n
}

// Reversed returns the axis with the opposite flow.
func (a Axis) Reversed() Axis { return Axis{Flow: -a.Flow, Sectors: a.Sectors} }

// Find returns the position of the sector of charge c.
func (a Axis) Find(c Charge) (pos int, ok bool) {
	pos = sort.Search(len(a.Sectors), func(i int) bool { return a.Sectors[i].Charge.Compare(c) >= 0 })
	return pos, pos < len(a.Sectors) && a.Sectors[pos].Charge == c
}

// Equal reports whether flow and sectors agree.
func (a Axis) Equal(b Axis) bool { return a.Flow == b.Flow && a.sameSectors(b) }

func (a Axis) sameSectors(b Axis) bool {
	if len(a.Sectors) != len(b.Sectors) {
		return false
	}
	if len(a.Sectors) == 0 || &a.Sectors[0] == &b.Sectors[0] {
		return true
	}
	return slices.Equal(a.Sectors, b.Sectors)
}

// check panics unless the axis is well formed for the group.
func (a Axis) check(g Group) {
	if a.Flow != In && a.Flow != Out {
		panic(fmt.Sprintf("block: axis with flow %d; want In (+1) or Out (-1)", a.Flow))
	}
	for i, s := range a.Sectors {
		switch {
		case s.Dim <= 0:
			panic(fmt.Sprintf("block: axis %v: sector %d has dimension %d", a, i, s.Dim))
		case !g.valid(s.Charge):
			panic(fmt.Sprintf("block: axis %v: charge %v is not a normalized charge of the group %v", a, s.Charge, g))
		case i > 0 && a.Sectors[i-1].Charge.Compare(s.Charge) >= 0:
			panic(fmt.Sprintf("block: axis %v: sectors are not in increasing order of charge", a))
		}
	}
}

// shownSectors bounds the length of an axis in a message.
const shownSectors = 12

// String returns flow, dimension and sectors, as in "in 3 {[0 0 0 0]:1 [1 0 0 0]:2}".
func (a Axis) String() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%v %d {", a.Flow, a.Dim())
	for i, s := range a.Sectors {
		if i > 0 {
			b.WriteByte(' ')
		}
		if i == shownSectors {
			fmt.Fprintf(&b, "... %d more", len(a.Sectors)-i)
			break
		}
		fmt.Fprintf(&b, "%v:%d", s.Charge, s.Dim)
	}
	b.WriteByte('}')
	return b.String()
}
