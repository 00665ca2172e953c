package solve

import (
	"fmt"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"

	"rundle/internal/modelfile"
)

func explained(t *testing.T, text string) *Explanation {
	t.Helper()
	e, err := Explain(parse(t, text))
	require.NoError(t, err)
	return e
}

func TestExplainChain(t *testing.T) {
	e := explained(t, fmt.Sprintf(hopping, 8, 4, 1e-8))
	four := 4.0
	assert.Equal(t, "hopping", e.Title)
	assert.Equal(t, 8, e.Sites)
	assert.Equal(t, "open", e.Boundary)
	assert.Equal(t, []LegFacts{{Name: "a", Site: "fermion", Sites: 8, Dim: 2}}, e.Legs)
	assert.Equal(t, Cell{Legs: []string{"a"}, Links: []Link{{"a", "a", 1}}}, e.Cell)
	require.Len(t, e.Terms, 1)
	assert.Equal(t, 7, e.Terms[0].Places)
	assert.Equal(t, 14, e.Terms[0].Products)
	assert.Equal(t, "j = 3", e.Terms[0].At)
	assert.Contains(t, e.Terms[0].Example, "c[a,3]")
	assert.Equal(t, 14, e.Products)
	require.Len(t, e.Charges, 1)
	assert.Equal(t, "N", e.Charges[0].Name)
	assert.Equal(t, &four, e.Charges[0].Value)
	assert.Equal(t, "real", e.Arithmetic)
	assert.Equal(t, []int{1, 3, 4, 4, 4, 4, 4, 3, 1}, e.MPOBonds)
	assert.Equal(t, []ObservedFacts{{"density", "values", 8}, {"current", "values", 7}, {"coherence", "correlations", 64}, {"charge", "correlations", 64}}, e.Observations)
	assert.Empty(t, e.Warnings)
	// Eight sites have no more than 2^4 states at a cut.
	require.Len(t, e.Forecast, 1)
	assert.Equal(t, 16, e.Forecast[0].Bond)
}

func TestExplainLoop(t *testing.T) {
	const flux = `
[ladder]
rungs = 6
[[leg]]
name = "a"
site = "boson"
max  = 2
[[leg]]
name = "b"
site = "boson"
max  = 2
[constants]
phi = %s
[[term]]
formula = "-exp(i*phi/2) b^+[a,j+1] b[a,j] - exp(-i*phi/2) b^+[b,j+1] b[b,j] + h.c."
[[term]]
formula = "-b^+[a,j] b[b,j] + h.c."
[[observe]]
name    = "field"
formula = "b[a,j]"
`
	e := explained(t, fmt.Sprintf(flux, "0.3"))
	assert.Equal(t, "complex", e.Arithmetic)
	assert.Contains(t, e.Loop, "loop")
	assert.Nil(t, e.Charges[0].Value, "the sector leaves it free")
	require.Len(t, e.Warnings, 1)
	assert.Contains(t, e.Warnings[0], `observation "field" changes a conserved charge (N): all its values are zero`)
	assert.Contains(t, e.Terms[0].Example, "0.988771", "numbers of an example are short")
	assert.Equal(t, "real", explained(t, fmt.Sprintf(flux, `"pi"`)).Arithmetic)
}

func TestExplainRewritten(t *testing.T) {
	const flux = `
[ladder]
rungs = 6
[[leg]]
name = "a"
site = "boson"
max = %d
[[leg]]
name = "b"
site = "boson"
max = %[1]d
[[term]]
formula = "-exp(0.3*i) b^+[a,j+1] b[a,j] - exp(-0.3*i) b^+[b,j+1] b[b,j] - b^+[a,j] b[b,j] + h.c."
[sector]
N = 3
`
	e := explained(t, fmt.Sprintf(flux, 1))
	assert.Equal(t, "real", e.Arithmetic)
	assert.Contains(t, e.Rewritten, "merged")
	assert.NotEmpty(t, e.Loop)
	assert.Len(t, e.MPOBonds, 7)
	// Sixteen states a rung cost more than complex numbers.
	e = explained(t, fmt.Sprintf(flux, 3))
	assert.Equal(t, "complex", e.Arithmetic)
	assert.Empty(t, e.Rewritten)
	assert.Len(t, e.MPOBonds, 13)
}

func TestExplainRotation(t *testing.T) {
	e := explained(t, `
[ladder]
rungs = 2
boundary = "periodic"
[[leg]]
name = "a"
site = "spin"
s = "1/2"
[[term]]
formula = "-S^z[a,j] S^z[a,j+1] - 0.4*S^x[a,j]"
`)
	assert.Equal(t, map[string]string{"a": "S^x is diagonal"}, e.Rotations)
	assert.Equal(t, []string{"a"}, e.RotatedLegs())
	assert.NotEmpty(t, e.Warnings, "a ring of two rungs counts each pair twice")
}

