package ladder

import (
	"math"
	"math/big"
	"math/bits"
)

// exact is an integer of any size: an int64 as long as it fits, a big.Int beyond. The zero value is zero. Values are immutable.
type exact struct {
	small int64
	large *big.Int // nil while the value fits into small
}

func exactOf(n int64) exact { return exact{small: n} }

func exactFrom(b *big.Int) exact {
	if b.IsInt64() && b.Int64() != math.MinInt64 {
		return exact{small: b.Int64()}
	}
	return exact{large: b}
}

func (a exact) big() *big.Int {
	if a.large != nil {
		return a.large
	}
	return big.NewInt(a.small)
}

func (a exact) isZero() bool { return a.large == nil && a.small == 0 }

// isUnit reports whether the value is +1 or -1.
func (a exact) isUnit() bool { return a.large == nil && (a.small == 1 || a.small == -1) }

func (a exact) sign() int {
	if a.large != nil {
		return a.large.Sign()
	}
	switch {
	case a.small > 0:
		return 1
	case a.small < 0:
		return -1
	}
	return 0
}

func (a exact) neg() exact {
	if a.large != nil {
		return exactFrom(new(big.Int).Neg(a.large))
	}
	return exact{small: -a.small} // small is never MinInt64
}

func (a exact) plus(b exact) exact {
	if a.large == nil && b.large == nil {
		s := a.small + b.small
		overflow := (a.small >= 0) == (b.small >= 0) && (s >= 0) != (a.small >= 0)
		if !overflow && s != math.MinInt64 {
			return exact{small: s}
		}
	}
	return exactFrom(new(big.Int).Add(a.big(), b.big()))
}

func (a exact) times(b exact) exact {
	if a.large == nil && b.large == nil {
		hi, lo := bits.Mul64(magnitude(a.small), magnitude(b.small))
		if hi == 0 && lo <= math.MaxInt64 {
			if (a.small < 0) != (b.small < 0) {
				return exact{small: -int64(lo)}
			}
			return exact{small: int64(lo)}
		}
	}
	return exactFrom(new(big.Int).Mul(a.big(), b.big()))
}

// nearest returns the quotient of a/b (b != 0) rounded to the nearest integer, so that |a - q b| <= |b|/2.
func (a exact) nearest(b exact) exact {
	x, y := a.big(), b.big()
	double := new(big.Int).Lsh(x, 1)
	shift := new(big.Int).Abs(y)
	if y.Sign() < 0 {
		double.Neg(double)
	}
	double.Add(double, shift) // floor((2a' + |b|) / 2|b|), a' with the sign of b taken in
	return exactFrom(new(big.Int).Div(double, shift.Lsh(shift, 1)))
}

// residue returns a modulo m > 0 in 0..m-1; m = 0 leaves a as it is.
func (a exact) residue(m exact) exact {
	if m.isZero() {
		return a
	}
	if a.large == nil && m.large == nil {
		r := a.small % m.small
		if r < 0 {
			r += m.small
		}
		return exact{small: r}
	}
	return exactFrom(new(big.Int).Mod(a.big(), m.big()))
}

// cmpAbs compares absolute values.
func (a exact) cmpAbs(b exact) int {
	if a.large == nil && b.large == nil {
		x, y := magnitude(a.small), magnitude(b.small)
		switch {
		case x < y:
			return -1
		case x > y:
			return 1
		}
		return 0
	}
	return a.big().CmpAbs(b.big())
}

// int64 returns the value if it fits.
func (a exact) int64() (int64, bool) { return a.small, a.large == nil }

// float returns the value as a float64; beyond 2^53 it is rounded.
func (a exact) float() float64 {
	if a.large == nil {
		return float64(a.small)
	}
	f, _ := new(big.Float).SetInt(a.large).Float64()
	return f
}

func (a exact) String() string { return a.big().String() }

func magnitude(n int64) uint64 {
	if n < 0 {
		return uint64(-n)
	}
	return uint64(n)
}
