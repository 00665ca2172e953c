package mps

import (
	"bytes"
	"encoding/json"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"

	"rundle/internal/npz"
	"rundle/mpo/ladder"
)

func encoded(t testing.TB, s *State) []byte {
	var b bytes.Buffer
	require.NoError(t, s.encode(&b))
	return b.Bytes()
}

func decoded(b []byte) (*State, error) {
	r, err := npz.NewReader(bytes.NewReader(b), int64(len(b)))
	if err != nil {
		return nil, err
	}
	return decode(r)
}

func TestSaveAndLoad(t *testing.T) {
	for _, row := range []struct {
		name   string
		model  model
		sector ladder.Sector
	}{
		{"real bosons", bosons(t, 3, "0"), ladder.Sector{"N": 4}},
		{"real gauge", imaginary(t, 3), ladder.Sector{"N": 4}},
		{"complex bosons", bosons(t, 3, "0.3"), ladder.Sector{"N": 4}},
		{"turned spins", tilted(t, 5), ladder.Sector{"P": 1}},
		{"no charges", newModel(t, 3, ladder.Boson(2), 1, ladder.FrameOptions{}, ladder.Term{Formula: "b[a,j] + b[a,j]^3 + h.c."}), nil},
	} {
		t.Run(row.name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "state-0.npz")
			for center := -1; center < 2; center++ {
				s := row.model.random(t, row.sector, 6, 3)
				if c, ok := s.Real(); ok {
					c.MoveCenter(1, nil)
					c.Sites[0].Data[0] = math.Copysign(0, -1)
					c.Center = -1
					if center >= 0 {
						c.Canonicalize(center, nil)
					}
				} else if center >= 0 {
					s.complex.MoveCenter(center, nil)
				}
				require.NoError(t, s.Save(path))
				back, err := Load(path)
				require.NoError(t, err)
				require.Equal(t, encoded(t, s), encoded(t, back), "every bit comes back")
				if c, ok := s.Real(); ok {
					sameChain(t, c, back.real)
				} else {
					sameChain(t, s.complex, back.complex)
				}
				require.Equal(t, s.Frames().Sites, back.Frames().Sites)
				require.Equal(t, s.Charges(), back.Charges())
				require.Equal(t, s.Scope().Constants(), back.Scope().Constants())
				x, err := s.Overlap(back)
				require.NoError(t, err)
				require.InDelta(t, math.Pow(s.Norm(), 2), real(x), 1e-12)
			}
		})
	}
}

// small is a state whose file can be damaged at every byte.
func small(t testing.TB) *State {
	return newModel(t, 2, ladder.Fermion(), 1, ladder.FrameOptions{}, ladder.Term{Formula: "c^+[a,j+1] c[a,j] + h.c."}).random(t, ladder.Sector{"N": 1}, 2, 1)
}

func TestNoDamagedByteGoesUnseen(t *testing.T) {
	s := small(t)
	b := encoded(t, s)
	want := bytes.Clone(b)
	refused := 0
	for i := range b {
		for _, flip := range []byte{0x10, 0xff} {
			b[i] ^= flip
			if back, err := decoded(b); err != nil {
				refused++
			} else {
				require.Equal(t, want, encoded(t, back), "byte %d of %d changed the state unseen", i, len(b))
			}
			b[i] ^= flip
		}
	}
	require.Greater(t, refused, len(b), "most damage must be refused")
	for i := range b {
		_, err := decoded(b[:i])
		require.Error(t, err, "cut to %d of %d bytes", i, len(b))
	}
}

