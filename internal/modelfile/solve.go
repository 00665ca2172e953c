package modelfile

import (
	"errors"
	"math"
	"strconv"
	"strings"

	"rundle/mpo/ladder"
	"rundle/mpo/ladder/formula"
)

// readSolve reads [solve].
func (r *reader) readSolve() {
	s := r.single("solve")
	v := &r.model.Solve
	v.Precision, _ = s.positive(s.lookup("precision"))
	v.ObservablePrecision, _ = s.positive(s.lookup("observable_precision"))
	v.States = s.counted("states", 1, 1000)
	v.Bond = s.counted("bond", 1, 1<<20)
	v.Sweeps = s.counted("sweeps", 1, 1_000_000)
	seed, _ := s.whole(s.lookup("seed"), 0, math.MaxInt64)
	v.Seed = uint64(seed)
	v.Time = quantity(s, "time", "\"2h30m\"", Duration)
	v.Memory = quantity(s, "memory", "\"8 GiB\"", Size)
	if e := s.lookup("charges"); e != nil {
		v.Charges, _ = s.words(e)
	}
	s.done()
}

func (s *section) counted(key string, least, most int64) int {
	n, _ := s.whole(s.lookup(key), least, most)
	return int(n)
}

// quantity reads a string with a unit.
func quantity[T any](s *section, key, example string, read func(string) (T, error)) (x T) {
	e := s.lookup(key)
	if e == nil {
		return x
	}
	if e.value.kind != text {
		s.wrong(e, "a string with a unit, such as "+example)
		return x
	}
	x, err := read(e.value.text)
	if err != nil {
		s.fault(e.value.at, "", "%s", err.Error())
	}
	return x
}

// readSector reads [sector]: what the names mean is checked when the charges are known.
func (r *reader) readSector() {
	s := r.single("sector")
	r.model.Sector = ladder.Sector{}
	for _, e := range s.table.entries {
		switch v := e.value; v.kind {
		case integer:
			if v.integer != int64(int32(v.integer)) {
				r.fault(v.at, "", "%s = %s in [sector] is out of range", e.key, v.text)
			}
			r.model.Sector[e.key] = int(v.integer)
		case float:
			if r.finite(v, e.key) {
				r.model.Sector[e.key] = v.float
			}
		case text:
			if r.syntax(v, formula.Parse) {
				r.model.Sector[e.key] = v.text
			}
		default:
			s.wrong(e, "a number, a string such as \"1/2\" or a formula such as \"rungs\"")
		}
	}
}

// checkSector finds the charges and checks that the ladder can hold the sector.
func (r *reader) checkSector() {
	solve, sector := r.single("solve"), r.single("sector")
	frames, err := r.model.Hamiltonian.Frames(ladder.FrameOptions{Charges: r.model.Solve.Charges})
	if err != nil {
		at := solve.at
		if e := solve.table.byKey["charges"]; e != nil {
			at = e.value.at
			for _, item := range e.value.items {
				if mentions(err, strconv.Quote(item.text)) {
					at = item.at
					break
				}
			}
		}
		r.blame(err, at, solve.values()...)
		return
	}
	r.model.Frames = frames
	if _, err := frames.Target(r.model.Sector); err != nil {
		at := sector.at
		for _, e := range sector.table.entries {
			if mentions(err, strconv.Quote(e.key)) {
				at = e.at
				break
			}
			if mentions(err, " "+e.key+" = ") {
				at = e.value.at
				break
			}
		}
		r.blame(err, at, sector.values()...)
	}
}

// mentions reports whether an error's message, hints aside, holds the words.
func mentions(err error, words string) bool {
	msg := err.Error()
	var l *ladder.Error
	if errors.As(err, &l) {
		msg = l.Msg
	}
	return strings.Contains(msg, words)
}
