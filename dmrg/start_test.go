package dmrg

import (
	"context"
	"math"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"

	"rundle/internal/exact"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/mps/block"
)

// diagonalEnergy adds up the diagonal of the strings for a product state, by brute force.
func diagonalEnergy(s *ladder.Strings, states []int) float64 {
	var sum complex128
	for i, c := range s.Coef {
		factors := s.Factors[s.Start[i]:s.Start[i+1]]
		if len(factors) == 0 {
			continue
		}
		for _, f := range factors {
			d, k := s.Axes[f.Site].Dim(), states[f.Site]
			c *= s.Tables[f.Site].Matrices[f.Op][k*d+k]
		}
		sum += c
	}
	return real(sum)
}

func totalOf(s *ladder.Strings, states []int) block.Charge {
	var q block.Charge
	for i, k := range states {
		q = s.Group.Add(q, s.Axes[i].Charges()[k])
	}
	return q
}

// TestStarter compares with all product states of small ladders, every total that they have.
func TestStarter(t *testing.T) {
	for _, row := range []struct {
		name string
		h    *ladder.Hamiltonian
	}{
		{"fields and neighbours", hamiltonian(t, 7, ladder.Open, one(ladder.Fermion()), "cos(3*j*j) n[a,j]", "0.7 n[a,j] n[a,j+1]", "-c^+[a,j+1] c[a,j] + h.c.")},
		{"a ring: terms wait for its end", hamiltonian(t, 7, ladder.Periodic, one(ladder.Spin(1)), "S[a,j].S[a,j+1]", "0.3 S^z[a,j] S^z[a,j+3]", "cos(j) S^z[a,j]")},
		{"bosons on legs", hamiltonian(t, 3, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(1)}, "n[a,j] (n[a,j]-1)", "-0.4 n[a,j] n[b,j+1]", "b^+[a,j] b[b,j] + h.c.")},
		{"clock: complex diagonals", hamiltonian(t, 5, ladder.Open, one(ladder.Clock(3)), "exp(0.3*i) Z^+[a,j+1] Z[a,j] + h.c.", "exp(i*j) Z[a,j] + h.c.")},
		{"electrons", hamiltonian(t, 4, ladder.Open, one(ladder.Electron()), "2 n_up[a,j] n_down[a,j]", "sin(2*j+1) n_up[a,j]", "-c_up^+[a,j+1] c_up[a,j] + h.c.", "0.2 n[a,j] n[a,j+1]")},
	} {
		t.Run(row.name, func(t *testing.T) {
			frames, err := row.h.Frames(ladder.FrameOptions{Complex: true})
			require.NoError(t, err)
			s, err := frames.Strings(row.h.Poly)
			require.NoError(t, err)
			lowest := map[block.Charge]float64{}
			states := make([]int, len(s.Axes))
			for more := true; more; {
				q, e := totalOf(s, states), diagonalEnergy(s, states)
				if old, ok := lowest[q]; !ok || e < old {
					lowest[q] = e
				}
				more = false
				for i := range states {
					if states[i]++; states[i] < s.Axes[i].Dim() {
						more = true
						break
					}
					states[i] = 0
				}
			}
			b := newStarter(s)
			for q, want := range lowest {
				states, energy, err := b.states(q)
				require.NoError(t, err)
				require.Equal(t, q, totalOf(s, states))
				require.InDelta(t, diagonalEnergy(s, states), energy, 1e-12)
				// The beam and the tie-break may cost a little.
				require.InDelta(t, want, energy, 0.25*b.scale, "charge %v", q)
			}
		})
	}
}

