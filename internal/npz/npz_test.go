package npz

import (
	"archive/zip"
	"bytes"
	"fmt"
	"io"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// archive writes an archive by fill and returns its bytes.
func archive(t require.TestingT, fill func(w *Writer)) []byte {
	var b bytes.Buffer
	w := NewWriter(&b)
	fill(w)
	require.NoError(t, w.Close())
	return b.Bytes()
}

func read(t require.TestingT, b []byte) *Reader {
	r, err := NewReader(bytes.NewReader(b), int64(len(b)))
	require.NoError(t, err)
	return r
}

func roundTrip[T Element](t *rapid.T, shape []int, data []T, same func(a, b T) bool) {
	b := archive(t, func(w *Writer) { require.NoError(t, Write(w, "a/b", shape, data)) })
	got, back, err := Read[T](read(t, b), "a/b")
	require.NoError(t, err)
	require.True(t, slices.Equal(shape, got), "shape %v came back as %v", shape, got)
	require.True(t, slices.EqualFunc(data, back, same), "%v came back as %v", data, back)

	var one bytes.Buffer
	require.NoError(t, WriteArray(&one, shape, data))
	one.WriteString("what follows")
	got, back, err = ReadArray[T](&one)
	require.NoError(t, err)
	require.True(t, slices.Equal(shape, got))
	require.True(t, slices.EqualFunc(data, back, same))
	require.Equal(t, "what follows", one.String(), "the array must be read to its end and no further")
}

func sameBits(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }

func TestArraysComeBackBitwise(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		shape := rapid.SliceOfN(rapid.IntRange(0, 4), 0, 5).Draw(t, "shape")
		n, err := product(shape)
		require.NoError(t, err)
		bits := rapid.SliceOfN(rapid.Uint64(), 2*n, 2*n).Draw(t, "bits")
		switch rapid.SampledFrom([]Kind{Float64, Complex128, Int64, Bool}).Draw(t, "kind") {
		case Float64:
			data := make([]float64, n)
			for i := range data {
				data[i] = math.Float64frombits(bits[i])
			}
			roundTrip(t, shape, data, sameBits)
		case Complex128:
			data := make([]complex128, n)
			for i := range data {
				data[i] = complex(math.Float64frombits(bits[2*i]), math.Float64frombits(bits[2*i+1]))
			}
			roundTrip(t, shape, data, func(a, b complex128) bool { return sameBits(real(a), real(b)) && sameBits(imag(a), imag(b)) })
		case Int64:
			data := make([]int64, n)
			for i := range data {
				data[i] = int64(bits[i])
			}
			roundTrip(t, shape, data, func(a, b int64) bool { return a == b })
		case Bool:
			data := make([]bool, n)
			for i := range data {
				data[i] = bits[i]&1 == 1
			}
			roundTrip(t, shape, data, func(a, b bool) bool { return a == b })
		}
	})
}

func TestTextComesBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := strings.TrimRight(rapid.String().Draw(t, "text"), "\x00")
		b := archive(t, func(w *Writer) { require.NoError(t, w.WriteText("meta", s)) })
		got, err := read(t, b).ReadText("meta")
		require.NoError(t, err)
		require.Equal(t, s, got)
	})
}

func TestLargeArraysAreReadInPieces(t *testing.T) {
	data := make([]int64, 3*chunk/8+5)
	for i := range data {
		data[i] = int64(i)
	}
	var b bytes.Buffer
	require.NoError(t, WriteArray(&b, []int{len(data)}, data))
	_, back, err := ReadArray[int64](&b)
	require.NoError(t, err)
	require.True(t, slices.Equal(data, back))
}

func TestWriterRefuses(t *testing.T) {
	for _, row := range []struct {
		name  string
		write func(w *Writer) error
		want  string
	}{
		{"shape of another size", func(w *Writer) error { return Write(w, "x", []int{2, 2}, []float64{1}) }, "shape [2 2] asks for 4 elements, got 1"},
		{"negative dimension", func(w *Writer) error { return Write(w, "x", []int{-1}, []float64{}) }, "negative dimension"},
		{"too many dimensions", func(w *Writer) error { return Write(w, "x", make([]int, 33), []float64{}) }, "33 dimensions"},
		{"overflowing shape", func(w *Writer) error { return Write(w, "x", []int{1 << 40, 1 << 40}, []float64{}) }, "too many elements"},
		{"name twice", func(w *Writer) error {
			require.NoError(t, Write(w, "x", nil, []bool{true}))
			return w.WriteText("x", "")
		}, `"x" is written twice`},
		{"empty name", func(w *Writer) error { return w.WriteText("", "") }, "expected a relative"},
		{"absolute name", func(w *Writer) error { return w.WriteText("/x", "") }, "expected a relative"},
		{"text that is not UTF-8", func(w *Writer) error { return w.WriteText("x", "\xff") }, "not valid UTF-8"},
		{"text with a zero at its end", func(w *Writer) error { return w.WriteText("x", "a\x00") }, "zero character"},
	} {
		t.Run(row.name, func(t *testing.T) {
			require.ErrorContains(t, row.write(NewWriter(io.Discard)), row.want)
		})
	}
}

