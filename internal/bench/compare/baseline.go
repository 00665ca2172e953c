package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
)

// theirs is what a run of the baseline reports.
type theirs struct {
	Energy       float64 `json:"energy"`
	Sweeps       int     `json:"sweeps"`
	Sweep        float64 `json:"sec_per_sweep"`
	SweepCPU     float64 `json:"cpu_sec_per_sweep"`
	Total        float64 `json:"total_sec"`
	TotalCPU     float64 `json:"total_cpu_sec"`
	Peak         float64 `json:"peak_rss_mb"`
	MaxBond      int     `json:"max_bond"`
	Products     int     `json:"matvecs"`
	ShareSVD     float64 `json:"frac_svd"`
	ShareProduct float64 `json:"frac_matvec"`
	SharePlan    float64 `json:"frac_plan"`
	Steps        []step  `json:"-"`
}

// step is one of its sweeps, as --verbose tells.
type step struct{ energy, wall, cpu float64 }

// until adds up its sweeps to the first whose energy is within a tolerance of the last.
func (t theirs) until(tolerance float64) (wall, cpu float64) {
	for _, s := range t.Steps {
		wall, cpu = wall+s.wall, cpu+s.cpu
		if s.energy <= t.Energy+tolerance {
			break
		}
	}
	return wall, cpu
}

// program starts the baseline.
type program struct{ folder, python, core string }

// stepLine is a sweep in the verbose output: energy, seconds on the wall, processor seconds.
var stepLine = regexp.MustCompile(`^ *\d+ chi +\d+ noise \S+ E (\S+) disc \S+ m \d+ ([0-9.]+)s cpu ([0-9.]+)s`)

// run starts bench.py for a row; options are its own.
func (p program) run(ctx context.Context, r row, threads int, options ...string) (*theirs, error) {
	m, err := find(r.model)
	if err != nil {
		return nil, err
	}
	if r.rungs > 0 {
		m.rungs = r.rungs
	}
	var bonds []string
	for _, b := range r.bonds {
		bonds = append(bonds, strconv.Itoa(b))
	}
	args := []string{filepath.Join(p.folder, "bench.py"), m.name, strconv.Itoa(m.rungs), strings.Join(bonds, ","), "-v"}
	if m.flux != 0 {
		args = append(args, "--params", fmt.Sprintf(`{"phi": %v}`, m.flux))
	}
	cmd := exec.CommandContext(ctx, p.python, append(args, options...)...)
	var stdout, stderr bytes.Buffer
	cmd.Stdout, cmd.Stderr = &stdout, &stderr
	cmd.Env = append(os.Environ(), fmt.Sprintf("OPENBLAS_NUM_THREADS=%d", threads), "PYTHONDONTWRITEBYTECODE=1")
	if p.core != "" {
		cmd.Env = append(cmd.Env, "OPENBLAS_CORETYPE="+p.core)
	}
	if err := cmd.Run(); err != nil {
		return nil, fmt.Errorf("the baseline: %w\n%s", err, tail(stderr.String()))
	}
	return readTheirs(stdout.Bytes(), stderr.String())
}

// readTheirs reads what bench.py prints.
func readTheirs(document []byte, verbose string) (*theirs, error) {
	var t theirs
	if err := json.Unmarshal(document, &t); err != nil {
		return nil, fmt.Errorf("output of the baseline: %w", err)
	}
	for line := range strings.Lines(verbose) {
		m := stepLine.FindStringSubmatch(line)
		if m == nil {
			continue
		}
		var x [3]float64
		for i := range x {
			var err error
			if x[i], err = strconv.ParseFloat(m[i+1], 64); err != nil {
				return nil, fmt.Errorf("output of the baseline: %w", err)
			}
		}
		t.Steps = append(t.Steps, step{x[0], x[1], x[2]})
	}
	if len(t.Steps) == 0 || len(t.Steps) != t.Sweeps {
		return nil, fmt.Errorf("output of the baseline: %d sweeps told of, expected %d", len(t.Steps), t.Sweeps)
	}
	return &t, nil
}

// tail is the end of a program's complaint.
func tail(s string) string {
	const most = 2000
	return strings.TrimSpace(s[max(0, len(s)-most):])
}