func TestCell(t *testing.T) {
	const ladder = `
[ladder]
rungs    = 6
boundary = "%s"
[[leg]]
name = "a"
site = "spin"
s = 1
[[leg]]
name = "b"
site = "spin"
s = 1
[[term]]
formula = "%s"
`
	for _, c := range []struct {
		name, boundary, formula string
		want                    []Link
	}{
		{"rungs", "open", "S^z[a,j] S^z[b,j]", []Link{{"a", "b", 0}}},
		{"one diagonal", "open", "S^z[b,j+1] S^z[a,j]", []Link{{"a", "b", 1}}},
		{"the other diagonal", "open", "S^z[b,j] S^z[a,j+1]", []Link{{"b", "a", 1}}},
		{"ring", "periodic", "S^z[a,j] S^z[a,j+1]", []Link{{"a", "a", 1}}},
		{"ring, long", "periodic", "S^z[a,j] S^z[a,j+2]", []Link{{"a", "a", 2}}},
		{"ring, diagonal", "periodic", "S^z[a,j] S^z[b,j+1]", []Link{{"a", "b", 1}}},
		{"plaquette", "open", "S^z[a,j] S^z[a,j+1] S^z[b,j] S^z[b,j+1]", []Link{{"a", "b", 0}, {"a", "a", 1}, {"a", "b", 1}, {"b", "a", 1}, {"b", "b", 1}}},
		{"single sites", "open", "S^z[a,j]^2", nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			assert.Equal(t, c.want, explained(t, fmt.Sprintf(ladder, c.boundary, c.formula)).Cell.Links)
		})
	}
}

// TestForecast: costs grow as they must, complex numbers cost more, and the cap of the model is the last bond dimension.
func TestForecast(t *testing.T) {
	const spins = `
[ladder]
rungs = 40
[[leg]]
name = "a"
site = "spin"
s = "1/2"
[[term]]
formula = "%s"
[solve]
bond = 700
`
	forecastOf := func(formula string) []Forecast { return explained(t, fmt.Sprintf(spins, formula)).Forecast }
	plain := forecastOf("S[a,j].S[a,j+1]")
	var bonds []int
	for i, f := range plain {
		bonds = append(bonds, f.Bond)
		if i > 0 {
			ratio := float64(f.Bond) / float64(plain[i-1].Bond)
			assert.Greater(t, f.Memory/plain[i-1].Memory, 0.5*ratio*ratio)
			assert.Greater(t, f.Flops/plain[i-1].Flops, 0.3*ratio*ratio*ratio)
			assert.Less(t, f.Flops/plain[i-1].Flops, 1.2*ratio*ratio*ratio)
		}
	}
	assert.Equal(t, []int{100, 300, 700}, bonds)
	chiral := forecastOf("0.5*(exp(0.3i) S^+[a,j] S^-[a,j+1] + exp(0.7i) S^+[a,j] S^-[a,j+2] + h.c.) + S^z[a,j] S^z[a,j+1]")
	assert.Greater(t, chiral[1].Memory, 2*plain[1].Memory)
	assert.Greater(t, chiral[1].Flops, 4*plain[1].Flops)
	// Dense blocks, without charges: state and environments of D operator states are L (2 + D) chi^2 numbers, about.
	field := forecastOf("S[a,j].S[a,j+1] + 0.3*S^x[a,j] + 0.2*S^z[a,j]")
	// The bonds of eight sites at each end are narrower.
	full := 40 * 300 * 300 * 8 * (2.0 + 5)
	assert.InEpsilon(t, full, field[1].Memory, 0.45)
	assert.InEpsilon(t, 40*300*300*8*2.0, field[1].State, 0.45)
	assert.Equal(t, field[1].Memory, field[1].State+field[1].Environments)
}

func TestExplainUnreachable(t *testing.T) {
	m := parse(t, fmt.Sprintf(hopping, 8, 4, 1e-8))
	m.Sector["N"] = 99
	_, err := Explain(m)
	assert.True(t, isRefusal(err))
}

// TestExplainExamples explains the bundled models.
func TestExplainExamples(t *testing.T) {
	for _, name := range []string{"frustrated-ladder", "rhombic-chain", "vortex-ladder"} {
		m, err := modelfile.Load("../../examples/" + name + "/model.toml")
		require.NoError(t, err)
		e, err := Explain(m)
		require.NoError(t, err)
		assert.Empty(t, e.Warnings)
		assert.Equal(t, name == "vortex-ladder", e.Arithmetic == "complex")
		assert.Len(t, e.Observations, len(m.Observe))
		assert.False(t, strings.HasSuffix(e.Terms[0].Example, "..."), e.Terms[0].Example)
	}
}
