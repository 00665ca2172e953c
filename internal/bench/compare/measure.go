package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"os"
	"os/exec"
	"slices"
	"strings"
)

// lab runs measurements, each in a process of its own.
type lab struct {
	program
	baseline string
	self     string
	rounds   int
	progress io.Writer
	rows     map[string]*report // profiles serve two rows
}

func newLab(g grammar, progress io.Writer) (*lab, error) {
	self, err := os.Executable()
	if err != nil {
		return nil, err
	}
	return &lab{program: program{g.Baseline, g.Python, g.Core}, baseline: g.Baseline, self: self, rounds: g.Rounds, progress: progress,
		rows: map[string]*report{}}, nil
}

// line is a row of the table.
type line struct {
	Row      string  `json:"row"`
	Rundle   string  `json:"rundle"`
	Baseline string  `json:"baseline,omitempty"`
	Figure   float64 `json:"figure"`
	Whole    float64 `json:"whole_run,omitempty"` // ratio to the whole run of the baseline
	Target   float64 `json:"target"`
	AtMost   bool    `json:"at_most,omitempty"`
	Met      bool    `json:"met"`
	Note     string  `json:"note,omitempty"`
}

func (l line) String() string {
	return fmt.Sprintf("%s: %.3g (%s), Rundle %s, baseline %s; %s", l.Row, l.Figure, l.verdict(), l.Rundle, l.Baseline, l.Note)
}

func (l line) verdict() string {
	if l.Met {
		return "met"
	}
	return "missed"
}

// measure fills in the row.
func (l *lab) measure(ctx context.Context, r row) (line, error) {
	out := line{Row: r.name(), Target: r.target, AtMost: r.kind.atMost()}
	var err error
	switch r.kind {
	case sweepKind:
		err = l.sweeps(ctx, r, &out)
	case energyKind:
		err = l.energy(ctx, r, &out)
	case memoryKind:
		err = l.memory(ctx, r, &out)
	case exponentKind:
		err = l.exponent(ctx, r, &out)
	case threadsKind:
		err = l.threads(ctx, r, &out)
	case shareKind, rateKind:
		err = l.gemm(ctx, r, &out)
	}
	out.Met = out.Figure >= r.target
	if out.AtMost {
		out.Met = out.Figure <= r.target
	}
	return out, err
}

// child does a job in a new process of this program, with as many processors as threads.
func (l *lab) child(ctx context.Context, r row, j job) (*report, error) {
	j.Model, j.Rungs = r.model, r.rungs
	text, err := json.Marshal(j)
	if err != nil {
		return nil, err
	}
	cmd := exec.CommandContext(ctx, l.self, "--job", string(text))
	var stdout, stderr bytes.Buffer
	cmd.Stdout, cmd.Stderr = &stdout, &stderr
	cmd.Env = append(os.Environ(), fmt.Sprintf("GOMAXPROCS=%d", j.Threads))
	if err := cmd.Run(); err != nil {
		return nil, fmt.Errorf("%w\n%s", err, tail(stderr.String()))
	}
	var out report
	return &out, json.Unmarshal(stdout.Bytes(), &out)
}

// equalWork returns the baseline's options for sweeps that both do alike: nothing dropped but zeros, all Krylov vectors, and a fixed number of clean sweeps.
func equalWork(clean int) []string {
	return []string{"--discard", "0", "--krylov-tol", "0", "--tol", "0", "--max-sweeps", fmt.Sprint(clean)}
}

func (l *lab) sweeps(ctx context.Context, r row, out *line) error {
	var ratios, ours, other []float64
	for range l.rounds {
		mine, err := l.child(ctx, r, job{Threads: 1, Schedule: r.schedule(cleanPasses)})
		if err != nil {
			return err
		}
		base, err := l.run(ctx, r, 1, equalWork(cleanPasses)...)
		if err != nil {
			return err
		}
		s := mine.seconds(cpuOf)
		ours, other, ratios = append(ours, s), append(other, base.SweepCPU), append(ratios, base.SweepCPU/s)
		last := mine.Sweeps[len(mine.Sweeps)-1]
		out.Note = fmt.Sprintf("products %d, %d; bond %d, %d; E %.9f, %+.0e; baseline: svd %.0f %%, products %.0f %%, planning %.0f %%", last.Products, base.Products,
			last.Largest, base.MaxBond, mine.Energy, base.Energy-mine.Energy, 100*base.ShareSVD, 100*base.ShareProduct, 100*base.SharePlan)
	}
	out.Figure, out.Rundle, out.Baseline = median(ratios), seconds(median(ours)), seconds(median(other))
	return nil
}

// ownOptions are those of the calls that the baseline's README shows.
var ownOptions = map[string][]string{"ladder": {"--discard", "0", "--krylov-tol", "0"}}

// nearEnough is how near to the baseline's energy a search must come, and what it is asked for.
const nearEnough = 1e-9

