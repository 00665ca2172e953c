package dmrg

import (
	"encoding/json"
	"errors"
	"fmt"
	"time"

	"rundle/internal/dense"
	"rundle/mps"
	"rundle/mps/block"
)

// Waypoint is a search between two updates. Ground goes on from it, given the same Hamiltonian, sector and options, and ends with the same
// bits as a search that was not interrupted; threads and the caps on time and memory may differ. One that OnWaypoint gets is valid only
// during the call, that of a Result as long as its State is left alone.
type Waypoint struct {
	Sweeps int // whole ones
	Stages int // settled bond dimensions

	real    *mps.Chain[float64] // the state as the search sees it, on merged sites and in other modes perhaps; or
	complex *mps.Chain[complex128]
	journal []byte // a record
}

// By default waypoints are waypointEvery apart, or more where saving would take more than waypointShare of the time.
const (
	waypointEvery = 30 * time.Second
	waypointShare = 0.1
)

const journalFormat = "rundle-search/1"

// record is the journal of a waypoint: what the search has learnt so far, and where in a sweep it stands.
type record struct {
	Format   string   `json:"format"`
	Way      *passage `json:"way,omitempty"` // the sweep under way
	Sweeps   int      `json:"sweeps"`        // begun by the engine
	Products int      `json:"products"`
	Flops    float64  `json:"flops"`
	Growth   float64  `json:"growth"`
	Stages   int      `json:"stages"` // settled
	Past     []entry  `json:"past"`
}

// waypoint describes where the search stands.
func (s *search[T]) waypoint() (*Waypoint, error) {
	e := s.engine
	w := &Waypoint{Sweeps: s.journal.sweeps(), Stages: max(len(s.reports), s.stagesBefore)}
	r := record{journalFormat, e.way, e.sweeps, e.products, e.flops, e.growth, w.Stages, s.journal.past}
	if e.way == nil {
		r.Past = s.journal.settled()
	}
	switch c := any(e.psi).(type) {
	case *mps.Chain[float64]:
		w.real = c
	case *mps.Chain[complex128]:
		w.complex = c
	}
	var err error
	w.journal, err = json.Marshal(r)
	return w, err
}

// chainOf returns the chain of a waypoint, if it suits the problem. The search is to own it.
func chainOf[T dense.Scalar](p *problem, w *Waypoint) (*mps.Chain[T], error) {
	var own any = w.real
	if w.complex != nil {
		own = w.complex
	}
	c, ok := own.(*mps.Chain[T])
	switch {
	case !ok:
		return nil, fmt.Errorf("%w: there the arithmetic was another", ErrDeparted)
	case c.Group != p.strings.Group || c.Len() != len(p.strings.Axes):
		return nil, fmt.Errorf("%w: there %d sites and charges %v, here %d and %v", ErrDeparted, c.Len(), c.Group, len(p.strings.Axes), p.strings.Group)
	}
	for i, a := range p.strings.Axes {
		if !c.Sites[i].Axes[1].Equal(a) {
			return nil, fmt.Errorf("%w: site %d has other local states", ErrDeparted, i)
		}
	}
	return c.Clone(), nil
}

// charge is that of the chain.
func (w *Waypoint) charge() block.Charge {
	if w.complex != nil {
		return w.complex.Charge()
	}
	return w.real.Charge()
}

// pause offers a waypoint when it is time. Time decides what is saved, never what is computed.
func (s *search[T]) pause() error {
	if s.opt.OnWaypoint == nil || !s.journal.live() || time.Now().Before(s.nextPause) {
		return nil
	}
	begin := time.Now()
	w, err := s.waypoint()
	if err != nil {
		return err
	}
	s.opt.OnWaypoint(w)
	s.schedulePause(time.Since(begin))
	return nil
}

// schedulePause sets when the next waypoint is due, after one that took so long to save.
func (s *search[T]) schedulePause(took time.Duration) {
	every := s.opt.WaypointEvery
	if every == 0 {
		every = max(waypointEvery, time.Duration(float64(took)/waypointShare))
	}
	s.nextPause = time.Now().Add(every)
}

// goOn puts the search where the waypoint was saved. The chain is already the waypoint's.
func (s *search[T]) goOn(w *Waypoint) error {
	var r record
	if err := json.Unmarshal(w.journal, &r); err != nil {
		return fmt.Errorf("dmrg: the waypoint's journal is damaged: %w", err)
	}
	if r.Format != journalFormat {
		return fmt.Errorf("%w: its journal has the format %q, this program reads %q", ErrDeparted, r.Format, journalFormat)
	}
	e := s.engine
	n := e.psi.Len()
	c := e.psi.Center
	if c < 0 || r.Way != nil && !r.Way.fits(c, n) {
		return errors.New("dmrg: the waypoint's state has its centre elsewhere than the search; use an earlier waypoint, or begin anew")
	}
	e.way, e.sweeps, e.products, e.flops, e.growth = r.Way, r.Sweeps, r.Products, r.Flops, r.Growth
	s.journal, s.stagesBefore = journal{past: r.Past}, r.Stages
	return nil
}

// passage is a sweep under way: right over the bonds and left again.
type passage struct {
	left bool // in the left-going half
	next int  // bond to be updated next; -1: none
	out  outcome
}

// advance moves on to the next update.
func (w *passage) advance(bonds int) {
	switch {
	case w.left:
		w.next--
	case w.next < bonds-1:
		w.next++
	default:
		w.left, w.out = true, w.out.halfway()
	}
}

// over reports whether nothing is left to do.
func (w *passage) over() bool { return w.left && w.next < 0 }

// fits reports whether a sweep of a chain of n sites can stand there with the centre at site c.
func (w *passage) fits(c, n int) bool {
	switch {
	case w.next < -1 || w.next > n-2:
		return false
	case w.left:
		return c == w.next+1
	}
	return c == w.next
}
