package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
)

// Rotations of the local basis that bring a conserved quantity to diagonal form. They are numbered per kind:
//
//	spin   0: none   1: stored S^z is the user's S^x   2: stored S^z is the user's S^y   (cyclic permutations of x, y, z)
//	clock  0: none   1: stored X is the user's Z, stored Z the user's X^+, so that X is diagonal
//
// All are substitutions in the algebra, without rounding beyond that of products of coefficients.

// spinImages gives the stored operator for each of the user's S^x, S^y, S^z.
var spinImages = [3][3]byte{
	{'x', 'y', 'z'},
	{'z', 'x', 'y'},
	{'y', 'z', 'x'},
}

// rotationsOf returns how many rotations a kind of site has, none included.
func rotationsOf(k Kind) int {
	switch k {
	case KindSpin:
		return 3
	case KindClock:
		return 2
	}
	return 1
}

// rotation rewrites the operators of one site kind.
type rotation struct {
	site  Site
	code  int
	cache map[OpID][]Weighted
}

func newRotation(site Site, code int) *rotation {
	return &rotation{site: site, code: code, cache: make(map[OpID][]Weighted)}
}

// image returns the stored form of a basis element.
func (r *rotation) image(op OpID) []Weighted {
	if r.code == 0 || op == Identity {
		return []Weighted{{1, op}}
	}
	out, ok := r.cache[op]
	if !ok {
		switch {
		case op.compound():
			out = r.compoundImage(op)
		case r.site.Kind() == KindSpin:
			out = r.spinImage(op)
		default:
			out = r.clockImage(op)
		}
		r.cache[op] = out
	}
	return out
}

// compoundImage is a sum kept together, as the compound was.
func (r *rotation) compoundImage(op OpID) []Weighted {
	var sum []Weighted
	for _, x := range r.site.Parts(op) {
		sum = append(sum, scaled(r.image(x.Op), x.Coef)...)
	}
	return r.together(mergeWeighted(sum))
}

// together makes one element of a sum where it can.
func (r *rotation) together(w []Weighted) []Weighted {
	out, err := r.site.ops.condense(w)
	if err != nil {
		return w
	}
	return out
}

// symbol returns an operator by its name in formulas.
func (r *rotation) symbol(name, super string) []Weighted {
	w, ok := r.site.Symbol(name, super)
	if !ok {
		panic(fmt.Sprintf("ladder: a %v site has no operator %s^%s", r.site, name, super))
	}
	return w
}

// spinImage rewrites phi(mid) (S^+-)^r, phi a polynomial in the mean of S^z before and after. The elements with the same r follow from (S^+-)^r one
// after the other: half the anticommutator of S^z with one of them holds exactly one that is new.
func (r *rotation) spinImage(op OpID) []Weighted {
	raise := r.site.Raise(op)[0] / 2
	super, y := "+", 1i
	if raise < 0 {
		super, y, raise = "-", -1i, -raise
	}
	images := spinImages[r.code]
	along := func(axis int) []Weighted { return r.symbol("S", string(images[axis])) }
	user, stored := []Weighted{{1, Identity}}, []Weighted{{1, Identity}}
	shift := mergeWeighted(append(scaled(along(0), 1), scaled(along(1), y)...)) // S^x +- i S^y
	for range raise {
		user = r.product(user, r.symbol("S", super))
		stored = r.product(stored, shift)
	}
	last := user[0].Op
	known := map[OpID][]Weighted{last: scaled(stored, 1/user[0].Coef)}
	z, along2 := r.symbol("S", "z"), along(2)
	for known[op] == nil {
		next := r.symmetric(z, []Weighted{{1, last}})
		rest := r.symmetric(along2, known[last])
		var found Weighted
		for _, w := range next {
			if image, ok := known[w.Op]; ok {
				rest = append(rest, scaled(image, -w.Coef)...)
			} else {
				found = w
			}
		}
		if found.Coef == 0 {
			panic(fmt.Sprintf("ladder: operator %d of a %v site is no product of S^z and S^+-", op, r.site))
		}
		known[found.Op], last = mergeWeighted(scaled(rest, 1/found.Coef)), found.Op
	}
	return known[op]
}

// symmetric returns (ab + ba)/2.
func (r *rotation) symmetric(a, b []Weighted) []Weighted {
	return mergeWeighted(scaled(append(r.product(a, b), r.product(b, a)...), 0.5))
}

// clockImage rewrites Z^a X^b as X^a (Z^+)^b.
func (r *rotation) clockImage(op OpID) []Weighted {
	rules := r.site.ops.rules.(*clockRules)
	a, b := rules.powers(op)
	return r.site.Mul(rules.element(0, a), rules.element(-b, 0))
}

func (r *rotation) product(a, b []Weighted) []Weighted {
	var out []Weighted
	for _, x := range a {
		for _, y := range b {
			out = append(out, scaled(r.site.Mul(x.Op, y.Op), x.Coef*y.Coef)...)
		}
	}
	return mergeWeighted(out)
}

func scaled(w []Weighted, k complex128) []Weighted {
	out := make([]Weighted, len(w))
	for i, x := range w {
		out[i] = Weighted{k * x.Coef, x.Op}
	}
	return out
}

