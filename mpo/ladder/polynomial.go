package ladder

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"
)

// MaxTerms bounds the terms of a polynomial, also before merging.
const MaxTerms = 20_000_000

// maxFactors bounds their factors together: 1.3 GB.
const maxFactors = 8 * MaxTerms

var errTooMany = errors.New("more than 20 million terms")

// Factor is a basis element on a site.
type Factor struct {
	Site int32
	Op   OpID
}

// key orders factors, above 0.
func (f Factor) key() uint64 { return (uint64(f.Site)+1)<<32 | uint64(f.Op) }

// Polynomial is a sum of terms on a ladder: a coefficient times a product of basis elements in the order of the sites, identities left
// out, fermionic signs already in the coefficient. Terms are sorted by their factors and each product occurs once. A Polynomial never
// changes once made, and may be shared.
type Polynomial struct {
	ladder *Ladder
	list
}

// list is a sequence of terms in two slabs, without order.
type list struct {
	coef    []complex128
	start   []uint32 // start[i]..start[i+1] are the factors of term i
	factors []Factor
}

func (l *list) reset() {
	l.coef, l.factors = l.coef[:0], l.factors[:0]
	if len(l.start) == 0 {
		l.start = append(l.start, 0)
	}
	l.start = l.start[:1]
}

func (l *list) term(i int) []Factor { return l.factors[l.start[i]:l.start[i+1]:l.start[i+1]] }

// add appends a term; f is copied.
func (l *list) add(c complex128, f []Factor) {
	l.factors = append(l.factors, f...)
	l.close(c)
}

// close ends a term whose factors have been appended.
func (l *list) close(c complex128) {
	if len(l.start) == 0 {
		l.start = append(l.start, 0)
	}
	l.coef = append(l.coef, c)
	l.start = append(l.start, uint32(len(l.factors)))
}

func (l *list) addAll(m *list, c complex128) {
	for i, z := range m.coef {
		l.add(z*c, m.term(i))
	}
}

// full reports an error before the slabs grow beyond what is allowed.
func (l *list) full() error {
	if len(l.coef) > MaxTerms || len(l.factors) > maxFactors {
		return errTooMany
	}
	return nil
}

func compareFactors(a, b []Factor) int {
	for i := range min(len(a), len(b)) {
		if a[i] != b[i] {
			if c := cmp.Compare(a[i].Site, b[i].Site); c != 0 {
				return c
			}
			return cmp.Compare(a[i].Op, b[i].Op)
		}
	}
	return cmp.Compare(len(a), len(b))
}

// merged returns the terms sorted, like products added in the order given, and cancelled ones dropped.
func (l *list) merged() list {
	type head struct {
		first, second uint64 // factors, so that most comparisons stay in this array
		index         uint32
	}
	n := len(l.coef)
	heads := make([]head, n)
	for i := range heads {
		heads[i].index = uint32(i)
		f := l.term(i)
		if len(f) > 0 {
			heads[i].first = f[0].key()
		}
		if len(f) > 1 {
			heads[i].second = f[1].key()
		}
	}
	slices.SortFunc(heads, func(a, b head) int {
		switch {
		case a.first != b.first:
			return cmp.Compare(a.first, b.first)
		case a.second != b.second:
			return cmp.Compare(a.second, b.second)
		case a.second != 0:
			if c := compareFactors(l.term(int(a.index))[2:], l.term(int(b.index))[2:]); c != 0 {
				return c
			}
		}
		return cmp.Compare(a.index, b.index)
	})
	distinct, factors := 0, 0
	for i := range heads {
		if i == 0 || compareFactors(l.term(int(heads[i-1].index)), l.term(int(heads[i].index))) != 0 {
			distinct++
			factors += len(l.term(int(heads[i].index)))
		}
	}
	out := list{coef: make([]complex128, 0, distinct), start: make([]uint32, 1, distinct+1), factors: make([]Factor, 0, factors)}
	for i := 0; i < n; {
		f := l.term(int(heads[i].index))
		sum, size := complex128(0), 0.0
		for ; i < n && compareFactors(f, l.term(int(heads[i].index))) == 0; i++ {
			c := l.coef[heads[i].index]
			sum += c
			size += cmplx.Abs(c)
		}
		if !cancels(sum, size, cancelled) {
			out.add(sum, f)
		}
	}
	return out
}

