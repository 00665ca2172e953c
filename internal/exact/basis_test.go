package exact

import (
	"math"
	"math/cmplx"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func repeat(s Site, n int) []Site {
	out := make([]Site, n)
	for i := range out {
		out[i] = s
	}
	return out
}

func basis(t *testing.T, sites []Site, numbers []Number, values ...int) *Basis {
	t.Helper()
	b, err := NewBasis(sites, numbers, values)
	require.NoError(t, err)
	return b
}

func ground(t *testing.T, b *Basis, terms ...Term) (Level, float64) {
	t.Helper()
	m, err := b.Matrix(terms...)
	require.NoError(t, err)
	level, gap, err := m.Ground()
	require.NoError(t, err)
	return level, gap
}

func TestBasisDimension(t *testing.T) {
	spins, electrons := repeat(Spin(1), 10), repeat(Electron(true), 5)
	single, bosons := repeat(Electron(false), 5), repeat(Boson(2), 4)
	clocks, mixed := repeat(Clock(3), 4), []Site{Fermion(), Boson(3), Spin(2), Clock(4)}
	for _, row := range []struct {
		name    string
		sites   []Site
		numbers []Number
		values  []int
		want    int
	}{
		{"all spins", spins, nil, nil, 1024},
		{"spins, Sz = 0", spins, []Number{TwiceSz(spins)}, []int{0}, 252},
		{"spins, Sz = 4", spins, []Number{TwiceSz(spins)}, []int{8}, 10},
		{"electrons 3 up 2 down", electrons, []Number{UpParticles(electrons), DownParticles(electrons)}, []int{3, 2}, 100},
		{"without double occupation", single, []Number{UpParticles(single), DownParticles(single)}, []int{2, 2}, 30},
		{"bosons", bosons, []Number{Particles(bosons)}, []int{4}, 19},
		{"bosons, parity", bosons, []Number{Particles(bosons).Modulo(2)}, []int{1}, 40},
		{"bosons on one site", bosons, []Number{Particles(bosons, 2)}, []int{1}, 27},
		{"clocks", clocks, []Number{ClockCharge(clocks, 3)}, []int{-1}, 27},
		{"mixed", mixed, nil, nil, 2 * 4 * 3 * 4},
	} {
		t.Run(row.name, func(t *testing.T) {
			b := basis(t, row.sites, row.numbers, row.values...)
			assert.Equal(t, row.want, b.Dim())
			for i := range b.Dim() {
				k, ok := b.Index(b.State(i))
				assert.True(t, ok)
				assert.Equal(t, i, k)
			}
		})
	}
	_, err := NewBasis(spins, []Number{TwiceSz(spins)}, []int{1})
	assert.ErrorContains(t, err, "no state")
	_, err = NewBasis(repeat(Boson(255), 9), nil, nil)
	assert.ErrorContains(t, err, "64 bits")
}

// element returns <to| ops |from> of one list of sites.
func element(t *testing.T, sites []Site, to, from []int, term Term) complex128 {
	b := basis(t, sites, nil)
	x, y := make([]complex128, b.Dim()), make([]complex128, b.Dim())
	i, _ := b.Index(to)
	j, _ := b.Index(from)
	x[i], y[j] = 1, 1
	return Element(b, x, b, y, term)
}

func TestElements(t *testing.T) {
	third := cmplx.Exp(complex(0, 2*math.Pi/3))
	for _, row := range []struct {
		name     string
		sites    []Site
		to, from []int
		term     Term
		want     complex128
	}{
		{"c past a particle", repeat(Fermion(), 3), []int{1, 0, 1}, []int{1, 1, 1}, T(1, "c", 1), -1},
		{"hop over a particle", repeat(Fermion(), 3), []int{1, 1, 0}, []int{0, 1, 1}, T(1, "c^+", 0, "c", 2), -1},
		{"written the other way", repeat(Fermion(), 3), []int{1, 1, 0}, []int{0, 1, 1}, T(1, "c", 2, "c^+", 0), 1},
		{"up before down", []Site{Electron(true)}, []int{3}, []int{0}, T(1, "c_up^+", 0, "c_down^+", 0), 1},
		{"down before up", []Site{Electron(true)}, []int{3}, []int{0}, T(1, "c_down^+", 0, "c_up^+", 0), -1},
		{"take down from both", []Site{Electron(true)}, []int{1}, []int{3}, T(1, "c_down", 0), -1},
		{"flip", []Site{Electron(true)}, []int{1}, []int{2}, T(1, "S^+", 0), 1},
		{"through the forbidden state", []Site{Electron(false)}, []int{1}, []int{1}, T(1, "c_down", 0, "c_down^+", 0), 1},
		{"fermion past a boson", []Site{Fermion(), Boson(2), Electron(true)}, []int{1, 2, 0}, []int{1, 2, 1}, T(1, "c_up", 2), -1},
		{"b b^+ at the cut", []Site{Boson(2)}, []int{2}, []int{2}, T(1, "b", 0, "b^+", 0), 3},
		{"far past the cut", []Site{Boson(1)}, []int{1}, []int{1}, T(1, "b", 0, "b", 0, "b^+", 0, "b^+", 0), 6},
		{"boson raised", []Site{Boson(3)}, []int{3}, []int{1}, T(1, "b^+", 0, "b^+", 0), complex(math.Sqrt(6), 0)},
		{"spin 1 raised", []Site{Spin(2)}, []int{0}, []int{1}, T(1, "S^+", 0), complex(math.Sqrt2, 0)},
		{"S^y of spin 1/2", []Site{Spin(1)}, []int{0}, []int{1}, T(1, "S^y", 0), -0.5i},
		{"clock phase", []Site{Clock(3)}, []int{1}, []int{1}, T(1, "Z", 0), third},
		{"clock turns over", []Site{Clock(3)}, []int{0}, []int{2}, T(1, "X", 0), 1},
		{"clock turns back", []Site{Clock(3)}, []int{2}, []int{0}, T(1, "X^+", 0), 1},
	} {
		t.Run(row.name, func(t *testing.T) {
			got := element(t, row.sites, row.to, row.from, row.term)
			assert.InDelta(t, 0, cmplx.Abs(got-row.want), 1e-14, "got %v", got)
			back := cmplx.Conj(element(t, row.sites, row.from, row.to, row.term.Adjoint()))
			assert.InDelta(t, 0, cmplx.Abs(back-row.want), 1e-14, "adjoint gives %v", back)
		})
	}
}

// TestAlgebra holds (anti)commutators on every state of small systems.
func TestAlgebra(t *testing.T) {
	omega := cmplx.Exp(complex(0, 2*math.Pi/5))
	for _, row := range []struct {
		name  string
		sites []Site
		zero  []Term // terms that sum to zero
	}{
		{"fermions on a site", repeat(Fermion(), 2), []Term{T(1, "c", 1, "c^+", 1), T(1, "c^+", 1, "c", 1), T(-1)}},
		{"fermions on two sites", repeat(Fermion(), 3), []Term{T(1, "c", 0, "c^+", 2), T(1, "c^+", 2, "c", 0)}},
		{"electrons of two sites", repeat(Electron(true), 2), []Term{T(1, "c_up", 1, "c_down", 0), T(1, "c_down", 0, "c_up", 1)}},
		{"components", []Site{Electron(true)}, []Term{T(1, "c_up", 0, "c_down^+", 0), T(1, "c_down^+", 0, "c_up", 0)}},
		{"electron spin", []Site{Electron(true)}, []Term{T(1, "S^+", 0, "S^-", 0), T(-1, "S^-", 0, "S^+", 0), T(-2, "S^z", 0)}},
		{"electron density", []Site{Electron(true)}, []Term{T(1, "n", 0), T(-1, "c_up^+", 0, "c_up", 0), T(-1, "c_down^+", 0, "c_down", 0)}},
		{"bosons", []Site{Boson(3)}, []Term{T(1, "b", 0, "b^+", 0), T(-1, "b^+", 0, "b", 0), T(-1)}},
		{"spin 3/2", []Site{Spin(3)}, []Term{T(1, "S^x", 0, "S^y", 0), T(-1, "S^y", 0, "S^x", 0), T(-1i, "S^z", 0)}},
		{"spin 3/2 length", []Site{Spin(3)}, []Term{T(1, "S^x", 0, "S^x", 0), T(1, "S^y", 0, "S^y", 0), T(1, "S^z", 0, "S^z", 0), T(-3.75)}},
		{"clock", []Site{Clock(5)}, []Term{T(1, "Z", 0, "X", 0), T(-omega, "X", 0, "Z", 0)}},
		{"clock inverse", []Site{Clock(5)}, []Term{T(1, "X^+", 0, "Z^+", 0, "Z", 0, "X", 0), T(-1)}},
	} {
		t.Run(row.name, func(t *testing.T) {
			b := basis(t, row.sites, nil)
			x, y := make([]complex128, b.Dim()), make([]complex128, b.Dim())
			for i := range x {
				for j := range y {
					clear(x)
					clear(y)
					x[i], y[j] = 1, 1
					assert.InDelta(t, 0, cmplx.Abs(Element(b, x, b, y, row.zero...)), 1e-14)
				}
			}
		})
	}
}

func TestMatrixErrors(t *testing.T) {
	sites := repeat(Fermion(), 3)
	b := basis(t, sites, []Number{Particles(sites)}, 1)
	for _, row := range []struct {
		name string
		term Term
		want string
	}{
		{"unknown name", T(1, "b", 0), `no operator "b"`},
		{"no such site", T(1, "n", 3), "on site 3 of 3"},
		{"leaves the sector", T(1, "c", 0), "out of the sector"},
		{"not Hermitian", T(1, "c^+", 0, "c", 1), "not Hermitian"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := b.Matrix(row.term)
			assert.ErrorContains(t, err, row.want)
		})
	}
	_, err := b.Matrix(T(1, "n", 0), Term{Coef: 2, Ops: []Op{{Site: 1, Diagonal: func(n int) complex128 { return complex(float64(n), 0) }}}})
	assert.NoError(t, err)
}