func TestStarterSpreadsCharge(t *testing.T) {
	p, err := newProblem(hamiltonian(t, 12, ladder.Open, one(ladder.Fermion()), "-c^+[a,j+1] c[a,j] + h.c."), ladder.Sector{"N": 4}, Options{})
	require.NoError(t, err)
	states, energy, err := p.starter.states(p.target.Charge)
	require.NoError(t, err)
	require.Zero(t, energy)
	have := 0
	for i, k := range states {
		have += k
		require.InDelta(t, 4*float64(i+1)/12, have, 1, "after site %d", i)
	}
	_, _, err = p.starter.states(block.Charge{13})
	require.ErrorContains(t, err, "out of reach")
}

// TestLookahead: the exact sets and the ranges, on random ladders of two kinds of sites.
func TestLookahead(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		g, err := block.NewGroup(block.Rule{Name: "N"}, block.Rule{Name: "P", Modulus: 2})
		require.NoError(t, err)
		s := &ladder.Strings{Group: g}
		for range rapid.IntRange(1, 6).Draw(rt, "sites") {
			var sectors []block.Sector
			for range rapid.IntRange(1, 3).Draw(rt, "states") {
				q := block.Charge{int32(rapid.IntRange(-2, 2).Draw(rt, "n")), int32(rapid.IntRange(0, 1).Draw(rt, "p"))}
				sectors = append(sectors, block.Sector{Charge: q, Dim: 1})
			}
			s.Axes = append(s.Axes, block.NewAxis(block.In, sectors...))
		}
		r := suffixCharges(s)
		rough := r
		rough.exact = make([]map[block.Charge]bool, len(r.exact))
		for i := range len(s.Axes) + 1 {
			for n := int32(-14); n <= 14; n++ {
				for p := range int32(2) {
					q := block.Charge{n, p}
					want := holds(g, s.Axes[i:], q)
					require.Equal(rt, want, r.possible(i, q), "from site %d: %v", i, q)
					require.True(rt, !want || rough.possible(i, q), "ranges may not exclude what is there")
				}
			}
		}
	})
}

func holds(g block.Group, axes []block.Axis, q block.Charge) bool {
	if len(axes) == 0 {
		return q == block.Charge{}
	}
	for _, s := range axes[0].Sectors {
		if holds(g, axes[1:], g.Sub(q, s.Charge)) {
			return true
		}
	}
	return false
}

// TestStartFromState goes on from a state, given or from a file, at another coupling, and with charges left free.
func TestStartFromState(t *testing.T) {
	h := heisenberg(t, 12)
	want, err := exact.HeisenbergChain(12, 5)
	require.NoError(t, err)
	rough := ground1(t, h, ladder.Sector{"Sz": 1}, Options{Bond: 8, Precision: 1e-9})
	require.Equal(t, BondCap, rough.Verdict)
	before := rough.State.Clone()
	fresh := ground1(t, h, ladder.Sector{"Sz": 1}, Options{})
	path := filepath.Join(t.TempDir(), "state.npz")
	require.NoError(t, rough.State.Save(path))
	loaded, err := mps.Load(path)
	require.NoError(t, err)
	for name, sector := range map[string]ladder.Sector{"named": {"Sz": 1}, "free": nil} {
		for _, start := range []*mps.State{rough.State, loaded, fresh.State} {
			r := ground1(t, h, sector, Options{Start: start})
			require.Equal(t, Converged, r.Verdict, name)
			require.Equal(t, map[string]float64{"Sz": 1}, r.Sector)
			requireHonest(t, r, want)
			require.InDelta(t, fresh.Energy, r.Energy, 1e-8)
		}
	}
	o, err := before.Overlap(rough.State)
	require.NoError(t, err)
	require.InDelta(t, 1, real(o), 1e-12, "the start state belongs to the caller")

	other := hamiltonian(t, 12, ladder.Open, one(ladder.Spin(1)), "S[a,j].S[a,j+1]", "0.4 S[a,j].S[a,j+2]")
	r := ground1(t, other, ladder.Sector{"Sz": 1}, Options{Start: fresh.State})
	require.InDelta(t, ground1(t, other, ladder.Sector{"Sz": 1}, Options{}).Energy, r.Energy, 1e-8)
}

