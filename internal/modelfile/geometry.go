package modelfile

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"rundle/mpo/ladder"
)

// leg is a [[leg]] section that made sense so far.
type leg struct {
	*section
	name string
	part ladder.Part
}

// maxLegs bounds the legs of a file: the search for conserved charges works with a number of particles on each.
const maxLegs = 256

// readLadder reads [ladder] and [[leg]].
func (r *reader) readLadder() {
	s := r.single("ladder")
	if r.lookup("ladder") == nil {
		r.fault(0, "add [ladder] with rungs = 16", "section [ladder] is missing")
		return
	}
	rungs, sound := s.whole(s.need("rungs", "rungs = 16"), 1, ladder.MaxRungs)
	boundary := s.boundary("boundary")
	across := s.boundary("across")
	s.done()

	legs, good := r.readLegs(int(rungs), sound)
	if !sound || !good {
		return
	}
	if len(legs)*int(rungs) > ladder.MaxSites {
		r.fault(s.table.byKey["rungs"].value.at, fmt.Sprintf("at most %d", ladder.MaxSites), "%d rungs with %d legs are %d sites", rungs, len(legs), len(legs)*int(rungs))
		return
	}
	// Each leg alone first: an error then belongs to that leg.
	parts := []ladder.Part{ladder.Across(across)}
	for _, l := range legs {
		if _, err := ladder.New(int(rungs), ladder.Open, l.part); err != nil {
			at := l.table.byKey["name"].value.at
			if e := l.table.byKey["rungs"]; e != nil && strings.Contains(err.Error(), "rung") {
				at = e.value.at
			}
			r.blame(err, at, l.values()...)
			good = false
		}
		parts = append(parts, l.part)
	}
	if !good {
		return
	}
	lad, err := ladder.New(int(rungs), boundary, parts...)
	if err != nil {
		r.blame(err, s.at)
		return
	}
	r.model.Ladder = lad
}

func (s *section) boundary(key string) ladder.Boundary {
	if b, _ := s.choice(s.lookup(key), "open", "periodic"); b == "periodic" {
		return ladder.Periodic
	}
	return ladder.Open
}

// values lists all values of a section, where a fault in a formula may belong.
func (s *section) values() []*value {
	var all []*value
	for _, e := range s.table.entries {
		all = append(all, e.value)
		all = append(all, e.value.items...)
		if e.value.table != nil {
			for _, f := range e.value.table.entries {
				all = append(all, f.value)
				all = append(all, f.value.items...)
			}
		}
	}
	return all
}

// readLegs reads the [[leg]] sections; rungs bounds their lists if it is known.
func (r *reader) readLegs(rungs int, known bool) (legs []leg, good bool) {
	all := r.several("leg")
	if len(all) == 0 {
		if r.table.byKey["leg"] == nil {
			r.fault(0, "add [[leg]] with name = \"a\" and site = \"fermion\"", "no [[leg]] section")
		}
		return nil, false
	}
	if len(all) > maxLegs {
		r.fault(all[maxLegs].at, "", "%d legs; expected at most %d", len(all), maxLegs)
		return nil, false
	}
	good = true
	first := map[string]*entry{}
	for _, s := range all {
		e := s.need("name", "name = \"a\"")
		name, named := s.text(e)
		if named {
			if before := first[name]; before != nil {
				r.repeated(e.value, "leg", name, before.value)
				named = false
			} else {
				first[name] = e
			}
			s.name = fmt.Sprintf("[[leg]] %q", name)
			r.known = append(r.known, name)
		}
		site, placed := s.site()
		options, ranged := s.rungs(rungs, known)
		s.done()
		good = good && named && placed && ranged
		legs = append(legs, leg{section: s, name: name, part: ladder.Leg(name, site, options...)})
	}
	return legs, good
}

func (s *source) repeated(v *value, what, name string, before *value) {
	s.fault(v.at, "give each "+what+" its own name", "%s %q for the second time, first in line %d", what, name, s.place(before.at, "", "").Line)
}

