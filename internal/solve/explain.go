package solve

import (
	"fmt"
	"maps"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"rundle/dmrg"
	"rundle/internal/dense"
	"rundle/internal/modelfile"
	"rundle/mpo"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// ExplanationFormat names the layout of an explanation as a JSON document.
const ExplanationFormat = "rundle-check/1"

// Explanation is what a model means and what it will cost.
type Explanation struct {
	Format       string            `json:"format"`
	Title        string            `json:"title"`
	File         string            `json:"file"`
	Hash         string            `json:"hash"`
	Sites        int               `json:"sites"`
	Rungs        int               `json:"rungs"`
	Boundary     string            `json:"boundary"`
	Across       string            `json:"across"`
	Legs         []LegFacts        `json:"legs"`
	Cell         Cell              `json:"cell"`
	Terms        []TermFacts       `json:"terms"`
	Products     int               `json:"products"` // of site operators in the whole Hamiltonian, like ones merged
	Charges      []ChargeFacts     `json:"charges"`
	Undivided    bool              `json:"undivided,omitempty"` // more is conserved than the charges tell
	Arithmetic   string            `json:"arithmetic"`
	Loop         string            `json:"loop,omitempty"`      // what forbids phases that make all terms real
	Rewritten    string            `json:"rewritten,omitempty"` // in what form the search works all the same
	Rotations    map[string]string `json:"rotations,omitempty"`
	MPOBonds     []int             `json:"mpo_bonds"`
	Forecast     []Forecast        `json:"forecast"`
	Observations []ObservedFacts   `json:"observations"`
	Warnings     []string          `json:"warnings"`
}

// LegFacts describes a leg.
type LegFacts struct {
	Name  string `json:"name"`
	Site  string `json:"site"`
	Sites int    `json:"sites"`
	Dim   int    `json:"states"` // local states of a site
}

// TermFacts describes a term as expanded.
type TermFacts struct {
	Name     string `json:"name"`
	Formula  string `json:"formula"`
	Places   int    `json:"places"`
	Products int    `json:"products"` // of site operators, over all places
	At       string `json:"at"`       // the place of the example
	Example  string `json:"example"`
}

// ChargeFacts describes a conserved charge; Value is nil where the sector leaves it free.
type ChargeFacts struct {
	Name    string   `json:"name"`
	Modulus int      `json:"modulus"`
	Meaning string   `json:"meaning"`
	Value   *float64 `json:"value,omitempty"`
}

// ObservedFacts describes an observation.
type ObservedFacts struct {
	Name   string `json:"name"`
	Kind   string `json:"kind"`
	Values int    `json:"values"`
}

// Explain says what a model means: no solving, a second or less for all but giant Hamiltonians.
func Explain(m *modelfile.Model) (*Explanation, error) {
	lad := m.Ladder
	e := &Explanation{
		Format: ExplanationFormat, Title: m.Title, File: m.File, Hash: m.Hash, Sites: lad.Sites(), Rungs: lad.Rungs(),
		Boundary: lad.Boundary().String(), Across: lad.AcrossBoundary().String(), Cell: cellOf(m.Hamiltonian),
		Products: m.Hamiltonian.Poly.NumTerms(), Undivided: m.Frames.Missing, Loop: m.Frames.Loop,
		Warnings: m.Hamiltonian.Warnings(),
	}
	for _, name := range lad.Legs() {
		site, _ := lad.LegSite(name)
		e.Legs = append(e.Legs, LegFacts{Name: name, Site: site.String(), Dim: site.Dim(), Sites: sitesOf(lad, name)})
	}
	if err := e.explainTerms(m); err != nil {
		return nil, err
	}
	target, err := m.Frames.Target(m.Sector)
	if err != nil {
		return nil, refused(err)
	}
	e.explainCharges(m.Frames, target)
	e.Rotations = rotations(m)
	if err := e.explainObservations(m); err != nil {
		return nil, err
	}
	return e, e.explainOperator(m, target)
}

func sitesOf(l *ladder.Ladder, leg string) (n int) {
	for r := range l.Rungs() {
		if _, ok := l.SiteIndex(leg, r); ok {
			n++
		}
	}
	return n
}

// exampleLength is where the example of a term is cut.
const exampleLength = 120

func (e *Explanation) explainTerms(m *modelfile.Model) error {
	for _, t := range m.Hamiltonian.Terms {
		places, err := m.Scope.Places(t)
		if err != nil {
			return refused(err)
		}
		f := TermFacts{Name: t.Name, Formula: t.Formula, Places: len(places)}
		for _, p := range places {
			f.Products += p.Poly.NumTerms()
		}
		if len(places) > 0 {
			p := places[len(places)/2]
			f.At, f.Example = placeName(p.At), shortened(rounded(p.Poly.String()), exampleLength)
		}
		e.Terms = append(e.Terms, f)
	}
	return nil
}

func placeName(at []ladder.IndexValue) string {
	parts := make([]string, len(at))
	for i, v := range at {
		parts[i] = v.String()
	}
	return strings.Join(parts, ", ")
}

var longNumber = regexp.MustCompile(`[0-9]+\.[0-9]{7,}(e[-+]?[0-9]+)?`)

// rounded writes the numbers of a formula with six digits.
func rounded(s string) string {
	return longNumber.ReplaceAllStringFunc(s, func(n string) string {
		x, err := strconv.ParseFloat(n, 64)
		if err != nil {
			return n
		}
		return strconv.FormatFloat(x, 'g', 6, 64)
	})
}

func shortened(s string, length int) string {
	if r := []rune(s); len(r) > length {
		return string(r[:length-4]) + " ..."
	}
	return s
}

func (e *Explanation) explainCharges(f *ladder.Frames, t ladder.Target) {
	values := f.Values(t.Charge)
	for i, c := range f.Charges {
		facts := ChargeFacts{Name: c.Name, Modulus: c.Modulus, Meaning: c.Description}
		if v := values[c.Name]; !t.Free[i] {
			facts.Value = &v
		}
		e.Charges = append(e.Charges, facts)
	}
}

// rotations says, for each leg whose local axes the frames turn, what became diagonal.
func rotations(m *modelfile.Model) map[string]string {
	out := map[string]string{}
	for i, f := range m.Frames.Sites {
		leg, _, site := m.Ladder.SiteAt(i)
		if f.Rotation == 0 || out[leg] != "" {
			continue
		}
		switch site.Kind() {
		case ladder.KindSpin:
			out[leg] = fmt.Sprintf("S^%c is diagonal", "zxy"[f.Rotation])
		default:
			out[leg] = "X is diagonal"
		}
	}
	return out
}

func (e *Explanation) explainObservations(m *modelfile.Model) error {
	for _, o := range m.Observe {
		facts := ObservedFacts{Name: o.Name, Kind: string(o.Kind)}
		switch o.Kind {
		case modelfile.Values, modelfile.Correlations:
			places, err := m.Scope.Places(o.Term)
			if err != nil {
				return refused(err)
			}
			facts.Values = len(places)
			if o.Kind == modelfile.Values {
				e.warnVanishing(m, o, places)
				break
			}
			second, err := m.Scope.Places(o.Second)
			if err != nil {
				return refused(err)
			}
			facts.Values *= len(second)
		default:
			facts.Values = m.Ladder.Sites() - 1
		}
		e.Observations = append(e.Observations, facts)
	}
	return nil
}

// warnVanishing warns of a formula that changes a conserved charge everywhere: its expectation values are all zero.
func (e *Explanation) warnVanishing(m *modelfile.Model, o modelfile.Observation, places []ladder.Place) {
	for _, p := range places {
		parts, err := m.Frames.StringsByCharge(p.Poly)
		if err != nil {
			return
		}
		for _, s := range parts {
			if s.Charge == (block.Charge{}) {
				return
			}
		}
	}
	if len(places) > 0 {
		names := make([]string, len(m.Frames.Charges))
		for i, c := range m.Frames.Charges {
			names[i] = c.Name
		}
		e.Warnings = append(e.Warnings, fmt.Sprintf("observation %q changes a conserved charge (%s): all its values are zero; observe its square or a correlation",
			o.Name, strings.Join(names, ", ")))
	}
}

// explainOperator builds the matrix-product operator and forecasts the cost.
func (e *Explanation) explainOperator(m *modelfile.Model, t ladder.Target) error {
	a, err := dmrg.Approached(m.Hamiltonian, m.Sector, dmrg.Options{Charges: m.Solve.Charges})
	if err != nil {
		return err
	}
	totals, _ := m.Frames.Totals(t, 1)
	if len(totals) == 0 {
		return refuse("%s: no state of the ladder lies in the sector", m.File)
	}
	e.Arithmetic, e.Rewritten = "complex", a.Rewritten
	if a.Strings.Real {
		e.Arithmetic = "real"
		return explainBonds[float64](e, m, a.Strings, totals[0])
	}
	return explainBonds[complex128](e, m, a.Strings, totals[0])
}

func explainBonds[T dense.Scalar](e *Explanation, m *modelfile.Model, s *ladder.Strings, total block.Charge) error {
	op, err := mpo.Build[T](s, mpo.Options{})
	if err != nil {
		return err
	}
	e.MPOBonds = op.BondDims()
	e.Forecast, err = forecast(op, total, m.Solve.Bond)
	return err
}

// RotatedLegs lists the legs whose local axes are turned, in order of their names.
func (e *Explanation) RotatedLegs() []string { return slices.Sorted(maps.Keys(e.Rotations)) }
