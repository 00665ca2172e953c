package runfolder

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

// sample fills every field, so that the schema's every property occurs.
func sample() *Result {
	top, variance, flops := 0.0, 2e-10, 1e12
	gap, gapError := 0.25, 2e-9
	return &Result{
		Format: ResultFormat,
		Model: Model{
			Title: "Vortices & <b^+ b>", Hash: "4f2a", Sites: 8,
			Charges:    []Charge{{Name: "N", Meaning: "particles"}, {Name: "P", Modulus: 2}},
			Arithmetic: Complex, MPOBonds: []int{4, 6, 4},
		},
		States: []State{{
			Sector: Numbers{"N": 4, "Sz": -0.5}, Index: 0, Multiplet: 1,
			Energy: -3.25, EnergyLimit: -3.2501, EnergyError: 1e-9, Gap: &gap, GapError: &gapError, Variance: &variance, DiscardedWeight: 1e-12,
			LargestBond: 40, TopOccupation: &top, Sweeps: 7, Verdict: Suspect, Reason: "boson cutoff", Seconds: 0.5,
			Observations: map[string][]Observation{
				"density": {{At: At{"j": 3, "l": "a"}, Value: Number(0.46), Error: 1e-9}},
				"phase":   {{At: At{"j": 3}, Value: Pair(complex(0.5, 0)), Error: 0}},
				"total":   {{Value: Number(4)}},
			},
			Entanglement: &Entanglement{Cuts: []Cut{{
				AfterSite: 1, RungEdge: true, Entropy: 0.7, EntropyError: 1e-6, Renyi2: 0.6,
				Spectrum: []Level{{Xi: 0.2, Charge: Numbers{"N": 2}}},
			}}},
		}},
		Multiplets: []Multiplet{{First: 0, Count: 1, Energy: -3.25, EnergyError: 1e-9, Splitting: 1e-10, SplittingBound: 2e-9,
			Observations: map[string][]Observation{"density": {{At: At{"j": 3}, Value: Number(0.46), Error: 1e-9}}}}},
		Resources: Resources{1.5, 2.5, 1 << 30, &flops, 2, "go", "0.1.0"},
	}
}

func encode(t *testing.T, r *Result) []byte {
	t.Helper()
	text, err := EncodeResult(r)
	require.NoError(t, err)
	return text
}

func TestRoundTrip(t *testing.T) {
	text := encode(t, sample())
	require.NoError(t, Validate(text))
	back, err := DecodeResult(text, "result.json")
	require.NoError(t, err)
	want := sample()
	want.States[0].Observations["total"][0].At = At{}
	assert.Equal(t, want, back)
	assert.Contains(t, string(text), `"title": "Vortices & <b^+ b>"`)
	assert.Contains(t, string(text), `"top_occupation": 0`)
	assert.False(t, back.Converged())
	back.States[0].Verdict = Converged
	assert.True(t, back.Converged())
}

// TestEmptyLists: an almost empty result has lists, not nulls, and encoding
// changes nothing in it.
func TestEmptyLists(t *testing.T) {
	r := &Result{
		Model:     Model{Hash: "1", Sites: 1, Arithmetic: Real},
		States:    []State{{LargestBond: 1, Verdict: Converged, Entanglement: &Entanglement{Cuts: []Cut{{Spectrum: []Level{{}}}}}}},
		Resources: Resources{Threads: 1},
	}
	text := encode(t, r)
	require.NoError(t, Validate(text))
	assert.NotContains(t, string(text), "null")
	assert.NotContains(t, string(text), "top_occupation")
	assert.Nil(t, r.States[0].Sector)
	assert.Nil(t, r.States[0].Entanglement.Cuts[0].Spectrum[0].Charge)
	assert.Empty(t, r.Format)
}

