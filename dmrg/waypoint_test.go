package dmrg

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"testing"
	"time"
	"unsafe"

	"github.com/stretchr/testify/require"

	"rundle/internal/npz"
	"rundle/mpo/ladder"
	"rundle/mps"
)

// saved is a waypoint that went through files, as a run that was killed finds it.
func saved(t *testing.T, w *Waypoint) *Waypoint {
	t.Helper()
	path := filepath.Join(t.TempDir(), "waypoint.npz")
	require.NoError(t, w.Save(path, "a note"))
	back, note, err := LoadWaypoint(path)
	require.NoError(t, err)
	require.Equal(t, "a note", note)
	require.Equal(t, w.Sweeps, back.Sweeps)
	require.Equal(t, w.Stages, back.Stages)
	return back
}

// resultBits are all numbers of a result that do not depend on the clock.
func resultBits(t *testing.T, r *Result) (all []float64) {
	t.Helper()
	if c, ok := r.State.Real(); ok {
		for _, a := range c.Sites {
			all = append(all, a.Data...)
		}
	} else {
		c, err := mps.ChainOf[complex128](r.State)
		require.NoError(t, err)
		for _, a := range c.Sites {
			for _, z := range a.Data {
				all = append(all, real(z), imag(z))
			}
		}
	}
	for _, s := range r.Sweeps {
		all = append(all, float64(s.Number), float64(s.Bond), s.Perturbation, s.Energy, s.Discarded, s.Residual, float64(s.LargestBond),
			float64(s.Products), s.Flops)
	}
	for _, s := range r.Stages {
		all = append(all, float64(s.Bond), s.Energy, s.Discarded)
	}
	return append(all, r.Energy, r.EnergyLimit, r.EnergyError, r.DiscardedWeight, r.Variance, r.VarianceRounding, r.Flops)
}

// requireSameBits compares the numbers of two results.
func requireSameBits(t *testing.T, want, got *Result, text string, args ...any) {
	t.Helper()
	a, b := resultBits(t, want), resultBits(t, got)
	require.Equal(t, len(a), len(b), text, args)
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			require.Failf(t, "other bits", text+": number %d of %d: %v and %v", append(args, i, len(a), a[i], b[i])...)
		}
	}
}

// interruptedModels are searches of a few hundred updates.
func interruptedModels(t *testing.T) map[string]func(Options) (*Result, error) {
	ground := func(h *ladder.Hamiltonian, sector ladder.Sector, more Options) func(Options) (*Result, error) {
		return func(o Options) (*Result, error) {
			o.Seed, o.Precision, o.Schedule, o.Memory, o.Complex = 7, more.Precision, more.Schedule, more.Memory, more.Complex
			return Ground(t.Context(), h, sector, o)
		}
	}
	flux := hamiltonian(t, 4, ladder.Open, []ladder.Site{ladder.Boson(2), ladder.Boson(2)}, fluxTerms...)
	return map[string]func(Options) (*Result, error){
		"real":         ground(heisenberg(t, 14), ladder.Sector{"Sz": 0}, Options{Precision: 1e-7}),
		"free charges": ground(heisenberg(t, 8), nil, Options{Precision: 1e-7}),
		"merged rungs": ground(flux, ladder.Sector{"N": 4}, Options{Precision: 1e-5}),
		"complex":      ground(flux, ladder.Sector{"N": 4}, Options{Precision: 1e-5, Complex: true}),
		"memory cap":   ground(heisenberg(t, 20), ladder.Sector{"Sz": 0}, Options{Precision: 1e-9, Memory: 1 << 18}),
		"schedule": ground(heisenberg(t, 12), ladder.Sector{"Sz": 0}, Options{Schedule: []Pass{{Bond: 8, Perturbation: 1e-3}, {Bond: 8}, {Bond: 12, Update: Expanding}, {Bond: 12, Update: OneSite}, {Bond: 16},
			{Bond: 16}}}),
		"one site": ground(heisenberg(t, 12), ladder.Sector{"Sz": 0}, Options{Schedule: []Pass{{Bond: 8, Perturbation: 1e-3}, {Bond: 8, Update: Expanding},
			{Bond: 16, Update: Expanding}, {Bond: 16, Update: OneSite}}}),
	}
}

