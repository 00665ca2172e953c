package mpo

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"rundle/internal/dense"
	"rundle/mps/block"
)

// Operator is a matrix-product operator. Treat it as immutable: the functions of this package return new operators, which
// may share sites with their arguments.
type Operator[T dense.Scalar] struct {
	Group block.Group
	Phys  []block.Axis // one per site, flow In
	Bonds []Bond       // one more than sites; bond b lies left of site b
	Sites [][]Entry[T]
}

// Bond describes the indices of one bond. Index i stands for a string of operators on the left of the bond, which adds
// Charges[i] to the state, and for what may follow it on the right.
type Bond struct {
	Charges []block.Charge // nondecreasing
	Vacant  int            // the string "nothing placed yet": its left part is exactly the identity; -1: none
	Done    int            // the string "all placed": its right part is exactly the identity; -1: none
}

// Dim returns the number of indices.
func (b Bond) Dim() int { return len(b.Charges) }

// Axis returns the bond as an axis of the given flow.
func (b Bond) Axis(flow block.Flow) block.Axis {
	var sectors []block.Sector
	for i, c := range b.Charges {
		if i > 0 && b.Charges[i-1] == c {
			sectors[len(sectors)-1].Dim++
			continue
		}
		sectors = append(sectors, block.Sector{Charge: c, Dim: 1})
	}
	return block.NewAxis(flow, sectors...)
}

// Entry is one element of a site's tensor: W[Left, Right] has <Out|W|In> = Value, states in the order of the site's axis.
// Entries are sorted by Left, Right, Out, In; none is repeated and none is zero. The charges obey
// q(Left) + q(Out) - q(In) = q(Right).
type Entry[T dense.Scalar] struct {
	Left, Right, Out, In int32
	Value                T
}

// Len returns the number of sites.
func (o *Operator[T]) Len() int { return len(o.Sites) }

// Charge returns what the operator adds to a state.
func (o *Operator[T]) Charge() block.Charge { return o.Bonds[len(o.Sites)].Charges[0] }

// BondDims returns the dimension of each of the Len()+1 bonds; the first and the last are 1.
func (o *Operator[T]) BondDims() []int {
	dims := make([]int, len(o.Bonds))
	for i, b := range o.Bonds {
		dims[i] = b.Dim()
	}
	return dims
}

// String tells sites and largest bond.
func (o *Operator[T]) String() string {
	return fmt.Sprintf("operator on %d sites, largest bond %d, charge %v", o.Len(), slices.Max(o.BondDims()), o.Charge())
}

// dims lists the local dimensions.
func (o *Operator[T]) dims() []int {
	d := make([]int, len(o.Phys))
	for i, a := range o.Phys {
		d[i] = a.Dim()
	}
	return d
}

// mustMatch panics unless a and b act on the same space.
func mustMatch[T dense.Scalar](what string, a, b *Operator[T]) {
	if a.Group != b.Group || !slices.EqualFunc(a.Phys, b.Phys, block.Axis.Equal) {
		panic(fmt.Sprintf("mpo: %s of operators on different spaces: %v, local dimensions %v, and %v, local dimensions %v",
			what, a.Group, a.dims(), b.Group, b.dims()))
	}
}

// noise is the part of the summed magnitudes below which a sum counts as zero: a few roundings.
const noise = 8 * 0x1p-52

// settle sorts entries, adds up those with equal indices and drops what cancels.
func settle[T dense.Scalar](all []Entry[T]) []Entry[T] {
	slices.SortFunc(all, func(a, b Entry[T]) int {
		return cmp.Or(cmp.Compare(a.Left, b.Left), cmp.Compare(a.Right, b.Right), cmp.Compare(a.Out, b.Out), cmp.Compare(a.In, b.In))
	})
	out := all[:0]
	for i := 0; i < len(all); {
		e, size := all[i], dense.Abs(all[i].Value)
		for i++; i < len(all) && e.Left == all[i].Left && e.Right == all[i].Right && e.Out == all[i].Out && e.In == all[i].In; i++ {
			e.Value += all[i].Value
			size += dense.Abs(all[i].Value)
		}
		if dense.Abs(e.Value) > noise*size {
			out = append(out, e)
		}
	}
	return out
}

// exponent returns the integer e with 2^e <= |x| < 2^(e+1); x is not zero.
func exponent[T dense.Scalar](x T) int {
	_, e := math.Frexp(dense.Abs(x))
	return e - 1
}