// raw packs bytes as the entry x.npy of an archive.
func raw(t *testing.T, method uint16, npy string) []byte {
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	w, err := z.CreateHeader(&zip.FileHeader{Name: "x.npy", Method: method})
	require.NoError(t, err)
	_, err = io.WriteString(w, npy)
	require.NoError(t, err)
	require.NoError(t, z.Close())
	return b.Bytes()
}

// npy1 puts the signature and version 1.0 before a header.
func npy1(header, data string) string {
	return magic + "\x01\x00" + string([]byte{byte(len(header)), byte(len(header) >> 8)}) + header + data
}

func TestForeignHeadersAreExplained(t *testing.T) {
	const eight = "\x00\x00\x00\x00\x00\x00\xf0\x3f" // 1.0, low byte first
	for _, row := range []struct{ name, npy, want string }{
		{"empty entry", "", "header is cut short"},
		{"no signature", strings.Repeat("x", 200), "does not begin with the .npy signature"},
		{"version 9", magic + "\x09\x00\x00\x00", "version 9.0"},
		{"header longer than the entry", magic + "\x01\x00\xff\xff{", "header is cut short"},
		{"huge header", magic + "\x02\x00\xff\xff\xff\x7f{", "at most 65536 were expected"},
		{"version 2 cut short", magic + "\x02\x00\xff\xff", "header is cut short"},
		{"not a dictionary", npy1("[1, 2]", ""), `expected "{"`},
		{"no shape", npy1("{'descr': '<f8', 'fortran_order': False}", eight), `lacks "shape"`},
		{"strange key", npy1("{'colour': '<f8'}", eight), `expected one of the keys`},
		{"unclosed string", npy1("{'descr: ", eight), "closing quote"},
		{"negative dimension", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (-1,)}", eight), "expected a dimension"},
		{"endless dimension", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (99999999999999999999,)}", eight), "expected a dimension"},
		{"overflowing shape", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (4294967296,4294967296)}", eight), "too many elements"},
		{"33 dimensions", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': ("+strings.Repeat("1,", 33)+")}", eight), "at most 32 dimensions"},
		{"text after the header", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': ()} x", eight), "end of the header"},
		{"boolean misspelt", npy1("{'descr': '<f8', 'fortran_order': false, 'shape': ()}", eight), `expected "False"`},
		{"single precision", npy1("{'descr': '<f4', 'fortran_order': False, 'shape': ()}", eight), `NumPy type "<f4"; expected float64 (<f8)`},
		{"objects", npy1("{'descr': '|O', 'fortran_order': False, 'shape': ()}", eight), `NumPy type "|O"`},
		{"records", npy1("{'descr': [('a', '<f8')], 'fortran_order': False, 'shape': ()}", eight), "records"},
		{"another kind", npy1("{'descr': '<i8', 'fortran_order': False, 'shape': ()}", eight), "it holds int64; expected float64"},
		{"more data than announced", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (2,)}", eight+eight+eight), "has 89 bytes; shape (2,) of float64 needs 81"},
		{"less data than announced", npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (1000000000000,)}", eight), "shape (1000000000000,) of float64 needs"},
	} {
		t.Run(row.name, func(t *testing.T) {
			for _, method := range []uint16{zip.Store, zip.Deflate} {
				_, _, err := Read[float64](read(t, raw(t, method, row.npy)), "x")
				require.ErrorContains(t, err, row.want)
				require.ErrorContains(t, err, `array "x"`)
			}
		})
	}
	t.Run("bool of value 2", func(t *testing.T) {
		b := raw(t, zip.Store, npy1("{'descr': '|b1', 'fortran_order': False, 'shape': ()}", "\x02"))
		_, _, err := Read[bool](read(t, b), "x")
		require.ErrorContains(t, err, "stored as 2")
	})
	t.Run("text of surrogates", func(t *testing.T) {
		b := raw(t, zip.Store, npy1("{'descr': '<U1', 'fortran_order': False, 'shape': ()}", "\x00\xd8\x00\x00"))
		_, err := read(t, b).ReadText("x")
		require.ErrorContains(t, err, "0xd800")
	})
	t.Run("array of strings", func(t *testing.T) {
		b := raw(t, zip.Store, npy1("{'descr': '<U1', 'fortran_order': False, 'shape': (2,)}", "a\x00\x00\x00b\x00\x00\x00"))
		_, err := read(t, b).ReadText("x")
		require.ErrorContains(t, err, "expected a single unicode string")
	})
	t.Run("absent array", func(t *testing.T) {
		_, _, err := Read[bool](read(t, raw(t, zip.Store, "")), "y")
		require.ErrorContains(t, err, `array "y": it is not in the archive`)
	})
	t.Run("method unknown", func(t *testing.T) {
		b := raw(t, zip.Store, npy1("{}", ""))
		b = bytes.Replace(b, []byte("PK\x01\x02\x14\x00\x14\x00\x08\x00\x00\x00"), []byte("PK\x01\x02\x14\x00\x14\x00\x08\x00\x63\x00"), 1)
		_, _, err := Read[bool](read(t, b), "x")
		require.ErrorContains(t, err, "compression method")
	})
}

func TestByteAndIndexOrderOfOthers(t *testing.T) {
	b := raw(t, zip.Deflate, npy1(`{"descr": ">i8", "fortran_order": True, "shape": (2, 3), }`,
		"\x00\x00\x00\x00\x00\x00\x00\x01\x00\x00\x00\x00\x00\x00\x00\x02\x00\x00\x00\x00\x00\x00\x00\x03"+
			"\x00\x00\x00\x00\x00\x00\x00\x04\x00\x00\x00\x00\x00\x00\x00\x05\x00\x00\x00\x00\x00\x00\x01\x00"))
	shape, data, err := Read[int64](read(t, b), "x")
	require.NoError(t, err)
	require.Equal(t, []int{2, 3}, shape)
	require.Equal(t, []int64{1, 3, 5, 2, 4, 256}, data)
}

// sample holds one array of each kind.
func sample(t testing.TB) []byte {
	return archive(t, func(w *Writer) {
		require.NoError(t, w.WriteText("meta", "{\"α\": 1}"))
		require.NoError(t, Write(w, "f", []int{2, 1, 3}, []float64{1, -2, math.Pi, math.Inf(1), math.SmallestNonzeroFloat64, 0}))
		require.NoError(t, Write(w, "c", []int{2}, []complex128{complex(1, -1), complex(0, math.NaN())}))
		require.NoError(t, Write(w, "i", []int{2}, []int64{math.MinInt64, 7}))
		require.NoError(t, Write(w, "b", []int{1, 3}, []bool{true, false, true}))
		require.NoError(t, Write(w, "none", []int{0, 4}, []float64{}))
		require.NoError(t, Write(w, "deep/one", nil, []float64{4}))
	})
}

// contents reads everything and prints it bit by bit.
func contents(r *Reader) (string, error) {
	var s strings.Builder
	for _, name := range r.Names() {
		h, err := r.Info(name)
		if err != nil {
			return "", err
		}
		var v any
		switch h.Kind {
		case Float64:
			_, x, e := Read[float64](r, name)
			v, err = bytesOf(x), e
		case Complex128:
			_, x, e := Read[complex128](r, name)
			v, err = bytesOf(x), e
		case Int64:
			_, v, err = Read[int64](r, name)
		case Bool:
			_, v, err = Read[bool](r, name)
		case Unicode:
			v, err = r.ReadText(name)
		}
		if err != nil {
			return "", err
		}
		fmt.Fprintln(&s, name, h.Kind, h.Shape, v)
	}
	return s.String(), nil
}

func TestNoDamagedByteGoesUnseen(t *testing.T) {
	b := sample(t)
	want, err := contents(read(t, b))
	require.NoError(t, err)
	require.Equal(t, 7, strings.Count(want, "\n"))
	names := []string{"meta", "f", "c", "i", "b", "none", "deep/one"}
	refused := 0
	for i := range b {
		for _, flip := range []byte{0x01, 0x80, 0xff} {
			b[i] ^= flip
			r, err := NewReader(bytes.NewReader(b), int64(len(b)))
			if err == nil && slices.ContainsFunc(names, func(n string) bool { return !r.Has(n) }) {
				err = io.ErrUnexpectedEOF // an entry lost its name: whoever asks for it gets an error
			}
			if err == nil {
				var got string
				if got, err = contents(r); err == nil {
					require.Equal(t, want, got, "byte %d changed the data unseen", i)
				}
			}
			if err != nil {
				refused++
			}
			b[i] ^= flip
		}
	}
	require.Greater(t, refused, len(b), "most damage must be refused")
	for i := range b {
		if r, err := NewReader(bytes.NewReader(b[:i]), int64(i)); err == nil {
			_, err = contents(r)
			require.Error(t, err, "cut to %d bytes", i)
		}
	}
}

func TestOpenNamesTheFile(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "x.npz")
	_, err := Open(path)
	require.ErrorIs(t, err, os.ErrNotExist)
	require.NoError(t, os.WriteFile(path, []byte("plain text"), 0o600))
	_, err = Open(path)
	require.ErrorContains(t, err, path+": not an .npz archive")
	_, err = Open(dir)
	require.ErrorContains(t, err, "not a regular file")
	require.NoError(t, os.WriteFile(path, sample(t), 0o600))
	r, err := Open(path)
	require.NoError(t, err)
	_, err = contents(r)
	require.NoError(t, err)
	require.NoError(t, r.Close())
}

func TestDigest(t *testing.T) {
	var digests []uint32
	b := archive(t, func(w *Writer) {
		digests = append(digests, w.Digest())
		require.NoError(t, Write(w, "b", nil, []float64{1}))
		digests = append(digests, w.Digest())
		require.NoError(t, Write(w, "a", nil, []float64{1}))
		digests = append(digests, w.Digest())
		require.NoError(t, w.WriteText("meta", fmt.Sprint(w.Digest())))
	})
	r := read(t, b)
	require.Equal(t, digests, []uint32{r.Digest("meta", "a", "b"), r.Digest("meta", "a"), r.Digest("meta")})
	require.NotEqual(t, digests[0], digests[1])
	require.NotEqual(t, digests[1], digests[2])
	swapped := archive(t, func(w *Writer) {
		require.NoError(t, Write(w, "a", nil, []float64{1}))
		require.NoError(t, Write(w, "b", nil, []float64{2}))
	})
	require.NotEqual(t, digests[2], read(t, swapped).Digest())
}

type failAfter struct{ n int }

func (f *failAfter) Write(b []byte) (int, error) {
	if f.n -= len(b); f.n < 0 {
		return 0, io.ErrShortWrite
	}
	return len(b), nil
}

func TestWriteErrorsComeOut(t *testing.T) {
	for n := 0; n < 450; n += 10 {
		w := NewWriter(&failAfter{n})
		err := Write(w, "a", []int{2000}, make([]float64, 2000))
		if err == nil {
			err = w.Close()
		}
		require.ErrorIs(t, err, io.ErrShortWrite)
	}
}

func TestManyEntriesNeedZip64(t *testing.T) {
	const n = 1<<16 + 10
	b := archive(t, func(w *Writer) {
		for i := range n {
			require.NoError(t, Write(w, fmt.Sprint(i), nil, []int64{int64(i)}))
		}
	})
	r := read(t, b)
	require.Len(t, r.Names(), n)
	_, x, err := Read[int64](r, fmt.Sprint(n-1))
	require.NoError(t, err)
	require.Equal(t, []int64{n - 1}, x)
}

func TestSwappedBytes(t *testing.T) {
	var b bytes.Buffer
	data := make([]byte, 2*chunk+8)
	for i := range data {
		data[i] = byte(i)
	}
	require.NoError(t, writeSwapped(&b, data, 8))
	require.Equal(t, []byte{7, 6, 5, 4, 3, 2, 1, 0, 15}, b.Bytes()[:9])
	swap(b.Bytes(), 8)
	require.True(t, bytes.Equal(data, b.Bytes()))
}

// python returns an interpreter that has NumPy, or skips the test.
func python(t testing.TB) string {
	for _, p := range []string{"/usr/bin/python3", "python3"} {
		if exec.Command(p, "-c", "import numpy").Run() == nil {
			return p
		}
	}
	t.Skip("no python3 with numpy on this machine (Debian: python3-numpy)")
	return ""
}

func TestNumPyReadsOurs(t *testing.T) {
	py := python(t)
	path := filepath.Join(t.TempDir(), "ours.npz")
	require.NoError(t, os.WriteFile(path, sample(t), 0o600))
	out, err := exec.Command(py, "-W", "error", "-c", `
import sys, json, zipfile, numpy as np
assert zipfile.ZipFile(sys.argv[1]).testzip() is None
d = np.load(sys.argv[1])
assert json.loads(str(d["meta"])) == {"α": 1}
assert d["f"].dtype == np.float64 and d["f"].shape == (2, 1, 3)
assert d["f"].ravel().tolist() == [1, -2, np.pi, np.inf, 5e-324, 0]
assert d["c"].dtype == np.complex128 and d["c"][0] == 1-1j and np.isnan(d["c"][1].imag)
assert d["i"].tolist() == [-2**63, 7]
assert d["b"].dtype == bool and d["b"].tolist() == [[True, False, True]]
assert d["none"].shape == (0, 4) and d["deep/one"].shape == () and d["deep/one"] == 4
print(len(d.files))
`, path).CombinedOutput()
	require.NoError(t, err, "%s", out)
	require.Equal(t, "7\n", string(out))
}

func TestWeReadNumPys(t *testing.T) {
	py := python(t)
	path := filepath.Join(t.TempDir(), "theirs.npz")
	for _, save := range []string{"savez", "savez_compressed"} {
		out, err := exec.Command(py, "-c", `
import sys, numpy as np
a = np.arange(24.).reshape(2, 3, 4)
getattr(np, sys.argv[2])(sys.argv[1], a=a, t=a.T, big=a.astype(">f8"), c=a*1j, i=np.arange(3), b=a > 10,
    s=np.array("naïve ∫"), single=a.astype(np.float32), empty=np.zeros((0, 2)))
`, path, save).CombinedOutput()
		require.NoError(t, err, "%s", out)
		r, err := Open(path)
		require.NoError(t, err)
		want := make([]float64, 24)
		for i := range want {
			want[i] = float64(i)
		}
		for _, name := range []string{"a", "big"} {
			shape, a, err := Read[float64](r, name)
			require.NoError(t, err)
			require.Equal(t, []int{2, 3, 4}, shape)
			require.Equal(t, want, a)
		}
		shape, transposed, err := Read[float64](r, "t")
		require.NoError(t, err)
		require.Equal(t, []int{4, 3, 2}, shape)
		require.Equal(t, []float64{0, 12, 4, 16, 8, 20, 1, 13}, transposed[:8])
		_, c, err := Read[complex128](r, "c")
		require.NoError(t, err)
		require.Equal(t, complex(0, 23), c[23])
		_, i, err := Read[int64](r, "i")
		require.NoError(t, err)
		require.Equal(t, []int64{0, 1, 2}, i)
		_, b, err := Read[bool](r, "b")
		require.NoError(t, err)
		require.Equal(t, []bool{false, true}, b[10:12])
		s, err := r.ReadText("s")
		require.NoError(t, err)
		require.Equal(t, "naïve ∫", s)
		_, _, err = Read[float64](r, "single")
		require.ErrorContains(t, err, `"<f4"`)
		shape, _, err = Read[float64](r, "empty")
		require.NoError(t, err)
		require.Equal(t, []int{0, 2}, shape)
		require.NoError(t, r.Close())
	}
}

func FuzzReader(f *testing.F) {
	f.Add(sample(f))
	f.Add([]byte("PK\x05\x06" + strings.Repeat("\x00", 18)))
	f.Fuzz(func(t *testing.T, b []byte) {
		r, err := NewReader(bytes.NewReader(b), int64(len(b)))
		if err != nil {
			return
		}
		if s, err := contents(r); err == nil && len(r.Names()) > 0 && s == "" {
			t.Fatal("arrays without contents")
		}
	})
}

func FuzzArray(f *testing.F) {
	f.Add([]byte(npy1("{'descr': '<f8', 'fortran_order': False, 'shape': (9999999999,)}", "12345678")))
	f.Add([]byte(npy1("{'descr': '|b1', 'fortran_order': True, 'shape': (2,1)}", "\x01\x00")))
	f.Fuzz(func(t *testing.T, b []byte) {
		shape, data, err := ReadArray[float64](bytes.NewReader(b))
		if err == nil {
			var again bytes.Buffer
			require.NoError(t, WriteArray(&again, shape, data))
			_, back, err := ReadArray[float64](&again)
			require.NoError(t, err)
			require.True(t, slices.EqualFunc(data, back, sameBits))
		}
		_, flags, err := ReadArray[bool](bytes.NewReader(b))
		if err == nil {
			for _, x := range flags {
				if x != true && x != false {
					t.Fatal("a bool that is neither")
				}
			}
		}
	})
}

func BenchmarkWrite(b *testing.B) {
	data := make([]complex128, 1<<22)
	b.SetBytes(int64(len(data) * 16))
	for b.Loop() {
		w := NewWriter(io.Discard)
		if err := Write(w, "x", []int{len(data)}, data); err != nil {
			b.Fatal(err)
		}
	}
}
