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

// newDisplay is a bar on a terminal, plain lines elsewhere.
func newDisplay(w io.Writer) display {
	if f, ok := w.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
		return &bar{out: f}
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

// bar shows the updates of the present sweep, with the time left of it. How many sweeps it takes nobody knows before.
type bar struct {
	out   *os.File
	all   *mpb.Progress // nil before the first update: notes come first
	one   *mpb.Bar
	sweep int

	mu   sync.Mutex // text is read by the drawing goroutine
	text string
}

func (b *bar) update(p solve.Progress) {
	if b.all == nil {
		b.all = mpb.New(mpb.WithOutput(b.out), mpb.WithWidth(40), mpb.WithRefreshRate(200*time.Millisecond))
	}
	b.mu.Lock()
	b.text = progressText(p)
	b.mu.Unlock()
	if p.Phase != solve.Sweeping || p.Of == 0 {
		if b.one == nil {
			b.begin(1)
		}
		return
	}
	if b.one == nil || p.Sweep != b.sweep {
		b.end()
		b.sweep = p.Sweep
		b.begin(int64(p.Of))
	}
	b.one.SetCurrent(int64(p.Done))
}

func (b *bar) begin(total int64) {
	b.one = b.all.AddBar(total, mpb.BarRemoveOnComplete(),
		mpb.PrependDecorators(decor.Any(func(decor.Statistics) string {
			b.mu.Lock()
			defer b.mu.Unlock()
			return b.text + " "
		})),
		mpb.AppendDecorators(decor.AverageETA(decor.ET_STYLE_GO), decor.Name(" left of this sweep")))
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
