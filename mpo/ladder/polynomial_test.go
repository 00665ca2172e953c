package ladder

import (
	"math/bits"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// The oracle: states are words of bits, one per fermion mode or spin-1/2, in the order of the sites (up before down); a
// fermion operator counts the occupied modes before its own.

type elementary struct {
	mode   int
	raise  bool
	signed bool
}

// act applies an elementary operator to a basis state; 0 sign: nothing is left.
func (e elementary) act(state uint64, fermions uint64) (uint64, int) {
	bit := uint64(1) << e.mode
	if (state&bit != 0) == e.raise {
		return 0, 0
	}
	sign := 1
	if e.signed && bits.OnesCount64(state&fermions&(bit-1))%2 == 1 {
		sign = -1
	}
	return state ^ bit, sign
}

type amplitudes map[uint64]complex128

func applyAll(ops []elementary, fermions uint64, c complex128, in amplitudes, out amplitudes) {
	for state, amp := range in {
		sign := 1
		for k := len(ops) - 1; k >= 0 && sign != 0; k-- {
			var s int
			state, s = ops[k].act(state, fermions)
			sign *= s
		}
		if sign != 0 {
			out[state] += c * amp * complex(float64(sign), 0)
		}
	}
}

// bitLadder is a mixed ladder with the modes of each site.
type bitLadder struct {
	*Ladder
	first    []int // mode of each site
	modes    int
	fermions uint64
}

func newBitLadder(t require.TestingT) *bitLadder {
	l, err := New(3, Open, Leg("f", Fermion()), Leg("s", Spin(1)), Leg("e", Electron(), OnRungs(0, 2)))
	require.NoError(t, err)
	b := &bitLadder{Ladder: l}
	for i := range l.Sites() {
		b.first = append(b.first, b.modes)
		switch l.Site(i).Kind() {
		case KindFermion:
			b.fermions |= 1 << b.modes
			b.modes++
		case KindElectron:
			b.fermions |= 3 << b.modes
			b.modes += 2
		default:
			b.modes++
		}
	}
	return b
}

// local is the polynomial of an elementary operator.
func (b *bitLadder) local(e elementary) *Polynomial {
	site := 0
	for site+1 < len(b.first) && b.first[site+1] <= e.mode {
		site++
	}
	op := modeLower
	if e.raise {
		op = modeRaise
	}
	if b.Site(site).Kind() == KindSpin {
		op = map[bool]OpID{true: 2, false: 3}[!e.raise] // a set bit is spin down, state 1
	}
	if e.mode > b.first[site] {
		op *= 4
	}
	return Local(b.Ladder, site, op)
}

// elementary writes a term's factors in elementary operators, as a list of coefficient and product.
func (b *bitLadder) spell(f []Factor) []elementary {
	var out []elementary
	for _, x := range f {
		m := b.first[x.Site]
		add := func(mode int, op OpID, signed bool) {
			lower, raise := elementary{mode, false, signed}, elementary{mode, true, signed}
			switch op {
			case modeLower:
				out = append(out, lower)
			case modeRaise:
				out = append(out, raise)
			case modeNumber:
				out = append(out, raise, lower)
			}
		}
		switch b.Site(int(x.Site)).Kind() {
		case KindFermion:
			add(m, x.Op, true)
		case KindElectron:
			add(m, x.Op%4, true)
			add(m+1, x.Op/4, true)
		case KindSpin:
			switch x.Op {
			case 2:
				add(m, modeLower, false)
			case 3:
				add(m, modeRaise, false)
			}
		}
	}
	return out
}

// apply applies a polynomial; S^z is read off the bit.
func (b *bitLadder) apply(p *Polynomial, in amplitudes) amplitudes {
	out := amplitudes{}
	for i := range p.NumTerms() {
		c, f := p.Term(i)
		diagonal := amplitudes{}
		for state, amp := range in {
			for _, x := range f {
				if b.Site(int(x.Site)).Kind() == KindSpin && x.Op == 1 {
					amp *= complex(0.5-float64(state>>b.first[x.Site]&1), 0)
				}
			}
			diagonal[state] = amp
		}
		applyAll(b.spell(f), b.fermions, c, diagonal, out)
	}
	return out
}

func sameState(t require.TestingT, a, b amplitudes) {
	for _, pair := range [2][2]amplitudes{{a, b}, {b, a}} {
		for state, amp := range pair[0] {
			require.InDelta(t, 0, cmplx.Abs(amp-pair[1][state]), 1e-12)
		}
	}
}

func TestFermionSigns(t *testing.T) {
	b := newBitLadder(t)
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 9).Draw(t, "n")
		ops := make([]elementary, n)
		product := One(b.Ladder)
		chunk := One(b.Ladder)
		for i := range ops {
			m := rapid.IntRange(0, b.modes-1).Draw(t, "mode")
			ops[i] = elementary{m, rapid.Bool().Draw(t, "raise"), b.fermions>>m&1 == 1}
			var err error
			chunk, err = chunk.Mul(b.local(ops[i]))
			require.NoError(t, err)
			if i == n-1 || rapid.Bool().Draw(t, "close") {
				product, err = product.Mul(chunk)
				require.NoError(t, err)
				chunk = One(b.Ladder)
			}
		}
		in := amplitudes{}
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		for range 40 {
			in[rng.Uint64N(1<<b.modes)] = complex(rng.NormFloat64(), rng.NormFloat64())
		}
		want := amplitudes{}
		applyAll(ops, b.fermions, 1, in, want)
		sameState(t, want, b.apply(product, in))

		reversed := make([]elementary, n)
		for i, e := range ops {
			reversed[n-1-i] = elementary{e.mode, !e.raise, e.signed}
		}
		want = amplitudes{}
		applyAll(reversed, b.fermions, 1, in, want)
		sameState(t, want, b.apply(product.Adjoint(), in))
	})
}

