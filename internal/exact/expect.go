package exact

import "math/cmplx"

// Element returns <x| sum of terms |y> between vectors of two sectors of the
// same sites. States that the terms take elsewhere add nothing.
func Element(bra *Basis, x []complex128, ket *Basis, y []complex128, terms ...Term) complex128 {
	words, err := ket.words(terms)
	if err != nil {
		panic(err)
	}
	from, to := make([]int, len(ket.Sites)), make([]int, len(ket.Sites))
	var sum complex128
	for j, amplitude := range y {
		if amplitude == 0 {
			continue
		}
		ket.decode(from, j)
		for _, w := range words {
			copy(to, from)
			c := ket.act(w, to)
			if c == 0 {
				continue
			}
			if i, where := bra.find(to); where == inside {
				sum += cmplx.Conj(x[i]) * c * amplitude
			}
		}
	}
	return sum
}

// Expect returns the expectation value of the sum of the terms.
func (b *Basis) Expect(psi []complex128, terms ...Term) complex128 {
	return Element(b, psi, b, psi, terms...)
}

// Local returns the expectation value of an operator on every site that has
// it; sites that lack it give 0.
func (b *Basis) Local(psi []complex128, name string) []complex128 {
	out := make([]complex128, len(b.Sites))
	for i, s := range b.Sites {
		if s.has(name) {
			out[i] = b.Expect(psi, T(1, name, i))
		}
	}
	return out
}

// TwoPoint returns <first_i second_j> for all pairs of sites, i = j included,
// with fermion signs; pairs of which a site lacks its operator give 0.
func (b *Basis) TwoPoint(psi []complex128, first, second string) [][]complex128 {
	out := make([][]complex128, len(b.Sites))
	for i, si := range b.Sites {
		out[i] = make([]complex128, len(b.Sites))
		for j, sj := range b.Sites {
			if si.has(first) && sj.has(second) {
				out[i][j] = b.Expect(psi, T(1, first, i, second, j))
			}
		}
	}
	return out
}

func (s Site) has(name string) bool {
	_, err := s.steps(Op{Name: name})
	return err == nil
}
