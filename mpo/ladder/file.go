package ladder

import (
	"encoding/json"
	"fmt"
)

// scopeFile is a Scope as JSON.
type scopeFile struct {
	Ladder    *Ladder   `json:"ladder"`
	Constants Constants `json:"constants,omitempty"`
	Profiles  []Profile `json:"profiles,omitempty"`
}

// ladderFile is a Ladder as JSON.
type ladderFile struct {
	Rungs    int       `json:"rungs"`
	Boundary string    `json:"boundary"`
	Across   string    `json:"across"`
	Legs     []legFile `json:"legs"`
}

type legFile struct {
	Name string `json:"name"`
	Site string `json:"site"`           // a word of siteWords
	Size int    `json:"size,omitempty"` // largest occupation, 2s or q
	On   []int  `json:"on,omitempty"`   // rungs, where not all
}

const (
	wordFermion  = "fermion"
	wordElectron = "two-component fermion"
	wordSingle   = "two-component fermion without double occupation"
	wordBoson    = "boson"
	wordSpin     = "spin"
	wordClock    = "clock"
)

// MarshalJSON writes the scope so that UnmarshalJSON gives an equal one.
func (s *Scope) MarshalJSON() ([]byte, error) {
	return json.Marshal(scopeFile{s.ladder, s.constants, s.profiles})
}

// UnmarshalJSON reads what MarshalJSON wrote and checks it as NewScope does.
func (s *Scope) UnmarshalJSON(data []byte) error {
	var f scopeFile
	if err := json.Unmarshal(data, &f); err != nil {
		return err
	}
	if f.Ladder == nil || f.Ladder.rungs == 0 {
		return fmt.Errorf("a scope without a ladder")
	}
	t, err := NewScope(f.Ladder, f.Constants, f.Profiles...)
	if err != nil {
		return err
	}
	*s = *t
	return nil
}

// MarshalJSON writes the ladder so that UnmarshalJSON gives an equal one.
func (l *Ladder) MarshalJSON() ([]byte, error) {
	f := ladderFile{Rungs: l.rungs, Boundary: l.boundary.String(), Across: l.across.String()}
	for k, g := range l.legs {
		e := legFile{Name: g.name, Site: g.site.kind.String(), Size: g.site.size}
		if g.site.single {
			e.Site = wordSingle
		}
		if g.ragged {
			for r := range l.rungs {
				if l.index[k*l.rungs+r] >= 0 {
					e.On = append(e.On, r)
				}
			}
		}
		f.Legs = append(f.Legs, e)
	}
	return json.Marshal(f)
}

// UnmarshalJSON reads what MarshalJSON wrote and checks it as New does.
func (l *Ladder) UnmarshalJSON(data []byte) error {
	var f ladderFile
	if err := json.Unmarshal(data, &f); err != nil {
		return err
	}
	boundary, err := readBoundary(f.Boundary)
	if err != nil {
		return err
	}
	across, err := readBoundary(f.Across)
	if err != nil {
		return err
	}
	parts := []Part{Across(across)}
	for _, e := range f.Legs {
		site, err := e.site()
		if err != nil {
			return err
		}
		var options []LegOption
		if e.On != nil {
			options = append(options, OnRungs(e.On...))
		}
		parts = append(parts, Leg(e.Name, site, options...))
	}
	m, err := New(f.Rungs, boundary, parts...)
	if err != nil {
		return err
	}
	*l = *m
	return nil
}

func readBoundary(word string) (Boundary, error) {
	switch word {
	case "open":
		return Open, nil
	case "periodic":
		return Periodic, nil
	}
	return 0, fmt.Errorf("boundary %q; expected \"open\" or \"periodic\"", word)
}

func (e legFile) site() (Site, error) {
	switch e.Site {
	case wordFermion:
		return Fermion(), nil
	case wordElectron:
		return Electron(), nil
	case wordSingle:
		return Electron(Double(false)), nil
	case wordBoson:
		return Boson(e.Size), nil
	case wordSpin:
		return Spin(e.Size), nil
	case wordClock:
		return Clock(e.Size), nil
	}
	return Site{}, fmt.Errorf("leg %q has unknown sites %q", e.Name, e.Site)
}