// rewritten is the small state after a change to its arrays, with checksums that fit: a file made by others.
func rewritten(t *testing.T, change func(arrays map[string]any, m map[string]any)) []byte {
	b := encoded(t, small(t))
	r, err := npz.NewReader(bytes.NewReader(b), int64(len(b)))
	require.NoError(t, err)
	arrays, m := map[string]any{}, map[string]any{}
	for _, name := range r.Names() {
		info, err := r.Info(name)
		require.NoError(t, err)
		switch info.Kind {
		case npz.Float64:
			shape, data, err := npz.Read[float64](r, name)
			require.NoError(t, err)
			arrays[name] = array[float64]{shape, data}
		case npz.Int64:
			shape, data, err := npz.Read[int64](r, name)
			require.NoError(t, err)
			arrays[name] = array[int64]{shape, data}
		case npz.Unicode:
			text, err := r.ReadText(name)
			require.NoError(t, err)
			require.NoError(t, json.Unmarshal([]byte(text), &m))
		}
	}
	change(arrays, m)
	var out bytes.Buffer
	w := npz.NewWriter(&out)
	for name, a := range arrays {
		switch a := a.(type) {
		case array[float64]:
			require.NoError(t, npz.Write(w, name, a.shape, a.data))
		case array[int64]:
			require.NoError(t, npz.Write(w, name, a.shape, a.data))
		case array[complex128]:
			require.NoError(t, npz.Write(w, name, a.shape, a.data))
		}
	}
	m["digest"] = w.Digest()
	text, err := json.Marshal(m)
	require.NoError(t, err)
	require.NoError(t, w.WriteText("meta", string(text)))
	require.NoError(t, w.Close())
	return out.Bytes()
}

type array[T npz.Element] struct {
	shape []int
	data  []T
}

