package acceptance

import (
	"fmt"
	"math"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
)

const chainEnergy = 1e-10 // of max(|E|, largest coupling)

// heisenbergChain compares with the open Bethe-ansatz equations (Alcaraz, Barber, Batchelor, Baxter, Quispel 1987), solved by
// the oracle, in the sector of the given number of spins down.
func heisenbergChain(t *testing.T, n, down int) {
	want, err := exact.HeisenbergChain(n, down)
	require.NoError(t, err)
	h := openChain(t, n, ladder.Spin(1), nil, "S[a,j].S[a,j+1]")
	requireGround(t, h, ladder.Sector{"Sz": float64(n-2*down) / 2}, wish{relative: chainEnergy, want: want, largest: 1})
}

func TestHeisenbergChain(t *testing.T) {
	for _, row := range []struct{ sites, down int }{{16, 8}, {17, 8}, {24, 9}, {32, 1}, {32, 0}, {64, 32}} {
		t.Run(fmt.Sprintf("sites=%d/down=%d", row.sites, row.down), func(t *testing.T) { heisenbergChain(t, row.sites, row.down) })
	}
}

func TestHeisenbergRing(t *testing.T) {
	const n = 16
	want, err := exact.HeisenbergRing(n) // Bethe 1931
	require.NoError(t, err)
	lad, err := ladder.New(n, ladder.Periodic, ladder.Leg("a", ladder.Spin(1)))
	require.NoError(t, err)
	h, err := lad.Hamiltonian(nil, terms("S[a,j].S[a,j+1]")...)
	require.NoError(t, err)
	requireGround(t, h, ladder.Sector{"Sz": 0}, wish{relative: chainEnergy, want: want, largest: 1})
}

// isingWays are the critical transverse-field Ising chain -sum X X - sum Z (Pauli matrices, twice the spins) in other axes: the
// parity is diagonal where the field lies along z, and must be brought out by a rotation where it lies along x or y.
var isingWays = []struct {
	name     string
	formulas []string
}{
	{"parity diagonal", []string{"-4 S^x[a,j] S^x[a,j+1]", "-2 S^z[a,j]"}},
	{"parity off-diagonal", []string{"-4 S^z[a,j] S^z[a,j+1]", "-2 S^x[a,j]"}},
	{"parity along y", []string{"-4 S^x[a,j] S^x[a,j+1]", "-2 S^y[a,j]"}},
}

// isingFermions is the chain after the Jordan-Wigner transformation: Z = 1 - 2n.
func isingFermions(n int) (*exact.Quadratic, float64) {
	q := exact.NewQuadratic(n)
	for j := range n {
		q.Energy(j, 2)
		if j+1 < n {
			q.Hop(j, j+1, -1)
			q.Pair(j, j+1, -1)
		}
	}
	return q, -float64(n)
}

// isingChain compares the even sector with the closed form (Pfeuty 1970, from memory), the odd one with free fermions.
func isingChain(t *testing.T, n int, odd bool, formulas []string) {
	want := exact.IsingChain(n)
	if odd {
		q, shift := isingFermions(n)
		g, err := q.Lowest(true)
		require.NoError(t, err)
		want = g.Energy + shift
	}
	h := openChain(t, n, ladder.Spin(1), nil, formulas...)
	parity := 0
	if odd {
		parity = 1
	}
	res := requireGround(t, h, ladder.Sector{"P": parity}, wish{relative: chainEnergy, want: want, largest: 4})
	require.True(t, res.State.Frames().Real, res.State.Frames().Loop)
}

func TestIsingChain(t *testing.T) {
	for _, way := range isingWays {
		for _, odd := range []bool{false, true} {
			t.Run(fmt.Sprintf("%s/odd=%t", way.name, odd), func(t *testing.T) { isingChain(t, 100, odd, way.formulas) })
		}
	}
}

// xxWays are the chain sum (S^x S^x + S^y S^y) as spins, as hard-core bosons and as fermions.
var xxWays = []struct {
	name    string
	site    ladder.Site
	formula string
	sector  func(n int) ladder.Sector
}{
	{"spins", ladder.Spin(1), "S^x[a,j] S^x[a,j+1] + S^y[a,j] S^y[a,j+1]", func(int) ladder.Sector { return ladder.Sector{"Sz": 0} }},
	{"bosons", ladder.Boson(1), "1/2 b^+[a,j] b[a,j+1] + h.c.", func(n int) ladder.Sector { return ladder.Sector{"N": n / 2} }},
	{"fermions", ladder.Fermion(), "1/2 c^+[a,j] c[a,j+1] + h.c.", func(n int) ladder.Sector { return ladder.Sector{"N": n / 2} }},
}

// xxChain compares with the closed form of Lieb, Schultz, Mattis 1961.
func xxChain(t *testing.T, n int, way int) {
	w := xxWays[way]
	requireGround(t, openChain(t, n, w.site, nil, w.formula), w.sector(n), wish{relative: chainEnergy, want: exact.XXChain(n), largest: 1})
}

func TestXXChain(t *testing.T) {
	for i, w := range xxWays {
		for _, n := range []int{20, 64} {
			if n == 20 || i == 0 { // one tensor network under three names
				t.Run(fmt.Sprintf("%s/sites=%d", w.name, n), func(t *testing.T) { xxChain(t, n, i) })
			}
		}
	}
}