// TestWaypointsLeadToTheSameBits goes on from waypoints at every phase of a search, a second interruption included.
func TestWaypointsLeadToTheSameBits(t *testing.T) {
	for name, ground := range interruptedModels(t) {
		t.Run(name, func(t *testing.T) {
			var all []*Waypoint
			count := 0
			whole, err := ground(Options{WaypointEvery: 1, OnWaypoint: func(w *Waypoint) {
				if count++; count%71 == 1 {
					all = append(all, saved(t, w))
				}
			}})
			require.NoError(t, err)
			require.GreaterOrEqual(t, len(all), 2)
			for i, w := range all {
				var sweeps, stages int
				var second *Waypoint
				r, err := ground(Options{From: w, WaypointEvery: 1, Threads: 1 + i%2,
					OnSweep: func(s Sweep) { require.Equal(t, w.Sweeps+sweeps+1, s.Number); sweeps++ },
					OnStage: func(Stage) { stages++ },
					OnWaypoint: func(v *Waypoint) {
						if second == nil && v.Sweeps > w.Sweeps {
							second = saved(t, v)
						}
					}})
				require.NoError(t, err)
				requireSameBits(t, whole, r, "from waypoint %d of %d", i, len(all))
				require.Equal(t, whole.Verdict, r.Verdict)
				require.Equal(t, len(whole.Sweeps), w.Sweeps+sweeps)
				require.Equal(t, len(whole.Stages), w.Stages+stages)
				if second != nil {
					r, err = ground(Options{From: second})
					require.NoError(t, err)
					requireSameBits(t, whole, r, "from a waypoint after waypoint %d", i)
				}
			}
			// The end of a search is a waypoint too.
			r, err := ground(Options{From: saved(t, whole.Waypoint), OnSweep: func(Sweep) { t.Error("a sweep is told again") },
				OnStage: func(Stage) { t.Error("a stage is told again") }})
			require.NoError(t, err)
			requireSameBits(t, whole, r, "from the end")
		})
	}
}

// TestInterruptionsLeadToTheSameBits ends the context, or the time, within products with the Hamiltonian at random moments.
func TestInterruptionsLeadToTheSameBits(t *testing.T) {
	h := heisenberg(t, 14)
	search := func(ctx context.Context, o Options) (*Result, error) {
		o.Precision = 1e-7
		return Ground(ctx, h, ladder.Sector{"Sz": 0}, o)
	}
	whole, err := search(t.Context(), Options{})
	require.NoError(t, err)
	rng := rand.New(rand.NewPCG(3, 4))
	var from *Waypoint
	stopped := 0
	for {
		bonds, after := 0, 1+rng.IntN(60)
		ctx, cancel := context.WithCancel(t.Context())
		r, err := search(ctx, Options{From: from, OnBond: func(Position) {
			if bonds++; bonds == after {
				cancel()
			}
		}})
		cancel()
		if err == nil {
			requireSameBits(t, whole, r, "after %d stops", stopped)
			break
		}
		require.ErrorIs(t, err, context.Canceled)
		from = saved(t, r.Waypoint)
		stopped++
	}
	require.Greater(t, stopped, 2)
	from = nil
	for stopped = 0; stopped < 100; stopped++ {
		r, err := search(t.Context(), Options{From: from, Time: time.Duration(1+stopped) * 5 * time.Millisecond})
		require.NoError(t, err)
		if r.Verdict != TimeCap {
			requireSameBits(t, whole, r, "after %d stops", stopped)
			return
		}
		from = saved(t, r.Waypoint)
	}
	t.Fatal("the time was never enough: a search that goes on must come further")
}

// TestMoreMemoryGoesOn: where the cap on memory ended a search, a higher one lets it go on.
func TestMoreMemoryGoesOn(t *testing.T) {
	h := heisenberg(t, 20)
	search := func(o Options) *Result {
		o.Precision = 1e-9
		return ground1(t, h, ladder.Sector{"Sz": 0}, o)
	}
	capped := search(Options{Memory: 1 << 18})
	require.Equal(t, MemoryCap, capped.Verdict)
	r := search(Options{From: saved(t, capped.Waypoint)})
	require.Equal(t, Converged, r.Verdict)
	require.Greater(t, len(r.Sweeps), len(capped.Sweeps))
	require.InDelta(t, search(Options{}).Energy, r.Energy, 2e-9)
}