func TestForeignFilesAreExplained(t *testing.T) {
	type arrays = map[string]any
	type object = map[string]any
	table := func(rows, columns int, data ...int64) array[int64] { return array[int64]{[]int{rows, columns}, data} }
	_, err := decoded(rewritten(t, func(arrays, object) {}))
	require.NoError(t, err)
	for _, row := range []struct {
		name   string
		change func(a arrays, m object)
		want   string
	}{
		{"another format", func(_ arrays, m object) { m["format"] = "rundle-state/2" }, `its format is "rundle-state/2"; this version reads "rundle-state/1"`},
		{"no format", func(_ arrays, m object) { delete(m, "format") }, `its format is ""`},
		{"another arithmetic", func(_ arrays, m object) { m["arithmetic"] = "quaternion" }, `arithmetic "quaternion"`},
		{"no sites", func(_ arrays, m object) { m["sites"] = 0 }, "0 sites"},
		{"more sites than there are", func(_ arrays, m object) { m["sites"] = 1 << 40 }, `array "site_0002/axis": it is not in the archive`},
		{"fewer sites than there are", func(_ arrays, m object) { m["sites"] = 1 }, "right edge"},
		{"centre beyond the end", func(_ arrays, m object) { m["center"] = 2 }, "orthogonality centre 2"},
		{"centre elsewhere", func(a arrays, m object) {
			x := a["site_0000/block_0000"].(array[float64])
			x.data[0] *= 2
			m["center"] = 1
		}, "site 0 is not canonical"},
		{"centre elsewhere, from the right", func(a arrays, _ object) {
			x := a["site_0001/block_0000"].(array[float64])
			x.data[0] *= 2
		}, "site 1 is not canonical"},
		{"no frames", func(_ arrays, m object) { delete(m, "frames") }, "frames or scope are missing"},
		{"no scope", func(_ arrays, m object) { m["scope"] = nil }, "frames or scope are missing"},
		{"frames of another type", func(_ arrays, m object) { m["frames"] = "none" }, "metadata: json"},
		{"frames of another group", func(_ arrays, m object) { m["group"] = []any{object{"Name": "N", "Modulus": 2}} }, "in frames with"},
		{"a group that cannot be", func(_ arrays, m object) { m["group"] = []any{object{"Name": "N", "Modulus": 1}} }, "modulus 1"},
		{"a table of other shape", func(a arrays, _ object) { a["bond_0001"] = table(1, 3, 1, 0, 0) }, `array "bond_0001" has shape [1 3]`},
		{"an empty table", func(a arrays, _ object) { a["bond_0001"] = table(0, 2) }, `array "bond_0001" has shape [0 2]`},
		{"a table of numbers", func(a arrays, _ object) { a["bond_0001"] = array[float64]{[]int{1, 2}, []float64{1, 0}} }, "it holds float64; expected int64"},
		{"a negative dimension", func(a arrays, _ object) { a["bond_0001"] = table(1, 2, -1, 0) }, "row 0 has dimension -1"},
		{"a huge dimension", func(a arrays, _ object) { a["bond_0001"] = table(1, 2, 1<<62, 0) }, "row 0 has dimension"},
		{"a huge charge", func(a arrays, _ object) { a["bond_0001"] = table(1, 2, 1, 1<<32) }, "too large"},
		{"charges out of order", func(a arrays, _ object) { a["bond_0001"] = table(2, 2, 1, 1, 1, 0) }, "row 1: charges are not in increasing order"},
		{"claims without blocks", func(a arrays, _ object) { a["bond_0001"] = table(2, 2, 1<<20, 0, 1<<20, 1) }, "has shape [1 1 1]; its charges have dimensions"},
		{"wrong blocks", func(a arrays, _ object) { a["site_0000/blocks"] = table(2, 3, 0, 1, 0, 0, 0, 1) }, "row 0 is [0 1 0]; expected [0 0 0]"},
		{"missing blocks", func(a arrays, _ object) { a["site_0000/blocks"] = table(1, 3, 0, 0, 0) }, "the charges allow 2 blocks"},
		{"a block missing", func(a arrays, _ object) { delete(a, "site_0000/block_0001") }, "not in the archive"},
		{"a block of other shape", func(a arrays, _ object) {
			a["site_0000/block_0001"] = array[float64]{[]int{1}, []float64{1}}
		}, "has shape [1]"},
		{"a complex block", func(a arrays, _ object) {
			a["site_0000/block_0001"] = array[complex128]{[]int{1, 1, 1}, []complex128{1}}
		}, "it holds complex128; expected float64"},
		{"not a number", func(a arrays, m object) {
			m["center"] = -1
			a["site_0000/block_0001"] = array[float64]{[]int{1, 1, 1}, []float64{math.NaN()}}
		}, "holds the number NaN"},
		{"too many charges", func(a arrays, _ object) {
			var x, y []int64
			for i := range int64(10000) {
				x, y = append(x, 1, i), append(y, 1, i)
			}
			a["bond_0000"], a["site_0000/axis"] = table(10000, 2, x...), table(10000, 2, y...)
		}, "more combinations of charges"},
	} {
		t.Run(row.name, func(t *testing.T) {
			_, err := decoded(rewritten(t, row.change))
			require.ErrorContains(t, err, row.want)
		})
	}
	t.Run("an array added", func(t *testing.T) {
		b := rewritten(t, func(a arrays, _ object) {})
		r, err := npz.NewReader(bytes.NewReader(b), int64(len(b)))
		require.NoError(t, err)
		text, err := r.ReadText("meta")
		require.NoError(t, err)
		var out bytes.Buffer
		w := npz.NewWriter(&out)
		require.NoError(t, w.WriteText("meta", text))
		require.NoError(t, w.Close())
		_, err = decoded(out.Bytes())
		require.ErrorContains(t, err, "its arrays are not those it was saved with; restore the file from a copy")
	})
	for _, text := range []string{"", "[]", "{"} {
		var out bytes.Buffer
		w := npz.NewWriter(&out)
		require.NoError(t, w.WriteText("meta", text))
		require.NoError(t, w.Close())
		_, err = decoded(out.Bytes())
		require.ErrorContains(t, err, "not the metadata of a state")
	}
}

func TestLoadNamesTheFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "x.npz")
	_, err := Load(path)
	require.ErrorIs(t, err, os.ErrNotExist)
	require.ErrorContains(t, err, path)
	_, err = Load(dir)
	require.ErrorContains(t, err, dir+": it is not a regular file")
	require.NoError(t, os.WriteFile(path, []byte("energies"), 0o600))
	_, err = Load(path)
	require.ErrorContains(t, err, path+": not an .npz archive")
	require.ErrorContains(t, err, "expected a state file (.npz) of this program")

	var out bytes.Buffer
	w := npz.NewWriter(&out)
	require.NoError(t, npz.Write(w, "x", nil, []float64{1}))
	require.NoError(t, w.Close())
	require.NoError(t, os.WriteFile(path, out.Bytes(), 0o600))
	_, err = Load(path)
	require.ErrorContains(t, err, path+`: no array "meta" in it; expected a state file of this program`)

	require.ErrorIs(t, small(t).Save(filepath.Join(dir, "absent", "x.npz")), os.ErrNotExist)
}

// The program that doc.go shows reads real and complex states, and finds the same state vector.
func TestNumPyReadsStates(t *testing.T) {
	py := ""
	for _, p := range []string{"/usr/bin/python3", "python3"} {
		if exec.Command(p, "-c", "import numpy").Run() == nil {
			py = p
			break
		}
	}
	if py == "" {
		t.Skip("no python3 with numpy on this machine (Debian: python3-numpy)")
	}
	doc, err := os.ReadFile("doc.go")
	require.NoError(t, err)
	program, ok := "", false
	for line := range strings.Lines(string(doc)) {
		line = strings.TrimPrefix(strings.TrimPrefix(line, "//"), "\t")
		ok = ok || line == "import json, numpy\n"
		if ok {
			program += line
		}
		if line == "    return out\n" {
			break
		}
	}
	require.Contains(t, program, "return out")
	program += `
psi = numpy.ones((1, 1))
for i in range(meta["sites"]):
    psi = numpy.tensordot(psi, tensor(i), 1)
numpy.save("psi.npy", psi.ravel())
print(meta["sites"])
`
	for _, m := range []model{bosons(t, 3, "0"), bosons(t, 3, "0.3")} {
		dir := t.TempDir()
		s := m.random(t, ladder.Sector{"N": 4}, 8, 3)
		require.NoError(t, s.Save(filepath.Join(dir, "state.npz")))
		cmd := exec.Command(py, "-W", "error", "-c", program)
		cmd.Dir = dir
		out, err := cmd.CombinedOutput()
		require.NoError(t, err, "%s", out)
		require.Equal(t, "6\n", string(out))
		f, err := os.Open(filepath.Join(dir, "psi.npy"))
		require.NoError(t, err)
		var psi []complex128
		if _, ok := s.Real(); ok {
			_, x, err := npz.ReadArray[float64](f)
			require.NoError(t, err)
			for _, v := range x {
				psi = append(psi, complex(v, 0))
			}
		} else {
			_, psi, err = npz.ReadArray[complex128](f)
			require.NoError(t, err)
		}
		require.NoError(t, f.Close())
		requireClose(t, vectorOf(s), psi, 1e-14)
	}
}

func FuzzLoad(f *testing.F) {
	f.Add(encoded(f, small(f)))
	f.Fuzz(func(t *testing.T, b []byte) {
		s, err := decoded(b)
		if err != nil {
			return
		}
		back, err := decoded(encoded(t, s))
		if err != nil || back.Charge() != s.Charge() {
			t.Fatalf("a state that was read cannot be read again: %v", err)
		}
	})
}

func BenchmarkSave(b *testing.B) {
	m := bosons(b, 20, "0")
	s := m.random(b, ladder.Sector{"N": 20}, 400, 1)
	path := filepath.Join(b.TempDir(), "state.npz")
	for b.Loop() {
		require.NoError(b, s.Save(path))
	}
	info, err := os.Stat(path)
	require.NoError(b, err)
	b.SetBytes(info.Size())
	b.Run("load", func(b *testing.B) {
		b.SetBytes(info.Size())
		for b.Loop() {
			_, err := Load(path)
			require.NoError(b, err)
		}
	})
}
