package main

import (
	"fmt"
	"io"
	"os"
	"sync"
	"time"

	"github.com/vbauerster/mpb/v8"
	"github.com/vbauerster/mpb/v8/decor"
	"golang.org/x/term"

	"rundle/internal/solve"
)

// display shows how a run gets on.
type display interface {
	update(p solve.Progress)
	close()
}

// newDisplay is a bar on a terminal of known size, plain lines elsewhere.
func newDisplay(w io.Writer) display {
	if f, ok := w.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
		if width, height, err := term.GetSize(int(f.Fd())); err == nil && width > 0 && height > 1 {
			return &bar{out: f}
		}
	}
	return &lines{w: w, now: time.Now}
}

// lineEvery is the least time between two lines.
const lineEvery = 3 * time.Second

// lines writes a line at each change of phase and every few seconds.
type lines struct {
	w     io.Writer
	now   func() time.Time
	phase solve.Phase
	last  time.Time
}

func (l *lines) update(p solve.Progress) {
	if p.Phase == l.phase && l.now().Sub(l.last) < lineEvery {
		return
	}
	l.phase, l.last = p.Phase, l.now()
	fmt.Fprintln(l.w, progressText(p))
}

func (l *lines) close() {}

// progressText is one line on where a run stands.
func progressText(p solve.Progress) string {
	if p.Phase != solve.Sweeping {
		return string(p.Phase)
	}
	s := fmt.Sprintf("sweep %d", p.Sweep)
	if p.LargestBond > 0 {
		s += fmt.Sprintf(", bond dimension %d", p.LargestBond)
	}
	s += fmt.Sprintf(", energy %.10g", p.Energy)
	if p.Discarded > 0 {
		s += fmt.Sprintf(", discarded weight %.1e", p.Discarded)
	}
	return s
}

// barRefresh is the time between two pictures of the bar.
const barRefresh = 200 * time.Millisecond

// bar shows the updates of the present sweep, with the time left of it. How many sweeps it takes nobody knows before.
type bar struct {
	out   *os.File
	all   *mpb.Progress // nil before the first update: notes come first
	one   *mpb.Bar
	phase solve.Phase
	sweep int

	mu   sync.Mutex // text is read by the drawing goroutine
	text string
}

func (b *bar) update(p solve.Progress) {
	if b.all == nil {
		b.all = mpb.New(mpb.WithOutput(b.out), mpb.WithWidth(30), mpb.WithRefreshRate(barRefresh))
	}
	b.mu.Lock()
	b.text = progressText(p)
	b.mu.Unlock()
	if b.one == nil || p.Phase != b.phase || p.Sweep != b.sweep {
		b.end()
		b.phase, b.sweep = p.Phase, p.Sweep
		b.begin(int64(p.Of))
	}
	b.one.SetCurrent(int64(p.Done))
}

// begin draws a new bar; one of no length tells no time.
func (b *bar) begin(total int64) {
	text := decor.Any(func(decor.Statistics) string {
		b.mu.Lock()
		defer b.mu.Unlock()
		return " " + b.text
	})
	decorators := []decor.Decorator{text}
	if b.phase == solve.Sweeping {
		decorators = []decor.Decorator{decor.AverageETA(decor.ET_STYLE_GO), decor.Name(" left of"), text}
	}
	b.one = b.all.AddBar(max(1, total), mpb.BarRemoveOnComplete(), mpb.AppendDecorators(decorators...))
}

func (b *bar) end() {
	if b.one != nil {
		b.one.Abort(true)
		b.one.Wait()
		b.one = nil
	}
}

func (b *bar) close() {
	b.end()
	if b.all != nil {
		b.all.Wait()
	}
}