// TestForeignWaypoints: what was saved in another search is refused, and the error tells.
func TestForeignWaypoints(t *testing.T) {
	h := heisenberg(t, 10)
	var w *Waypoint
	search := func(o Options) error {
		_, err := Ground(t.Context(), h, ladder.Sector{"Sz": 0}, o)
		return err
	}
	require.NoError(t, search(Options{WaypointEvery: 1, OnWaypoint: func(v *Waypoint) {
		if w == nil && v.Sweeps == 5 {
			w = saved(t, v)
		}
	}}))
	require.NoError(t, search(Options{From: w}))
	err := search(Options{From: w, Precision: 1e-4})
	require.ErrorIs(t, err, ErrDeparted)
	require.ErrorContains(t, err, "was the sweep")
	changed := func(change func(r *record)) error {
		var r record
		require.NoError(t, json.Unmarshal(w.journal, &r))
		change(&r)
		text, err := json.Marshal(r)
		require.NoError(t, err)
		return search(Options{From: &Waypoint{real: w.real, journal: text}})
	}
	require.NoError(t, changed(func(*record) {}))
	require.ErrorIs(t, changed(func(r *record) { r.Format = "rundle-search/0" }), ErrDeparted)
	require.ErrorContains(t, changed(func(r *record) { r.Way.next = 100 }), "centre")
	require.ErrorContains(t, changed(func(r *record) { r.Way.left = !r.Way.left }), "centre")
	require.ErrorContains(t, changed(func(r *record) { r.Past[2].Learnt = []byte(`{}`) }), "damaged")
	require.ErrorIs(t, changed(func(r *record) { r.Past[0].Learnt = []byte("3") }), ErrDeparted)
	require.ErrorContains(t, search(Options{From: &Waypoint{real: w.real}}), "damaged")
	require.ErrorContains(t, search(Options{From: &Waypoint{}}), "From")
	require.ErrorContains(t, search(Options{WaypointEvery: -1}), "WaypointEvery")
	_, err = Ground(t.Context(), heisenberg(t, 12), ladder.Sector{"Sz": 0}, Options{From: w})
	require.ErrorIs(t, err, ErrDeparted)
}

// TestRecordsLoseNothing: every field of what journals hold comes back to the bit; one that was forgotten does not.
func TestRecordsLoseNothing(t *testing.T) {
	for _, x := range []any{&setting{}, &outcome{}, &passage{}} {
		v := reflect.ValueOf(x).Elem()
		fill(t, v, 0)
		text, err := json.Marshal(x)
		require.NoError(t, err)
		back := reflect.New(v.Type())
		require.NoError(t, json.Unmarshal(text, back.Interface()))
		require.Equal(t, x, back.Interface(), "a field is missing in fields of %T", x)
		require.Error(t, json.Unmarshal([]byte("{}"), back.Interface()))
	}
}

// fill sets each field of a structure to something of its own.
func fill(t *testing.T, v reflect.Value, n int) {
	for i := range v.NumField() {
		f := reflect.NewAt(v.Field(i).Type(), unsafe.Pointer(v.Field(i).UnsafeAddr())).Elem()
		switch f.Kind() {
		case reflect.Struct:
			fill(t, f, n+100)
		case reflect.Float64:
			f.SetFloat(math.Pi * float64(n+i+1))
		case reflect.Int:
			f.SetInt(int64(n + i + 1))
		case reflect.Bool:
			f.SetBool(true)
		case reflect.String:
			f.SetString("x")
		default:
			t.Fatal(errors.New("a field of a kind that this test cannot fill: " + f.Kind().String()))
		}
	}
}

// TestNoDamageToAWaypointGoesUnseen cuts and changes the file.
func TestNoDamageToAWaypointGoesUnseen(t *testing.T) {
	r := ground1(t, heisenberg(t, 4), ladder.Sector{"Sz": 0}, Options{})
	var b bytes.Buffer
	require.NoError(t, r.Waypoint.encode(&b, "note"))
	decoded := func(text []byte) ([]byte, error) {
		n, err := npz.NewReader(bytes.NewReader(text), int64(len(text)))
		if err != nil {
			return nil, err
		}
		w, note, err := decodeWaypoint(n)
		if err != nil {
			return nil, err
		}
		var b bytes.Buffer
		require.NoError(t, w.encode(&b, note))
		return b.Bytes(), nil
	}
	text := b.Bytes()
	refused := 0
	for i := 0; i < len(text); i += 7 {
		damaged := bytes.Clone(text)
		damaged[i] ^= 0x15
		back, err := decoded(damaged)
		if err != nil {
			refused++
			continue
		}
		require.Equal(t, text, back, "byte %d of %d changed the waypoint unseen", i, len(text))
	}
	require.Greater(t, refused, len(text)/20)
	for i := 0; i < len(text); i += 13 {
		_, err := decoded(text[:i])
		require.Error(t, err)
	}
	_, _, err := LoadWaypoint(filepath.Join(t.TempDir(), "none.npz"))
	require.ErrorIs(t, err, os.ErrNotExist)
	path := filepath.Join(t.TempDir(), "state.npz")
	require.NoError(t, r.State.Save(path))
	_, _, err = LoadWaypoint(path)
	require.ErrorIs(t, err, ErrDeparted)
	require.ErrorContains(t, err, path)
}