// unitary returns the Dim×Dim matrix <stored|user> of a rotation, in the order of the site's states.
func (r *rotation) unitary() []complex128 {
	d := r.site.Dim()
	u := make([]complex128, d*d)
	switch {
	case r.code == 0:
		for i := range d {
			u[i*d+i] = 1
		}
	case r.site.Kind() == KindClock:
		// X|k> = exp(-2 pi i k/q)|k> for |k> = sum_m exp(2 pi i k m/q)|m>/sqrt(q).
		for k := range d {
			for m := range d {
				u[k*d+m] = cmplx.Rect(1/math.Sqrt(float64(d)), -2*math.Pi*float64(k*m%d)/float64(d))
			}
		}
	default:
		// A turn by 2 pi/3 about (1,1,1) permutes the axes; its square is the other permutation.
		g := make([]complex128, d*d)
		for _, axis := range []string{"x", "y", "z"} {
			for _, w := range r.symbol("S", axis) {
				for i, z := range r.site.Matrix(w.Op) {
					g[i] += w.Coef * z
				}
			}
		}
		angle := 2 * math.Pi / 3 / math.Sqrt(3) * float64(r.code)
		u = exponential(d, g, complex(0, angle))
	}
	return u
}

// exponential returns exp(k m) by scaling and squaring.
func exponential(d int, m []complex128, k complex128) []complex128 {
	norm := 0.0
	for _, z := range m {
		norm += cmplx.Abs(z * k)
	}
	halvings := 0
	for ; norm > 0.5; norm /= 2 {
		halvings++
	}
	k /= complex(math.Ldexp(1, halvings), 0)
	sum, term := make([]complex128, d*d), make([]complex128, d*d)
	for i := range d {
		sum[i*d+i], term[i*d+i] = 1, 1
	}
	for n := 1; n <= 20; n++ {
		term = squareProduct(d, term, m, k/complex(float64(n), 0))
		for i := range sum {
			sum[i] += term[i]
		}
	}
	for range halvings {
		sum = squareProduct(d, sum, sum, 1)
	}
	return sum
}

// squareProduct returns k a b of d×d matrices.
func squareProduct(d int, a, b []complex128, k complex128) []complex128 {
	out := make([]complex128, d*d)
	for i := range d {
		for l := range d {
			x := k * a[i*d+l]
			if x == 0 {
				continue
			}
			for j := range d {
				out[i*d+j] += x * b[l*d+j]
			}
		}
	}
	return out
}

// rotate returns p with the sites of each leg rotated; without rotations p itself.
func (lb *labelling) rotate(p *Polynomial, rot rotations) *Polynomial {
	if !slices.ContainsFunc(rot, func(code int) bool { return code != 0 }) {
		return p
	}
	by := make([]*rotation, len(rot))
	for leg, code := range rot {
		by[leg] = newRotation(lb.classes[leg].site, code)
	}
	b := NewBuilder(p.Ladder())
	var images [][]Weighted
	var line []Factor
	for t := range p.NumTerms() {
		coef, factors := p.Term(t)
		images = images[:0]
		ways := 1
		for _, f := range factors {
			images = append(images, by[lb.class[f.Site]].image(f.Op))
			ways = min(ways*len(images[len(images)-1]), maxWays)
		}
		if ways > maxSpread { // a long string: its factors stay together
			ways = 1
			for k, f := range factors {
				images[k] = by[lb.class[f.Site]].together(images[k])
				ways *= len(images[k])
			}
		}
		for way := range ways {
			c, rest := coef, way
			line = line[:0]
			for k, f := range factors {
				w := images[k][rest%len(images[k])]
				rest /= len(images[k])
				c *= w.Coef
				if w.Op != Identity {
					line = append(line, Factor{f.Site, w.Op})
				}
			}
			b.Add(c, line...)
		}
	}
	return b.Polynomial()
}

// rotationsToTry lists rotations that may expose more: all legs of a kind alike, and leg by leg where there are few. Where the spins
// conserve S^z and the clocks Q as written, nothing is to be gained.
func (lb *labelling) rotationsToTry(plain *trial, p *Polynomial) []rotations {
	const work = 4_000_000 // terms rewritten in all
	if plain != nil && lb.settled(plain) {
		return nil
	}
	n := len(lb.classes)
	var out []rotations
	add := func(rot rotations) {
		for _, old := range out {
			if slices.Equal(old, rot) {
				return
			}
		}
		if slices.ContainsFunc(rot, func(code int) bool { return code != 0 }) {
			out = append(out, slices.Clone(rot))
		}
	}
	rot := make(rotations, n)
	for s := range 3 {
		for c := range 2 {
			for leg, cl := range lb.classes {
				rot[leg] = map[Kind]int{KindSpin: s, KindClock: c}[cl.site.Kind()]
			}
			add(rot)
		}
	}
	turning := 0
	for _, cl := range lb.classes {
		if rotationsOf(cl.site.Kind()) > 1 {
			turning++
		}
	}
	if turning < 2 || turning > 3 || p.NumTerms() > work/27 {
		return out
	}
	rot = make(rotations, n)
	for {
		leg := 0
		for ; leg < n; leg++ {
			if rot[leg]++; rot[leg] < rotationsOf(lb.classes[leg].site.Kind()) {
				break
			}
			rot[leg] = 0
		}
		if leg == n {
			return out
		}
		add(rot)
	}
}

// settled reports whether no rotation can help: all spins and clocks have their full charge as written.
func (lb *labelling) settled(t *trial) bool {
	spins, clocks := true, true
	for _, cl := range lb.classes {
		switch cl.site.Kind() {
		case KindSpin:
			spins = false
		case KindClock:
			clocks = false
		}
	}
	for _, c := range append(append([]*charge(nil), t.choice.charges...), t.choice.left...) {
		spins = spins || c.name == "Sz"
		clocks = clocks || c.name == "Q"
	}
	return spins && clocks
}