// randomPolynomial has a few terms of a few elementary operators each.
func randomPolynomial(t *rapid.T, b *bitLadder) *Polynomial {
	p := Zero(b.Ladder)
	for range rapid.IntRange(0, 3).Draw(t, "terms") {
		q := One(b.Ladder).Scale(complex(float64(rapid.IntRange(-3, 3).Draw(t, "re")), float64(rapid.IntRange(1, 3).Draw(t, "im"))))
		for range rapid.IntRange(0, 4).Draw(t, "degree") {
			m := rapid.IntRange(0, b.modes-1).Draw(t, "mode")
			var err error
			q, err = q.Mul(b.local(elementary{m, rapid.Bool().Draw(t, "raise"), true}))
			require.NoError(t, err)
		}
		p = p.Add(q)
	}
	return p
}

func TestPolynomialsFormAnAlgebra(t *testing.T) {
	b := newBitLadder(t)
	rapid.Check(t, func(t *rapid.T) {
		p, q, r := randomPolynomial(t, b), randomPolynomial(t, b), randomPolynomial(t, b)
		mul := func(x, y *Polynomial) *Polynomial {
			z, err := x.Mul(y)
			require.NoError(t, err)
			return z
		}
		equal := func(x, y *Polynomial) { require.True(t, x.Equal(y, 1e-12), "%v and %v", x, y) }
		equal(mul(mul(p, q), r), mul(p, mul(q, r)))
		equal(mul(p, q.Add(r)), mul(p, q).Add(mul(p, r)))
		equal(mul(p, q).Adjoint(), mul(q.Adjoint(), p.Adjoint()))
		equal(p.Adjoint().Adjoint(), p)
		equal(p.Add(q).Sub(q), p)
		equal(p.Scale(2i).Adjoint(), p.Adjoint().Scale(-2i))
		require.Zero(t, p.Sub(p).NumTerms())
		ok, _ := p.Add(p.Adjoint()).Hermitian(1e-12)
		require.True(t, ok)
		for i := 1; i < p.NumTerms(); i++ {
			_, f := p.Term(i - 1)
			_, g := p.Term(i)
			require.Negative(t, compareFactors(f, g), "sorted, each product once")
		}
	})
}

func TestPolynomialReports(t *testing.T) {
	l, err := New(2, Open, Leg("a", Fermion()))
	require.NoError(t, err)
	c0, c1 := Local(l, 0, modeLower), Local(l, 1, modeRaise)
	hop, err := c1.Mul(c0)
	require.NoError(t, err)
	require.Equal(t, "-c[a,0] c^+[a,1]", hop.String())
	ok, bad := hop.Hermitian(1e-12)
	require.False(t, ok)
	require.Equal(t, "-c[a,0] c^+[a,1]", bad)
	bad, odd := hop.Add(c0.Scale(0.5)).Odd()
	require.True(t, odd)
	require.Equal(t, "0.5 c[a,0]", bad)
	_, odd = hop.Odd()
	require.False(t, odd)
	require.Equal(t, "0", Zero(l).String())
	require.Equal(t, "1", One(l).String())
	require.Equal(t, 1, hop.Add(c0.Scale(1e-17)).DropZeros(1e-15).NumTerms())
	require.Equal(t, "1.5 + (1-2*i) c[a,0]", One(l).Scale(1.5).Add(c0.Scale(1-2i)).String())
	other, err := New(2, Open, Leg("a", Fermion()))
	require.NoError(t, err)
	require.Panics(t, func() { hop.Add(One(other)) })
	require.Panics(t, func() { Local(l, 2, modeLower) })
}

func TestBuilderMergesOnTheWay(t *testing.T) {
	l, err := New(10, Open, Leg("a", Boson(2)))
	require.NoError(t, err)
	b := NewBuilder(l)
	b.next = 100
	for i := range 1000 {
		b.Add(1, Factor{int32(i % 10), bosonOp(1, 1, 0)})
		require.LessOrEqual(t, len(b.list.coef), firstMerge)
	}
	p := b.Polynomial()
	require.Equal(t, 10, p.NumTerms())
	c, f := p.Term(3)
	require.Equal(t, complex128(100), c)
	require.Equal(t, []Factor{{3, bosonOp(1, 1, 0)}}, f)
}

func BenchmarkMerge(b *testing.B) { // terms=1e6
	l, _ := New(1000, Open, Leg("a", Boson(2)))
	var terms list
	rng := rand.New(rand.NewPCG(1, 2))
	for range 1_000_000 {
		i := rng.Int32N(999)
		terms.add(1, []Factor{{i, bosonOp(1, 0, 0)}, {i + 1 + rng.Int32N(999-i), bosonOp(0, 1, 0)}})
	}
	b.ReportAllocs()
	for b.Loop() {
		p := Polynomial{l, terms.merged()}
		b.ReportMetric(float64(p.NumTerms()), "terms")
	}
}