// TestSchemaCoversTypes: every property of the schema occurs in the sample,
// and every field of the types in the schema (as additionalProperties is
// false, TestRoundTrip shows the latter).
func TestSchemaCoversTypes(t *testing.T) {
	var schema, document map[string]any
	require.NoError(t, json.Unmarshal(Schema(), &schema))
	require.NoError(t, json.Unmarshal(encode(t, sample()), &document))
	defs := schema["$defs"].(map[string]any)
	seen := 0
	var walk func(place string, rules map[string]any, value any)
	walk = func(place string, rules map[string]any, value any) {
		if ref, ok := rules["$ref"].(string); ok {
			rules = defs[strings.TrimPrefix(ref, "#/$defs/")].(map[string]any)
		}
		if items, ok := rules["items"].(map[string]any); ok && rules["oneOf"] == nil {
			require.NotEmpty(t, value, place)
			walk(place+"[0]", items, value.([]any)[0])
		}
		properties, _ := rules["properties"].(map[string]any)
		for name, rule := range properties {
			x, ok := value.(map[string]any)[name]
			assert.True(t, ok, "%s.%s is in the schema only", place, name)
			seen++
			walk(place+"."+name, rule.(map[string]any), x)
		}
		if more, ok := rules["additionalProperties"].(map[string]any); ok {
			for name, x := range value.(map[string]any) {
				walk(place+"."+name, more, x)
			}
		}
	}
	walk("", schema, document)
	assert.Greater(t, seen, 40)
	var verdicts []any
	for _, v := range Verdicts() {
		verdicts = append(verdicts, string(v))
	}
	state := defs["state"].(map[string]any)["properties"].(map[string]any)
	assert.Equal(t, verdicts, state["verdict"].(map[string]any)["enum"])
}

func TestValidateRefuses(t *testing.T) {
	for _, row := range []struct {
		name, from, to, want string
	}{
		{"format", `"rundle-result/1"`, `"rundle-result/9"`, `format is "rundle-result/9": want "rundle-result/1"`},
		{"lacks", `"sites": 8,`, ``, `model lacks "sites"`},
		{"unknown", `"sites": 8,`, `"sites": 8, "spin": 1,`, `model has an unknown "spin"`},
		{"fraction", `"sites": 8`, `"sites": 8.5`, `model.sites is 8.5: want "integer"`},
		{"small", `"sites": 8`, `"sites": 0`, `model.sites is 0: want at least 1`},
		{"string", `-3.25,`, `"low",`, `states[0].energy is "low": want "number"`},
		{"verdict", `"suspect"`, `"fine"`, `states[0].verdict is "fine": want one of ["converged"`},
		{"empty name", `"name": "N"`, `"name": ""`, `model.charges[0].name is "": want at least 1 characters`},
		{"boolean", `"rung_edge": true`, `"rung_edge": 1`, `states[0].entanglement.cuts[0].rung_edge is 1: want "boolean"`},
		{"sector", `"N": 4`, `"N": null`, `states[0].sector["N"] is null: want "number"`},
		{"value", `"value": 0.46`, `"value": "0.46"`, `states[0].observations["density"][0].value is "0.46", which fits 0 of 2 choices`},
		{"index", `"l": "a"`, `"l": 0.5`, `want ["integer","string"]`},
		{"negative error", `"error": 1e-9`, `"error": -1`, `is -1: want at least 0`},
		{"cut off", `"version": "0.1.0"`, ``, "no JSON"},
	} {
		t.Run(row.name, func(t *testing.T) {
			text := string(encode(t, sample()))
			require.Contains(t, text, row.from)
			assert.ErrorContains(t, Validate([]byte(strings.Replace(text, row.from, row.to, 1))), row.want)
		})
	}
	assert.ErrorContains(t, Validate([]byte("[]")), "want \"object\"")
	assert.ErrorContains(t, Validate(append(encode(t, sample()), "{}"...)), "text after the document")
	three := strings.Replace(string(encode(t, sample())), `"value": 0.46`, `"value": [1, 2, 3]`, 1)
	assert.ErrorContains(t, Validate([]byte(three)), "maxItems is 2")
	v := validator{}
	assert.ErrorContains(t, v.check("", map[string]any{"pattern": "x"}, "y"), `keyword "pattern"`)
	assert.ErrorContains(t, v.check("", map[string]any{"$ref": "#/$defs/none"}, "y"), `refers to "#/$defs/none"`)
}

