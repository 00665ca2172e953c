package solve

import (
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"

	"rundle/dmrg"
	"rundle/internal/atomicfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// progressFormat names what a checkpoint says beside the search's own waypoint.
const progressFormat = "rundle-checkpoint/2"

// oldProgressFile is that of the format before, which held states alone.
const oldProgressFile = "progress.json"

// Files of the checkpoint folder: pointName is a waypoint of the search, the higher its number the newer; settledName the state at a settled
// bond dimension, by the number of stages settled.
const (
	pointName   = "point-%d.npz"
	settledName = "settled-%d.npz"
)

// keptPoints is how many waypoints are kept: should the newest be damaged, the one before serves.
const keptPoints = 2

// progress is what a checkpoint knows beside the waypoint, in whose file it is the note.
type progress struct {
	Format    string            `json:"format"`
	Hash      string            `json:"hash"`       // of the model
	Sector    runfolder.Numbers `json:"sector"`     // found so far
	Sweeps    int               `json:"sweeps"`     // whole ones done
	Seconds   float64           `json:"seconds"`    // spent on them
	Memory    int64             `json:"memory"`     // cap on memory of the run that wrote this; 0: none
	SettledAt int               `json:"settled_at"` // sweep after which the last bond dimension settled
	Settled   []settled         `json:"settled"`    // the last settled bond dimensions, oldest first, at most two
}

// settled describes a settled bond dimension.
type settled struct {
	Stage     int     `json:"stage"` // from 1
	Bond      int     `json:"bond"`
	Discarded float64 `json:"discarded_weight"`
}

// checkpoint is the checkpoint folder of a run.
type checkpoint struct {
	dir    string // "" until it is there
	points []point
	progress
}

// point is a waypoint on disk.
type point struct{ number, stages int }

// openCheckpoint reads the checkpoint of a run folder; the waypoint is nil where there is none to go on from. Damaged ones are told in notes
// and the one before is taken; one that another version of the program wrote is an error.
func openCheckpoint(f *runfolder.Folder, hash string) (c *checkpoint, at *dmrg.Waypoint, notes []string, err error) {
	c = &checkpoint{progress: progress{Format: progressFormat, Hash: hash}}
	dir := filepath.Join(f.Dir(), runfolder.CheckpointName)
	numbers, err := numbered(dir, pointName)
	if err != nil || len(numbers) == 0 {
		if _, old := os.Stat(filepath.Join(dir, oldProgressFile)); old == nil {
			err = otherVersion(dir, errors.New("it is of the format before \""+progressFormat+"\""))
		}
		return c, nil, nil, err
	}
	for i := len(numbers) - 1; i >= 0; i-- {
		path := filepath.Join(dir, fmt.Sprintf(pointName, numbers[i]))
		w, note, err := dmrg.LoadWaypoint(path)
		if errors.Is(err, dmrg.ErrDeparted) {
			return c, nil, nil, otherVersion(dir, err)
		}
		var p progress
		if err == nil {
			if err = json.Unmarshal([]byte(note), &p); err != nil {
				err = fmt.Errorf("%s: its note: %w", path, err)
			}
		}
		if err != nil {
			notes = append(notes, err.Error())
			continue
		}
		switch {
		case p.Format != progressFormat:
			return c, nil, nil, otherVersion(path, fmt.Errorf("it has the format %q, this program reads %q", p.Format, progressFormat))
		case p.Hash != hash:
			return c, nil, nil, otherVersion(path, fmt.Errorf("it is of the model %.12s, this one is %.12s", p.Hash, hash))
		}
		c.dir, c.progress = dir, p
		for _, n := range numbers[:i+1] {
			c.points = append(c.points, point{n, w.Stages})
		}
		return c, w, notes, nil
	}
	return c, nil, append(notes, fmt.Sprintf("%s: no point to go on from; the search begins anew", dir)), nil
}

// otherVersion words the refusal of a checkpoint.
func otherVersion(path string, err error) error {
	return refuse("checkpoint %s: %w; finish that run with the version of the program that began it, or use --fresh to move it aside and begin anew", path, err)
}

// numbered lists the numbers of the files in dir that are named so, in increasing order.
func numbered(dir, name string) (numbers []int, err error) {
	entries, err := os.ReadDir(dir)
	if errors.Is(err, os.ErrNotExist) {
		return nil, nil
	}
	for _, e := range entries {
		var n int
		if _, bad := fmt.Sscanf(e.Name(), name, &n); bad == nil && fmt.Sprintf(name, n) == e.Name() {
			numbers = append(numbers, n)
		}
	}
	slices.Sort(numbers)
	return numbers, err
}

// clean removes what killed runs left: half files, and what came after the waypoint that the run goes on from.
func (c *checkpoint) clean(f *runfolder.Folder) error {
	dir := filepath.Join(f.Dir(), runfolder.CheckpointName)
	if _, err := os.Stat(dir); errors.Is(err, os.ErrNotExist) {
		return nil
	}
	newest, stages := 0, 0
	if n := len(c.points); n > 0 {
		newest, stages = c.points[n-1].number, c.points[n-1].stages
	}
	return errors.Join(atomicfile.RemoveLeftovers(dir),
		remove(dir, pointName, func(n int) bool { return n > newest }),
		remove(dir, settledName, func(n int) bool { return n > stages }))
}

// remove deletes the numbered files that are out of date.
func remove(dir, name string, out func(int) bool) error {
	numbers, err := numbered(dir, name)
	for _, n := range numbers {
		if out(n) {
			err = errors.Join(err, os.Remove(filepath.Join(dir, fmt.Sprintf(name, n))))
		}
	}
	return err
}

// settle keeps the state of a settled bond dimension.
func (c *checkpoint) settle(f *runfolder.Folder, s *mps.State, mark settled) error {
	if err := c.make(f); err != nil {
		return err
	}
	if err := s.Save(c.path(settledName, mark.Stage)); err != nil {
		return err
	}
	c.Settled = append(c.Settled, mark)
	c.Settled = c.Settled[max(0, len(c.Settled)-2):]
	return nil
}

// save writes a waypoint. What no kept waypoint needs is removed afterwards.
func (c *checkpoint) save(f *runfolder.Folder, w *dmrg.Waypoint) error {
	if err := c.make(f); err != nil {
		return err
	}
	note, err := json.Marshal(c.progress)
	if err != nil {
		return err
	}
	number := 1
	if n := len(c.points); n > 0 {
		number = c.points[n-1].number + 1
	}
	if err := w.Save(c.path(pointName, number), string(note)); err != nil {
		return err
	}
	c.points = append(c.points, point{number, w.Stages})
	c.points = c.points[max(0, len(c.points)-keptPoints):]
	oldest := c.points[0]
	return errors.Join(remove(c.dir, pointName, func(n int) bool { return n < oldest.number }),
		remove(c.dir, settledName, func(n int) bool { return n < oldest.stages-1 }))
}

// earlier loads the state of the settled bond dimension before the last (back = 1) or the last (back = 0); nil where there is none.
func (c *checkpoint) earlier(back int) (*mps.State, settled, error) {
	if c.dir == "" || len(c.Settled) <= back {
		return nil, settled{}, nil
	}
	mark := c.Settled[len(c.Settled)-1-back]
	s, err := mps.Load(c.path(settledName, mark.Stage))
	if os.IsNotExist(err) {
		return nil, settled{}, nil
	}
	return s, mark, err
}

func (c *checkpoint) path(name string, n int) string {
	return filepath.Join(c.dir, fmt.Sprintf(name, n))
}

func (c *checkpoint) make(f *runfolder.Folder) (err error) {
	if c.dir == "" {
		c.dir, err = f.Checkpoint()
	}
	return err
}