func TestStartInOtherArithmetic(t *testing.T) {
	h := heisenberg(t, 8)
	want, err := exact.HeisenbergChain(8, 4)
	require.NoError(t, err)
	complex := ground1(t, h, ladder.Sector{"Sz": 0}, Options{Complex: true, Bond: 4}).State
	real := ground1(t, h, ladder.Sector{"Sz": 0}, Options{Bond: 4}).State
	r := ground1(t, h, nil, Options{Start: real, Complex: true})
	requireHonest(t, r, want)
	r = ground1(t, h, nil, Options{Start: complex, Complex: true})
	requireHonest(t, r, want)
	_, err = Ground(context.Background(), h, nil, Options{Start: complex})
	require.ErrorContains(t, err, "ask for complex arithmetic")
}

func TestStartThatDoesNotFit(t *testing.T) {
	state := func(h *ladder.Hamiltonian, sector ladder.Sector, opt Options) *mps.State {
		opt.Sweeps, opt.Bond = 1, 4
		return ground1(t, h, sector, opt).State
	}
	zero := state(heisenberg(t, 8), ladder.Sector{"Sz": 0}, Options{})
	c, _ := zero.Real()
	c.Scale(0)
	xxz := func(extra ...string) *ladder.Hamiltonian {
		return hamiltonian(t, 8, ladder.Open, one(ladder.Spin(1)), extra...)
	}
	for _, row := range []struct {
		name   string
		start  *mps.State
		h      *ladder.Hamiltonian
		sector ladder.Sector
		says   string
	}{
		{"another length", state(heisenberg(t, 6), ladder.Sector{"Sz": 0}, Options{}), heisenberg(t, 8), ladder.Sector{"Sz": 0}, "6 sites"},
		{"other charges", state(heisenberg(t, 8), nil, Options{Charges: []string{}}), heisenberg(t, 8), ladder.Sector{"Sz": 0}, "charges"},
		{"another sector", state(heisenberg(t, 8), ladder.Sector{"Sz": 1}, Options{}), heisenberg(t, 8), ladder.Sector{"Sz": 0}, "lies in the sector"},
		{"other sites", state(hamiltonian(t, 8, ladder.Open, one(ladder.Spin(2)), "S[a,j].S[a,j+1]"), ladder.Sector{"Sz": 0}, Options{}), heisenberg(t, 8), ladder.Sector{"Sz": 0}, "site 0"},
		{"another axis", state(xxz("S^x[a,j] S^x[a,j+1]", "S^z[a,j]", "0.3 S^z[a,j] S^x[a,j+1] S^x[a,j+2]"), ladder.Sector{"P": 0}, Options{}),
			xxz("S^z[a,j] S^z[a,j+1]", "S^x[a,j]", "0.3 S^x[a,j] S^z[a,j+1] S^z[a,j+2]"), ladder.Sector{"P": 0}, "site 0"},
		{"a zero state", zero, heisenberg(t, 8), ladder.Sector{"Sz": 0}, "norm 0"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := Ground(context.Background(), row.h, row.sector, Options{Start: row.start})
			require.ErrorContains(t, err, row.says)
		})
	}
}

// TestStartWithAnyNorm: states need not be normalized.
func TestStartWithAnyNorm(t *testing.T) {
	h := heisenberg(t, 8)
	want, err := exact.HeisenbergChain(8, 4)
	require.NoError(t, err)
	s := ground1(t, h, ladder.Sector{"Sz": 0}, Options{Bond: 4}).State
	c, _ := s.Real()
	for _, factor := range []float64{1e-150, 1e150, -3} {
		c.Normalize()
		c.Scale(factor)
		r := ground1(t, h, nil, Options{Start: s})
		requireHonest(t, r, want)
		require.InDelta(t, want, r.Energy, 1e-8)
	}
	require.False(t, math.IsNaN(c.Norm()))
}