// Zero is the empty sum on a ladder.
func Zero(l *Ladder) *Polynomial { return &Polynomial{ladder: l, list: list{start: []uint32{0}}} }

// One is the identity.
func One(l *Ladder) *Polynomial {
	p := Zero(l)
	p.add(1, nil)
	return p
}

// Local is a basis element on a site.
func Local(l *Ladder, site int, op OpID) *Polynomial {
	if site < 0 || site >= l.Sites() {
		panic(fmt.Sprintf("ladder: site %d of a ladder with %d sites", site, l.Sites()))
	}
	if op == Identity {
		return One(l)
	}
	p := Zero(l)
	p.add(1, []Factor{{int32(site), op}})
	return p
}

// Ladder returns the ladder of the polynomial.
func (p *Polynomial) Ladder() *Ladder { return p.ladder }

// NumTerms returns the number of terms.
func (p *Polynomial) NumTerms() int { return len(p.coef) }

// Term returns term i; the factors must not be changed.
func (p *Polynomial) Term(i int) (complex128, []Factor) { return p.coef[i], p.term(i) }

func (p *Polynomial) same(q *Polynomial) {
	if p.ladder != q.ladder {
		panic(fmt.Sprintf("ladder: polynomials on different ladders (%d and %d sites)", p.ladder.Sites(), q.ladder.Sites()))
	}
}

// Add returns p + q.
func (p *Polynomial) Add(q *Polynomial) *Polynomial { return p.plus(q, 1) }

// Sub returns p - q.
func (p *Polynomial) Sub(q *Polynomial) *Polynomial { return p.plus(q, -1) }

func (p *Polynomial) plus(q *Polynomial, c complex128) *Polynomial {
	p.same(q)
	b := NewBuilder(p.ladder)
	b.AddPolynomial(1, p)
	b.AddPolynomial(c, q)
	return b.Polynomial()
}

// Scale returns c·p.
func (p *Polynomial) Scale(c complex128) *Polynomial {
	out := Zero(p.ladder)
	if c != 0 {
		out.addAll(&p.list, c)
	}
	return out
}

// Mul returns p·q, or an error if it has too many terms or too high powers.
func (p *Polynomial) Mul(q *Polynomial) (*Polynomial, error) {
	p.same(q)
	m := multiplier{ladder: p.ladder}
	var out list
	for i, a := range p.coef {
		for k, b := range q.coef {
			if err := m.multiply(&out, a*b, p.term(i), q.term(k)); err != nil {
				return nil, err
			}
		}
		if err := out.full(); err != nil {
			return nil, err
		}
	}
	return &Polynomial{p.ladder, out.merged()}, nil
}

// Adjoint returns the Hermitian conjugate.
func (p *Polynomial) Adjoint() *Polynomial {
	m := multiplier{ladder: p.ladder}
	var out list
	for i, c := range p.coef {
		if err := m.adjoint(&out, c, p.term(i)); err != nil {
			panic("ladder: " + err.Error())
		}
	}
	return &Polynomial{p.ladder, out.merged()}
}

// Largest returns the largest |coefficient|.
func (p *Polynomial) Largest() float64 {
	largest := 0.0
	for _, c := range p.coef {
		largest = max(largest, cmplx.Abs(c))
	}
	return largest
}

// DropZeros leaves out the terms whose coefficient is at most tol times the largest.
func (p *Polynomial) DropZeros(tol float64) *Polynomial {
	cut := tol * p.Largest()
	out := Zero(p.ladder)
	for i, c := range p.coef {
		if cmplx.Abs(c) > cut {
			out.add(c, p.term(i))
		}
	}
	return out
}

// Equal reports whether no coefficient of p - q exceeds tol times the largest of p and q.
func (p *Polynomial) Equal(q *Polynomial, tol float64) bool {
	return p.Sub(q).Largest() <= tol*max(p.Largest(), q.Largest())
}

// find returns the coefficient of a product of factors, 0 if it does not occur.
func (p *Polynomial) find(f []Factor) complex128 {
	lo, hi := 0, len(p.coef)
	for lo < hi {
		mid := (lo + hi) / 2
		if compareFactors(p.term(mid), f) < 0 {
			lo = mid + 1
		} else {
			hi = mid
		}
	}
	if lo < len(p.coef) && slices.Equal(p.term(lo), f) {
		return p.coef[lo]
	}
	return 0
}

