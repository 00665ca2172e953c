package runfolder

import (
	"bytes"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
)

// WriteResult writes result.json, after the states: a folder with results is
// finished. Numbers that are not finite are a [*NotFiniteError].
func (f *Folder) WriteResult(r *Result) error {
	text, err := EncodeResult(r)
	if err != nil {
		return fmt.Errorf("%s: %w", f.path(ResultFile), err)
	}
	if err := write(f.path(ResultFile), text); err != nil {
		return unusable(f.dir, err)
	}
	return nil
}

// EncodeResult returns the text of result.json, with the format's name set.
func EncodeResult(r *Result) ([]byte, error) {
	whole := *r
	whole.Format = ResultFormat
	if err := checkFinite(&whole); err != nil {
		return nil, err
	}
	fill(&whole)
	var text bytes.Buffer
	e := json.NewEncoder(&text)
	e.SetEscapeHTML(false) // formulas and titles stay readable
	e.SetIndent("", " ")
	if err := e.Encode(&whole); err != nil {
		return nil, err
	}
	return text.Bytes(), nil
}

// fill puts empty lists where nil would be written as null. It copies what it
// changes.
func fill(r *Result) {
	r.Model.Charges = list(r.Model.Charges)
	r.Model.MPOBonds = list(r.Model.MPOBonds)
	states := append([]State{}, r.States...)
	for i := range states {
		s := &states[i]
		if s.Sector == nil {
			s.Sector = Numbers{}
		}
		observations := make(map[string][]Observation, len(s.Observations))
		for name, values := range s.Observations {
			observations[name] = list(values)
		}
		s.Observations = observations
		if s.Entanglement == nil {
			continue
		}
		cuts := append([]Cut{}, s.Entanglement.Cuts...)
		for c := range cuts {
			levels := append([]Level{}, cuts[c].Spectrum...)
			for l := range levels {
				if levels[l].Charge == nil {
					levels[l].Charge = Numbers{}
				}
			}
			cuts[c].Spectrum = levels
		}
		s.Entanglement = &Entanglement{Cuts: cuts}
	}
	r.States = states
}

func list[T any](values []T) []T {
	if values == nil {
		return []T{}
	}
	return values
}

// ReadResult reads and checks the result.json of a run folder.
func ReadResult(dir string) (*Result, error) {
	path := filepath.Join(dir, ResultFile)
	text, err := os.ReadFile(path)
	if os.IsNotExist(err) {
		return nil, fmt.Errorf("%s has no %s: %w", dir, ResultFile, err)
	}
	if err != nil {
		return nil, err
	}
	return DecodeResult(text, path)
}

// DecodeResult reads and checks the text of a result.json; the name serves
// messages.
func DecodeResult(text []byte, name string) (*Result, error) {
	var head struct {
		Format string `json:"format"`
	}
	if err := json.Unmarshal(text, &head); err != nil {
		return nil, fmt.Errorf("%s is damaged: %w", name, err)
	}
	if head.Format != ResultFormat {
		return nil, fmt.Errorf("%s has the format %q: this program reads %q", name, head.Format, ResultFormat)
	}
	if err := Validate(text); err != nil {
		return nil, fmt.Errorf("%s is damaged: %w", name, err)
	}
	var r Result
	if err := json.Unmarshal(text, &r); err != nil {
		return nil, fmt.Errorf("%s is damaged: %w", name, err)
	}
	return &r, nil
}

// ReadModel returns the model file of a run folder.
func ReadModel(dir string) ([]byte, error) {
	text, err := os.ReadFile(filepath.Join(dir, ModelFile))
	if os.IsNotExist(err) {
		return nil, fmt.Errorf("%s is no run folder: it has no %s", dir, ModelFile)
	}
	return text, err
}