func FuzzDecodeResult(f *testing.F) {
	text, err := EncodeResult(sample())
	require.NoError(f, err)
	f.Add(text)
	f.Add([]byte(`{"format":"rundle-result/1","model":[]}`))
	f.Fuzz(func(t *testing.T, text []byte) {
		r, err := DecodeResult(text, "result.json")
		if err != nil {
			return
		}
		again, err := EncodeResult(r)
		if err != nil {
			t.Fatalf("read, but not written: %v", err)
		}
		if err := Validate(again); err != nil {
			t.Fatal(err)
		}
	})
}

func TestNotFinite(t *testing.T) {
	nan := math.NaN()
	for _, row := range []struct {
		field string
		spoil func(r *Result)
	}{
		{"states[0].energy", func(r *Result) { r.States[0].Energy = nan }},
		{"states[0].top_occupation", func(r *Result) { *r.States[0].TopOccupation = nan }},
		{`states[0].sector["Sz"]`, func(r *Result) { r.States[0].Sector["Sz"] = math.Inf(1) }},
		{`states[0].observations["density"][0].value[0]`, func(r *Result) { r.States[0].Observations["density"][0].Value.Re = nan }},
		{`states[0].observations["phase"][0].value[1]`, func(r *Result) { r.States[0].Observations["phase"][0].Value.Im = nan }},
		{"states[0].entanglement.cuts[0].spectrum[0].xi", func(r *Result) { r.States[0].Entanglement.Cuts[0].Spectrum[0].Xi = math.Inf(-1) }},
		{"resources.gemm_flops", func(r *Result) { *r.Resources.GemmFlops = nan }},
	} {
		t.Run(row.field, func(t *testing.T) {
			r := sample()
			row.spoil(r)
			_, err := EncodeResult(r)
			var e *NotFiniteError
			require.ErrorAs(t, err, &e)
			assert.Equal(t, row.field, e.Field)
		})
	}
}

// TestWalkSeesEveryFloat: no number of the types hides from checkFinite.
func TestWalkSeesEveryFloat(t *testing.T) {
	var kinds func(typ reflect.Type) bool
	kinds = func(typ reflect.Type) bool {
		switch typ.Kind() {
		case reflect.Float32, reflect.Complex64, reflect.Complex128, reflect.Chan, reflect.Func:
			return false
		case reflect.Pointer, reflect.Slice, reflect.Map:
			return kinds(typ.Elem())
		case reflect.Struct:
			for i := range typ.NumField() {
				if !kinds(typ.Field(i).Type) {
					return false
				}
			}
		}
		return true
	}
	assert.True(t, kinds(reflect.TypeFor[Result]()))
	assert.True(t, kinds(reflect.TypeFor[Sweep]()))
}

func TestAt(t *testing.T) {
	_, err := json.Marshal(At{"j": 1.5})
	assert.ErrorContains(t, err, `index "j" is a float64`)
	for _, text := range []string{`{"j": 1.5}`, `{"j": [1]}`, `{"j": 99999999999999999999}`, `7`} {
		var a At
		assert.Error(t, json.Unmarshal([]byte(text), &a), text)
	}
	for _, text := range []string{`[1]`, `[1,2,3]`, `["x",2]`, `"x"`} {
		var v Value
		assert.Error(t, json.Unmarshal([]byte(text), &v), text)
	}
}

func TestReadResult(t *testing.T) {
	dir := t.TempDir()
	_, err := ReadResult(dir)
	assert.ErrorContains(t, err, "has no result.json")
	for _, row := range []struct{ text, want string }{
		{"\x00\x01", "is damaged"},
		{`{"format": "other/3"}`, `has the format "other/3": this program reads "rundle-result/1"`},
		{`{"format": "rundle-result/1"}`, `the document lacks "model"`},
	} {
		require.NoError(t, os.WriteFile(filepath.Join(dir, ResultFile), []byte(row.text), 0o600))
		_, err := ReadResult(dir)
		assert.ErrorContains(t, err, row.want)
		assert.ErrorContains(t, err, filepath.Join(dir, ResultFile))
	}
}