// Hermitian reports whether p equals its adjoint up to tol times the largest coefficient; if not, offending is the worst term.
func (p *Polynomial) Hermitian(tol float64) (ok bool, offending string) {
	m := multiplier{ladder: p.ladder}
	var conj list
	worst, at := tol*p.Largest(), -1
	for i, c := range p.coef {
		conj.reset()
		if err := m.adjoint(&conj, c, p.term(i)); err != nil {
			panic("ladder: " + err.Error())
		}
		for k, z := range conj.coef { // one element: the adjoint of a basis element is one
			if d := cmplx.Abs(z - p.find(conj.term(k))); d > worst {
				worst, at = d, i
			}
		}
	}
	if at < 0 {
		return true, ""
	}
	return false, p.Format(at)
}

// Odd reports whether a term has an odd number of fermion operators, and returns the first such term.
func (p *Polynomial) Odd() (offending string, odd bool) {
	for i := range p.coef {
		if n := p.oddFactors(p.term(i)); n%2 == 1 {
			return p.Format(i), true
		}
	}
	return "", false
}

func (p *Polynomial) oddFactors(f []Factor) int {
	n := 0
	for _, x := range f {
		if p.ladder.Site(int(x.Site)).Odd(x.Op) {
			n++
		}
	}
	return n
}

// Format writes term i as a formula would: "-1.5 b^+[a,1] b[a,0]".
func (p *Polynomial) Format(i int) string {
	c, f := p.Term(i)
	if len(f) == 0 {
		return formatNumber(c)
	}
	var s []string
	switch {
	case c == -1:
		s = append(s, "-"+p.ladder.FormatOp(int(f[0].Site), f[0].Op))
		f = f[1:]
	case c != 1:
		s = append(s, formatNumber(c))
	}
	for _, x := range f {
		s = append(s, p.ladder.FormatOp(int(x.Site), x.Op))
	}
	return strings.Join(s, " ")
}

// String writes the sum; beyond a hundred terms it says how many more there are.
func (p *Polynomial) String() string {
	const most = 100
	if len(p.coef) == 0 {
		return "0"
	}
	var b strings.Builder
	for i := range min(len(p.coef), most) {
		s := p.Format(i)
		switch {
		case i == 0:
		case strings.HasPrefix(s, "-"):
			b.WriteString(" - ")
			s = s[1:]
		default:
			b.WriteString(" + ")
		}
		b.WriteString(s)
	}
	if more := len(p.coef) - most; more > 0 {
		fmt.Fprintf(&b, " + ... (%d more terms)", more)
	}
	return b.String()
}

// finite reports the first coefficient that is not a finite number.
func (p *Polynomial) finite() (offending string, ok bool) {
	for i, c := range p.coef {
		if !finite(c) || cmplx.Abs(c) > math.MaxFloat64/4 {
			return p.Format(i), false
		}
	}
	return "", true
}

// Builder collects many terms and merges them once; memory stays within a small multiple of the merged size.
type Builder struct {
	ladder *Ladder
	list   list
	next   int // merge when the list has grown to this
}

const firstMerge = 1 << 21

// NewBuilder returns an empty builder.
func NewBuilder(l *Ladder) *Builder { return &Builder{ladder: l, next: firstMerge} }

// Add adds c times a product of factors, which must be in the order of the sites, one per site; f is copied.
func (b *Builder) Add(c complex128, f ...Factor) {
	b.list.add(c, f)
	b.grown()
}

// AddPolynomial adds c·p.
func (b *Builder) AddPolynomial(c complex128, p *Polynomial) {
	b.list.addAll(&p.list, c)
	b.grown()
}

func (b *Builder) grown() {
	if len(b.list.coef) >= b.next {
		b.list = b.list.merged()
		b.next = max(firstMerge, 2*len(b.list.coef))
	}
}

// Polynomial returns the sum; the builder is then empty.
func (b *Builder) Polynomial() *Polynomial {
	p := &Polynomial{b.ladder, b.list.merged()}
	*b = Builder{ladder: b.ladder, next: firstMerge}
	return p
}
