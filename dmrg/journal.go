package dmrg

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
)

// ErrDeparted is the error of a search that is to go on from a Waypoint of another schedule: other options, or another version of
// the program.
var ErrDeparted = errors.New("dmrg: the search is not the one that the waypoint was saved in")

// journal lists what the schedule of a search has learnt from its state, in order: the outcome of every sweep, and each look at the
// state that decided something. The schedule is a function of that and of nothing else, so a search that goes on runs it from
// the beginning with the answers of the journal, and touches the state only after the last of them.
type journal struct {
	past []entry
	next int   // of past to be read again; len(past): the search is live
	err  error // ErrDeparted, once a question was another than before
}

// entry is one question that the schedule asked and what it learnt.
type entry struct {
	Kind   string          `json:"kind"`
	Asked  json.RawMessage `json:"asked"`
	Learnt json.RawMessage `json:"learnt"`
}

// The kinds of entries after which the state may be another.
const (
	kindSweep  = "sweep"  // the outcome of a sweep
	kindProbe  = "probe"  // what another start led to
	kindAssist = "assist" // what helped a slow search
)

// moves reports whether the state may be another after an entry.
func (e entry) moves() bool {
	return e.Kind == kindSweep || e.Kind == kindProbe || e.Kind == kindAssist
}

// live reports whether all that was learnt before has been read again.
func (j *journal) live() bool { return j.next == len(j.past) }

// sweeps counts the whole sweeps.
func (j *journal) sweeps() (n int) {
	for _, e := range j.past {
		if e.Kind == kindSweep {
			n++
		}
	}
	return n
}

// settled returns the entries up to the last after which the state may be another: what came after is asked again at no cost, perhaps with another answer.
func (j *journal) settled() []entry {
	n := len(j.past)
	for n > 0 && !j.past[n-1].moves() {
		n--
	}
	return j.past[:n]
}

// learn takes the answer to a question from the journal, or finds it and writes it down. An error of find is not written: the question
// stays open.
func learn[Q, A any](j *journal, kind string, asked Q, find func() (A, error)) (learnt A, err error) {
	question, err := json.Marshal(asked)
	if err != nil {
		return learnt, err
	}
	if j.err != nil {
		return learnt, j.err
	}
	if !j.live() {
		e := j.past[j.next]
		if e.Kind != kind || !bytes.Equal(e.Asked, question) {
			j.err = fmt.Errorf("%w: there step %d was the %s %s, here it is the %s %s", ErrDeparted, j.next, e.Kind, e.Asked, kind, question)
			return learnt, j.err
		}
		if err := json.Unmarshal(e.Learnt, &learnt); err != nil {
			return learnt, fmt.Errorf("dmrg: step %d of the waypoint's journal is damaged: %w", j.next, err)
		}
		j.next++
		return learnt, nil
	}
	if learnt, err = find(); err != nil {
		return learnt, err
	}
	answer, err := json.Marshal(learnt)
	if err != nil {
		return learnt, fmt.Errorf("dmrg: %s: %w; look for couplings whose products overflow", kind, err)
	}
	j.past = append(j.past, entry{kind, question, answer})
	j.next++
	return learnt, nil
}

// look learns a number about the state. A journal that departs is reported by the next sweep.
func (j *journal) look(what string, find func() int) int {
	n, err := learn(j, what, struct{}{}, func() (int, error) { return find(), nil })
	if err != nil {
		return find()
	}
	return n
}
