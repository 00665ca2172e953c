package examples

import (
	"fmt"
	"path/filepath"
	"testing"

	"github.com/stretchr/testify/require"
	"gonum.org/v1/gonum/mat"

	"rundle/internal/modelfile"
	"rundle/mpo"
	"rundle/mpo/ladder"
)

// singularValues counts those above floor; those of the complex matrix come twice in its real form.
func singularValues(a [][]complex128, floor float64) int {
	m, n := len(a), len(a[0])
	big := mat.NewDense(2*m, 2*n, nil)
	for i, row := range a {
		for j, x := range row {
			big.Set(i, j, real(x))
			big.Set(m+i, n+j, real(x))
			big.Set(i, n+j, -imag(x))
			big.Set(m+i, j, imag(x))
		}
	}
	var f mat.SVD
	if !f.Factorize(big, mat.SVDNone) {
		panic("no convergence")
	}
	count := 0
	for _, x := range f.Values(nil) {
		if x > floor {
			count++
		}
	}
	return count / 2
}

// operatorRank is the rank of the coefficients between the distinct strings on the two sides of a cut, plus one each if terms begin
// behind it and end before it.
func operatorRank(s *ladder.Strings, cut int) int {
	rows, cols := map[string]int{}, map[string]int{}
	place := func(table map[string]int, key string) int {
		if _, ok := table[key]; !ok {
			table[key] = len(table)
		}
		return table[key]
	}
	m := map[[2]int]complex128{}
	begin, end := 0, 0
	for t, c := range s.Coef {
		var left, right string
		for _, f := range s.Factors[s.Start[t]:s.Start[t+1]] {
			if int(f.Site) < cut {
				left += fmt.Sprint(f, " ")
			} else {
				right += fmt.Sprint(f, " ")
			}
		}
		switch {
		case left == "" && right == "":
		case left == "":
			begin = 1
		case right == "":
			end = 1
		default:
			m[[2]int{place(rows, left), place(cols, right)}] += c
		}
	}
	if len(rows) == 0 {
		return begin + end
	}
	a := make([][]complex128, len(rows))
	for i := range a {
		a[i] = make([]complex128, len(cols))
	}
	for e, c := range m {
		a[e[0]][e[1]] = c
	}
	return singularValues(a, 1e-10) + begin + end
}

// requireIndependent makes sure that distinct strings are distinct operators: those of each site are linearly independent.
func requireIndependent(t *testing.T, s *ladder.Strings) {
	t.Helper()
	used := make([]map[int32]bool, len(s.Axes))
	for i := range used {
		used[i] = map[int32]bool{0: true}
	}
	for _, f := range s.Factors {
		used[f.Site][f.Op] = true
	}
	for i, ops := range used {
		var a [][]complex128
		for op := range ops {
			a = append(a, s.Tables[i].Matrices[op])
		}
		require.Equal(t, len(a), singularValues(a, 1e-10), "operators of site %d", i)
	}
}

// The Hamiltonian of every bundled model has the bonds of the operator Schmidt rank, found by singular values.
func TestOperatorRank(t *testing.T) {
	files, err := filepath.Glob("*/model.toml")
	require.NoError(t, err)
	require.NotEmpty(t, files)
	for _, file := range files {
		t.Run(filepath.Dir(file), func(t *testing.T) {
			m, err := modelfile.Load(file)
			require.NoError(t, err)
			s, err := m.Frames.Strings(m.Hamiltonian.Poly)
			require.NoError(t, err)
			requireIndependent(t, s)
			o, err := mpo.Build[complex128](s, mpo.Options{})
			require.NoError(t, err)
			for b := 1; b < o.Len(); b++ {
				require.Equal(t, operatorRank(s, b), o.BondDims()[b], "cut before site %d of %v", b, o.BondDims())
			}
			t.Log(o.BondDims())
		})
	}
}