// The Majumdar-Ghosh chain has singlets on the links (0, 1), (2, 3), ... (Majumdar, Ghosh 1969): every second cut goes through
// one and has entropy ln 2, the others none.
func TestMajumdarGhosh(t *testing.T) {
	const n = 64
	h := openChain(t, n, ladder.Spin(1), nil, "S[a,j].S[a,j+1]", "1/2 S[a,j].S[a,j+2]")
	res := requireGround(t, h, ladder.Sector{"Sz": 0}, wish{relative: chainEnergy, want: exact.MajumdarGhoshChain(n), largest: 1, observables: observableWish})
	want := make([]float64, n-1)
	for b := 0; b < n-1; b += 2 {
		want[b] = math.Ln2
	}
	requireEntropies(t, want, res)
	for j, v := range values(t, res, "S[a,j].S[a,j+1]", nil) {
		require.InDelta(t, -0.75*float64((j+1)%2), real(v), everythingElse, "link %d", j)
	}
}

// The fourfold ground level of the open AKLT chain (Affleck, Kennedy, Lieb, Tasaki 1987) is a singlet and a triplet of the spins
// one-half that its ends leave free: one state at Sz = 1 and -1, two at Sz = 0, none at 2.
func TestAKLT(t *testing.T) {
	const n = 32
	h := openChain(t, n, ladder.Spin(2), nil, "S[a,j].S[a,j+1] + 1/3 (S[a,j].S[a,j+1])^2")
	w := wish{relative: chainEnergy, want: exact.AKLTChain(n), largest: 1, observables: observableWish}
	for _, sz := range []int{-1, 0, 1} {
		t.Run(fmt.Sprintf("Sz=%d", sz), func(t *testing.T) {
			res := requireGround(t, h, ladder.Sector{"Sz": sz}, w)
			if sz == 0 {
				return // any mixture of the two states
			}
			requireEntropies(t, akltEntropies(n), res)
			for j, v := range values(t, res, "S^z[a,j]", nil) {
				require.InDelta(t, float64(sz)*akltMagnetization(n, j), real(v), everythingElse, "S^z of site %d", j)
			}
		})
	}
}

// akltEntropies are the entropies at Sz = 1. A block of k sites is a matrix between its two end spins; the norms of its triplet
// and singlet states are as 1 - x to 1 + 3 x with x = (-1/3)^k (the transfer matrix has eigenvalues 1 and, three times, -1/3). The
// singlet that the cut breaks leaves up|down or down|up, with both outer end spins up.
func akltEntropies(n int) []float64 {
	x := func(k int) float64 { return math.Pow(-1.0/3, float64(k)) }
	out := make([]float64, n-1)
	for b := range out {
		l, r := x(b+1), x(n-b-1)
		p := (1 - l) * (1 + r) / (2 * (1 - l*r))
		out[b] = -p*math.Log(p) - (1-p)*math.Log(1-p)
	}
	return out
}

// akltMagnetization is <S^z_j> at Sz = 1: both ends' free spins add 2/3 · (-1/3)^distance each; the norm is that of the triplet.
func akltMagnetization(n, j int) float64 {
	x := func(k int) float64 { return math.Pow(-1.0/3, float64(k)) }
	return 2 * (x(j) + x(n-1-j)) / 3 / (1 - x(n))
}

// The closed forms of the AKLT chain against exact diagonalization.
func TestAKLTForms(t *testing.T) {
	const n = 6
	sites := make([]exact.Site, n)
	for i := range sites {
		sites[i] = exact.Spin(2)
	}
	dot := func(i, j int) []exact.Term {
		return append(exact.WithAdjoints(exact.T(0.5, "S^+", i, "S^-", j)), exact.T(1, "S^z", i, "S^z", j))
	}
	var sum []exact.Term
	for j := range n - 1 {
		link := dot(j, j+1)
		sum = append(sum, link...)
		for _, a := range link {
			for _, b := range link {
				sum = append(sum, exact.Term{Coef: a.Coef * b.Coef / 3, Ops: append(append([]exact.Op{}, a.Ops...), b.Ops...)})
			}
		}
	}
	b, err := exact.NewBasis(sites, []exact.Number{exact.TwiceSz(sites)}, []int{2})
	require.NoError(t, err)
	m, err := b.Matrix(sum...)
	require.NoError(t, err)
	ground, gap, err := m.Ground()
	require.NoError(t, err)
	require.Greater(t, gap, 0.1)
	require.InDelta(t, exact.AKLTChain(n), ground.Energy, 1e-12)
	entropies, err := b.Entropies(ground.Vector)
	require.NoError(t, err)
	require.InDeltaSlice(t, akltEntropies(n), entropies, 1e-10)
	for j, v := range b.Local(ground.Vector, "S^z") {
		require.InDelta(t, akltMagnetization(n, j), real(v), 1e-10)
	}
}

// The pairing chain at Delta = t, mu = 0 has one fermionic end mode: both parities have the energy -t (L-1) (Kitaev 2001), and every
// cut breaks one pair of Majorana modes, and the pair of the ends: entropy ln 2.
func TestPairingChain(t *testing.T) {
	const n = 40
	h := openChain(t, n, ladder.Fermion(), ladder.Constants{"t": 1.5}, "-t c^+[a,j] c[a,j+1] + t c[a,j] c[a,j+1] + h.c.")
	want := make([]float64, n-1)
	for b := range want {
		want[b] = math.Ln2
	}
	for parity := range 2 {
		t.Run(fmt.Sprintf("P=%d", parity), func(t *testing.T) {
			res := requireGround(t, h, ladder.Sector{"P": parity}, wish{relative: chainEnergy, want: exact.PairingChain(n, 1.5), largest: 1.5, observables: observableWish})
			requireEntropies(t, want, res)
			for j, v := range values(t, res, "n[a,j]", nil) {
				require.InDelta(t, 0.5, real(v), everythingElse, "site %d", j)
			}
		})
	}
}