func (l *lab) energy(ctx context.Context, r row, out *line) error {
	var ratios, whole, ours, other []float64
	for range l.rounds {
		base, err := l.run(ctx, r, r.threads, ownOptions[r.model]...)
		if err != nil {
			return err
		}
		until := base.Energy + nearEnough
		mine, err := l.child(ctx, r, job{Threads: r.threads, Precision: nearEnough, Until: &until})
		if err != nil {
			return err
		}
		wall, cpu := base.until(nearEnough)
		s, t, all := mine.CPU, cpu, base.TotalCPU
		if r.threads > 1 {
			s, t, all = mine.Wall, wall, base.Total
		}
		last := mine.Sweeps[len(mine.Sweeps)-1]
		out.Note = fmt.Sprintf("E %.9f, baseline %+.0e; bond %d in %d sweeps; %s", last.Energy, base.Energy-last.Energy, last.Bond, len(mine.Sweeps), mine.Arithmetic)
		if !mine.Reached {
			out.Figure, out.Rundle, out.Baseline, out.Note = 0, seconds(s), seconds(t), "not reached: "+mine.Verdict+"; "+out.Note
			return nil
		}
		ours, other, ratios, whole = append(ours, s), append(other, t), append(ratios, t/s), append(whole, all/s)
	}
	out.Figure, out.Rundle, out.Baseline = median(ratios), seconds(median(ours)), seconds(median(other))
	out.Whole = median(whole)
	out.Note = fmt.Sprintf("whole run of the baseline %.1f; %s", out.Whole, out.Note)
	return nil
}

func (l *lab) memory(ctx context.Context, r row, out *line) error {
	mine, err := l.child(ctx, r, job{Threads: 1, Schedule: r.schedule(1)})
	if err != nil {
		return err
	}
	base, err := l.run(ctx, r, 1, equalWork(1)...)
	if err != nil {
		return err
	}
	out.Figure, out.Rundle, out.Baseline = mine.Peak/base.Peak, fmt.Sprintf("%.0f MiB", mine.Peak), fmt.Sprintf("%.0f MiB", base.Peak)
	if mine.Peak == 0 {
		out.Figure, out.Note = math.NaN(), "this system does not tell the peak"
	}
	return nil
}

func (l *lab) exponent(ctx context.Context, r row, out *line) error {
	mine, err := l.child(ctx, r, job{Threads: 1, Schedule: r.staircase()})
	if err != nil {
		return err
	}
	var x, y []float64
	var notes []string
	for i, s := range mine.Sweeps {
		if s.Perturbation > 0 || i+1 < len(mine.Sweeps) && mine.Sweeps[i+1].Bond == s.Bond {
			continue
		}
		x, y = append(x, math.Log(float64(s.Bond))), append(y, math.Log(s.CPU))
		notes = append(notes, fmt.Sprintf("%d: %s", s.Bond, seconds(s.CPU)))
		if k := len(x) - 1; k > 0 {
			notes[k] += fmt.Sprintf(" (%.2f)", (y[k]-y[k-1])/(x[k]-x[k-1]))
		}
	}
	out.Figure, out.Rundle, out.Note = slope(x, y), notes[len(notes)-1], strings.Join(notes, ", ")
	return nil
}

// slope of the least-squares line.
func slope(x, y []float64) float64 {
	var mx, my, xx, xy float64
	n := float64(len(x))
	for i := range x {
		mx, my = mx+x[i]/n, my+y[i]/n
	}
	for i := range x {
		xx, xy = xx+(x[i]-mx)*(x[i]-mx), xy+(x[i]-mx)*(y[i]-my)
	}
	return xy / xx
}

func (l *lab) threads(ctx context.Context, r row, out *line) error {
	one, two := math.Inf(1), math.Inf(1)
	for range l.rounds {
		for _, x := range []struct {
			threads int
			best    *float64
		}{{1, &one}, {r.threads, &two}} {
			mine, err := l.child(ctx, r, job{Threads: x.threads, Schedule: r.schedule(cleanPasses)})
			if err != nil {
				return err
			}
			*x.best = min(*x.best, mine.seconds(wallOf))
		}
	}
	out.Figure, out.Rundle = one/two, seconds(two)
	out.Note = fmt.Sprintf("one thread %s, on the wall", seconds(one))
	return nil
}

func (l *lab) gemm(ctx context.Context, r row, out *line) error {
	mine := l.rows[r.model]
	if mine == nil {
		var err error
		if mine, err = l.child(ctx, r, job{Threads: 1, Schedule: r.schedule(cleanPasses), Profile: true}); err != nil {
			return err
		}
		l.rows[r.model] = mine
	}
	s := mine.Shares
	if r.kind == shareKind {
		out.Figure, out.Rundle = s.of(productsPart)+s.of(innerProductsPart), seconds(mine.seconds(cpuOf))
		var notes []string
		for _, p := range []part{productsPart, innerProductsPart, decompositionPart, movesPart, krylovPart, planningPart, memoryPart, otherPart} {
			notes = append(notes, fmt.Sprintf("%s %.1f %%", p, 100*s.of(p)))
		}
		out.Note = strings.Join(notes, ", ")
		return nil
	}
	out.Figure, out.Rundle = mine.Rate/mine.LargeRate, fmt.Sprintf("%.1f GF/s", mine.Rate)
	out.Note = fmt.Sprintf("one product of %d: %.1f GF/s", largeSize, mine.LargeRate)
	return nil
}

func median(x []float64) float64 {
	s := slices.Sorted(slices.Values(x))
	n := len(s)
	return (s[(n-1)/2] + s[n/2]) / 2
}

func seconds(s float64) string { return fmt.Sprintf("%.3g s", s) }
