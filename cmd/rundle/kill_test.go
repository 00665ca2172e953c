//go:build unix

package main

import (
	"errors"
	"flag"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"syscall"
	"testing"
	"time"

	"github.com/stretchr/testify/require"

	"rundle/internal/runfolder"
)

// kills is how often TestKill kills: .ci/run asks for more.
var kills = flag.Int("kills", killCount, "kills of TestKill")

// killed is a model that takes a second or two.
const killed = `
[ladder]
rungs = %d
[[leg]]
name = "a"
site = "spin"
s    = "1/2"
[[leg]]
name = "b"
site = "spin"
s    = "1/2"
[[term]]
formula = "S[l,j].S[l,j+1]"
each    = { l = "legs" }
[[term]]
formula = "0.3 S[a,j].S[b,j]"
[sector]
Sz = 0
[solve]
precision = 1e-8
[[observe]]
name    = "rung"
formula = "S[a,j].S[b,j]"
`

// life is one process of a run that is interrupted again and again.
type life struct {
	t        *testing.T
	program  string
	model    string
	run      string
	every    time.Duration
	threads  int
	fraction *rand.Rand
}

// interrupted begins to solve and sends a signal after the given time. It returns the exit code, -1 of a process that was killed, and the moments of the signal
// and of the end.
func (l *life) interrupted(signal syscall.Signal, after time.Duration) (code int, sent, ended time.Time) {
	l.threads = 3 - l.threads
	command := exec.Command(l.program, "solve", "--out", l.run, "--threads", strconv.Itoa(l.threads), "--checkpoint-every", l.every.String(), l.model)
	out, err := os.Create(l.run + ".out")
	require.NoError(l.t, err)
	defer out.Close()
	command.Stdout, command.Stderr = out, out
	require.NoError(l.t, command.Start())
	alarm := time.AfterFunc(after, func() {
		sent = time.Now()
		_ = command.Process.Signal(signal) // it may have ended
	})
	err = command.Wait()
	ended = time.Now()
	alarm.Stop()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		require.NoError(l.t, err)
	}
	code = command.ProcessState.ExitCode()
	text, err := os.ReadFile(l.run + ".out")
	require.NoError(l.t, err)
	require.Contains(l.t, []int{0, -1, exitStopped}, code, "%s", text)
	return code, sent, ended
}

// newest is when the newest checkpoint was written; zero if there is none.
func (l *life) newest() (at time.Time) {
	paths, err := filepath.Glob(filepath.Join(l.run, runfolder.CheckpointName, "point-*.npz"))
	require.NoError(l.t, err)
	for _, path := range paths {
		info, err := os.Stat(path)
		require.NoError(l.t, err)
		if info.ModTime().After(at) {
			at = info.ModTime()
		}
	}
	return at
}

// states are the results without what the clock decides.
func states(t *testing.T, run string) []runfolder.State {
	t.Helper()
	r, err := runfolder.ReadResult(run)
	require.NoError(t, err)
	for i := range r.States {
		r.States[i].Seconds = 0
	}
	return r.States
}

// begun solves a model without and prepares to solve it with interruptions; the time is that of the undisturbed run.
func begun(t *testing.T, rungs int) (l *life, undisturbed []runfolder.State, took time.Duration) {
	t.Helper()
	folder := t.TempDir()
	program := filepath.Join(folder, "rundle")
	text, err := exec.Command("go", "build", "-o", program, ".").CombinedOutput()
	require.NoError(t, err, "%s", text)
	model := filepath.Join(folder, "model.toml")
	require.NoError(t, os.WriteFile(model, fmt.Appendf(nil, killed, rungs), 0o600))
	whole := filepath.Join(folder, "whole.run")
	begin := time.Now()
	text, err = exec.Command(program, "solve", "--out", whole, "--threads", "1", model).CombinedOutput()
	require.NoError(t, err, "%s", text)
	took = time.Since(begin)
	return &life{t: t, program: program, model: model, run: filepath.Join(folder, "killed.run"), every: 20 * time.Millisecond, threads: 1,
		fraction: rand.New(rand.NewPCG(1, 1))}, states(t, whole), took
}

// finish lets the last life live, and compares.
func (l *life) finish(undisturbed []runfolder.State) {
	code, _, _ := l.interrupted(syscall.SIGKILL, time.Hour)
	require.Equal(l.t, exitDone, code)
	require.Equal(l.t, undisturbed, states(l.t, l.run), "an interrupted run ends with the same bits")
	log, err := runfolder.ReadLog(l.run)
	require.NoError(l.t, err)
	whole, err := runfolder.ReadLog(filepath.Join(filepath.Dir(l.run), "whole.run"))
	require.NoError(l.t, err)
	require.Len(l.t, log, len(whole))
	for i, line := range log {
		require.Equal(l.t, whole[i].Sweep, line.Sweep)
		require.Equal(l.t, whole[i].Energy, line.Energy)
	}
	require.NoDirExists(l.t, filepath.Join(l.run, runfolder.CheckpointName))
}

// TestKill kills a run at random moments, again and again. Each life begins where a checkpoint left off, which is no older than the interval
// and what it takes to write one; the run folder survives; and the results are those of an undisturbed run, to the bit.
func TestKill(t *testing.T) {
	l, undisturbed, took := begun(t, killRungs)
	var lost []float64
	done := 0
	for n := 0; n < *kills; {
		// Some die at birth, some come far; the undisturbed run's share of each is such that most runs see several lives.
		code, sent, _ := l.interrupted(syscall.SIGKILL, time.Duration(l.fraction.ExpFloat64()*0.15*float64(took)))
		if code != -1 {
			require.Equal(t, undisturbed, states(t, l.run))
			require.NoError(t, os.RemoveAll(l.run)) // once more from the start
			done++
			continue
		}
		n++
		if at := l.newest(); !at.IsZero() && at.Before(sent) {
			lost = append(lost, sent.Sub(at).Seconds())
		}
	}
	l.finish(undisturbed)
	require.NotEmpty(t, lost)
	slices.Sort(lost)
	t.Logf("%d kills, of a run of %v; %d runs came to their end in between; lost in the median %.3f s, at most %.3f s", *kills, took, done, lost[len(lost)/2], lost[len(lost)-1])
}

// TestTerminate asks a run to stop at random moments: it ends with code 75, soon.
func TestTerminate(t *testing.T) {
	l, undisturbed, took := begun(t, killRungs)
	var waited time.Duration
	for range 3 {
		code, sent, ended := l.interrupted(syscall.SIGTERM, time.Duration((0.05+0.2*l.fraction.Float64())*float64(took)))
		if code != exitStopped {
			break
		}
		waited = max(waited, ended.Sub(sent))
		status, err := runfolder.ReadStatus(l.run)
		require.NoError(t, err)
		require.Equal(t, runfolder.Stopped, status.Phase)
		require.False(t, l.newest().IsZero())
	}
	require.Positive(t, waited, "it was never stopped")
	require.Less(t, waited, 10*time.Second)
	t.Logf("it ended at most %v after the signal", waited)
	l.finish(undisturbed)
}
