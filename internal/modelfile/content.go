package modelfile

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// fact is a line of a model's content.
type fact struct{ key, value string }

// contentVersion changes when a model of the same content would give another result.
const contentVersion = "rundle-model/1"

// Content lists all that determines a result, a line each, in an order of its own: the text that Hash is the SHA-256 of.
func (m *Model) Content() string {
	var b strings.Builder
	for _, f := range m.content {
		fmt.Fprintf(&b, "%s = %s\n", f.key, f.value)
	}
	return b.String()
}

// Difference names the first thing in which two models differ, "" if none: "constant U: 4, now 5".
func Difference(before, now *Model) string {
	old := map[string]string{}
	for _, f := range before.content {
		old[f.key] = f.value
	}
	for _, f := range now.content {
		was, ok := old[f.key]
		switch {
		case !ok:
			return fmt.Sprintf("%s: absent before, now %s", f.key, f.value)
		case was != f.value:
			return fmt.Sprintf("%s: %s, now %s", f.key, was, f.value)
		}
		delete(old, f.key)
	}
	for _, f := range before.content {
		if _, gone := old[f.key]; gone {
			return fmt.Sprintf("%s: %s, now absent", f.key, f.value)
		}
	}
	return ""
}

// describe fills in content and Hash.
func (r *reader) describe() {
	m := r.model
	add := func(key string, value string) { m.content = append(m.content, fact{key, value}) }
	add("format", contentVersion)
	add("rungs", strconv.Itoa(m.Ladder.Rungs()))
	add("boundary", m.Ladder.Boundary().String())
	add("across", m.Ladder.AcrossBoundary().String())
	for k, name := range m.Ladder.Legs() {
		site, _ := m.Ladder.LegSite(name)
		add(fmt.Sprintf("leg %d", k+1), fmt.Sprintf("%q, %s, rungs %s", name, site, occupied(m.Ladder, name)))
	}
	for _, name := range sortedKeys(r.constants) {
		add("constant "+name, numeral(r.constants[name]))
	}
	profiles := slices.Clone(r.profiles)
	slices.SortFunc(profiles, func(a, b ladder.Profile) int { return strings.Compare(a.Name, b.Name) })
	for _, p := range profiles {
		add("profile "+p.Name, describeProfile(p))
	}
	for k, t := range r.terms {
		add(fmt.Sprintf("term %d", k+1), describeTerm(t.term))
	}
	for _, name := range sortedKeys(m.Sector) {
		add("sector "+name, describeCharge(m.Sector[name]))
	}
	m.Solve.describe(add)
	for _, o := range m.Observe {
		add(fmt.Sprintf("observe %q", o.Name), o.describe())
	}
	sum := sha256.Sum256([]byte(m.Content()))
	m.Hash = hex.EncodeToString(sum[:])
}

func numeral(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

func sortedKeys[V any](m map[string]V) []string {
	var keys []string
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}

// occupied lists the rungs of a leg as ranges.
func occupied(l *ladder.Ladder, leg string) string {
	var spans []string
	for r := 0; r < l.Rungs(); r++ {
		if _, ok := l.SiteIndex(leg, r); !ok {
			continue
		}
		from := r
		for r+1 < l.Rungs() {
			if _, ok := l.SiteIndex(leg, r+1); !ok {
				break
			}
			r++
		}
		spans = append(spans, fmt.Sprintf("%d..%d", from, r))
	}
	return strings.Join(spans, " ")
}

func describeProfile(p ladder.Profile) string {
	if p.Formula != "" {
		return fmt.Sprintf("%s, seed %d", printed(p.Formula, formula.Parse), p.Seed)
	}
	var s []string
	for _, x := range p.Values {
		s = append(s, numeral(x))
	}
	return "[" + strings.Join(s, " ") + "]"
}

// printed is a formula as the printer writes it.
func printed(src string, parse func(string) (formula.Node, error)) string {
	n, err := parse(src)
	if err != nil {
		return src
	}
	return formula.Print(n)
}

func describeTerm(t ladder.Term) string {
	s := printed(t.Formula, formula.Parse)
	for _, index := range sortedKeys(t.Each) {
		s += fmt.Sprintf(", each %s in %v", index, t.Each[index])
	}
	if t.Where != "" {
		s += ", where " + printed(t.Where, formula.ParseCondition)
	}
	return s
}

func describeCharge(v any) string {
	switch v := v.(type) {
	case float64:
		return numeral(v)
	case string:
		return printed(v, formula.Parse)
	}
	return fmt.Sprint(v)
}

// describe lists the settings that the file gives; time and memory are left out.
func (s Solve) describe(add func(key, value string)) {
	for _, x := range []struct {
		key   string
		value float64
	}{{"precision", s.Precision}, {"observable_precision", s.ObservablePrecision}, {"states", float64(s.States)}, {"bond", float64(s.Bond)}, {"sweeps", float64(s.Sweeps)}} {
		if x.value != 0 {
			add(x.key, numeral(x.value))
		}
	}
	if s.Seed != 0 {
		add("seed", strconv.FormatUint(s.Seed, 10))
	}
	if len(s.Charges) > 0 {
		add("charges", strings.Join(s.Charges, " "))
	}
}

func (o Observation) describe() string {
	s := string(o.Kind)
	switch o.Kind {
	case Values:
		s += ": " + describeTerm(o.Term)
	case Correlations:
		s += fmt.Sprintf(": %s; %s; connected %v", describeTerm(o.Term), describeTerm(o.Second), o.Connected)
	case Entanglement:
		s += ": spectrum to " + numeral(o.SpectrumTo)
	}
	return s
}