// site reads the kind of site with the keys that belong to it.
func (s *section) site() (site ladder.Site, ok bool) {
	e := s.need("site", "site = \"fermion\", \"boson\", \"spin\" or \"clock\"")
	kind, ok := s.choice(e, "fermion", "boson", "spin", "clock")
	extra := map[string]*entry{}
	for _, key := range []string{"spin", "double", "max", "s", "q"} {
		extra[key] = s.lookup(key)
	}
	if !ok {
		return site, false
	}
	take := func(key, example string) *entry {
		delete(extra, key)
		return s.need(key, example)
	}
	switch kind {
	case "fermion":
		site, ok = s.fermion(extra)
	case "boson":
		var n int64
		n, ok = s.whole(take("max", "max = 3, the largest occupation"), 1, ladder.MaxOccupation)
		site = ladder.Boson(int(n))
	case "spin":
		var twice int
		twice, ok = s.halves(take("s", "s = \"1/2\""), ladder.MaxTwoS)
		site = ladder.Spin(twice)
	case "clock":
		var q int64
		q, ok = s.whole(take("q", "q = 3"), 2, ladder.MaxClock)
		site = ladder.Clock(int(q))
	}
	for key, e := range extra {
		if e != nil {
			s.fault(e.at, "remove it", "key %q has no meaning for site = %q", key, kind)
			ok = false
		}
	}
	return site, ok
}

// fermion reads spin and double, which it takes out of extra.
func (s *section) fermion(extra map[string]*entry) (ladder.Site, bool) {
	spin, double := extra["spin"], extra["double"]
	delete(extra, "spin")
	if spin == nil {
		if double != nil {
			delete(extra, "double")
			s.fault(double.at, "add spin = \"1/2\" for two components, or remove it", "key \"double\" needs a fermion with two components")
			return ladder.Site{}, false
		}
		return ladder.Fermion(), true
	}
	delete(extra, "double")
	twice, ok := s.halves(spin, 2*ladder.MaxTwoS)
	if ok && twice != 1 {
		s.fault(spin.value.at, "expected spin = \"1/2\" for two components, or no such key for one", "fermions of spin %s", spin.value.text)
		ok = false
	}
	if allowed, given := s.flag(double); given {
		return ladder.Electron(ladder.Double(allowed)), ok
	}
	return ladder.Electron(), ok && double == nil
}

// halves reads "1/2", 0.5, 1, "3/2" and returns twice the value, 1 to most.
func (s *section) halves(e *entry, most int) (int, bool) {
	if e == nil {
		return 0, false
	}
	var x float64
	switch e.value.kind {
	case integer, float:
		x = 2 * e.value.float
	case text:
		top, bottom, fraction := strings.Cut(strings.TrimSpace(e.value.text), "/")
		v, err := strconv.ParseUint(strings.TrimSpace(top), 10, 16)
		x = 2 * float64(v)
		if fraction {
			x /= 2
		}
		if err != nil || fraction && strings.TrimSpace(bottom) != "2" {
			x = math.NaN()
		}
	default:
		s.wrong(e, "a spin such as \"1/2\" or 1")
		return 0, false
	}
	if x != math.Trunc(x) || !(x >= 1 && x <= float64(most)) {
		s.fault(e.value.at, fmt.Sprintf("expected \"1/2\", 1, \"3/2\", ... up to %d", most/2), "%s = %s in %s", e.key, quoted(e.value), s.label())
		return 0, false
	}
	return int(x), true
}

// quoted shows a value as the file does.
func quoted(v *value) string {
	if v.kind == text {
		return strconv.Quote(v.text)
	}
	return v.text
}

// rungs reads where a leg has sites.
func (s *section) rungs(rungs int, known bool) ([]ladder.LegOption, bool) {
	e := s.lookup("rungs")
	if e == nil {
		return nil, true
	}
	switch e.value.kind {
	case text:
		return []ladder.LegOption{ladder.OnRange(e.value.text)}, true
	case list:
	default:
		s.wrong(e, "a range such as \"0..rungs-2\" or a list of rungs")
		return nil, false
	}
	var on []int
	for _, item := range e.value.items {
		if item.kind != integer {
			s.fault(item.at, "", "key \"rungs\" in %s holds %s; expected whole numbers", s.label(), item.kind)
			return nil, false
		}
		if known && (item.integer < 0 || item.integer >= int64(rungs)) {
			s.fault(item.at, fmt.Sprintf("rungs are 0 to %d", rungs-1), "rung %d in %s is out of range", item.integer, s.label())
			return nil, false
		}
		on = append(on, int(item.integer))
	}
	return []ladder.LegOption{ladder.OnRungs(on...)}, true
}
