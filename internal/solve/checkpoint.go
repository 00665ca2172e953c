package solve

import (
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"rundle/internal/atomicfile"
	"rundle/internal/runfolder"
	"rundle/mps"
)

// Files of the checkpoint folder.
const (
	latestFile   = "state-0.npz"   // the state when the run was stopped; newer than the others where it exists
	settledFile  = "settled-0.npz" // the state at the last settled bond dimension
	earlierFile  = "earlier-0.npz" // and at the one before
	progressFile = "progress.json"
)

const progressFormat = "rundle-checkpoint/1"

// progress is what a checkpoint knows beside the states.
type progress struct {
	Format  string            `json:"format"`
	Sector  runfolder.Numbers `json:"sector"`  // found or asked for: the search stays in it
	Sweeps  int               `json:"sweeps"`  // done so far
	Seconds float64           `json:"seconds"` // spent on them
	Memory  int64             `json:"memory"`  // cap on memory of the run that wrote this; 0: none
	Settled []settled         `json:"settled"` // of the settled files, oldest first, at most two
}

// settled describes a settled bond dimension.
type settled struct {
	Bond      int     `json:"bond"`
	Discarded float64 `json:"discarded_weight"`
}

// checkpoint is the checkpoint folder of a run.
type checkpoint struct {
	dir string // "" until it is there
	progress
}

// openCheckpoint reads the checkpoint of a run folder; state is nil where there is none to go on from. A damaged checkpoint is told
// in a note and left aside.
func openCheckpoint(f *runfolder.Folder) (c *checkpoint, state *mps.State, notes []string) {
	c = &checkpoint{}
	dir := filepath.Join(f.Dir(), runfolder.CheckpointName)
	text, err := os.ReadFile(filepath.Join(dir, progressFile))
	if os.IsNotExist(err) {
		return c, nil, nil
	}
	var p progress
	if err == nil {
		err = json.Unmarshal(text, &p)
	}
	if err == nil && p.Format != progressFormat {
		err = fmt.Errorf("it has the format %q: this program reads %q", p.Format, progressFormat)
	}
	if err != nil {
		return c, nil, []string{fmt.Sprintf("%s: %v; the search begins anew", filepath.Join(dir, progressFile), err)}
	}
	for _, name := range []string{latestFile, settledFile, earlierFile} {
		s, err := mps.Load(filepath.Join(dir, name))
		if err == nil {
			return &checkpoint{dir, p}, s, notes
		}
		if !os.IsNotExist(err) {
			notes = append(notes, err.Error())
		}
	}
	return c, nil, append(notes, fmt.Sprintf("%s: no state to go on from; the search begins anew", dir))
}

// settle keeps the state of a settled bond dimension.
func (c *checkpoint) settle(f *runfolder.Folder, s *mps.State, mark settled) error {
	if err := c.make(f); err != nil {
		return err
	}
	if len(c.Settled) > 0 {
		if err := os.Rename(c.path(settledFile), c.path(earlierFile)); err != nil && !os.IsNotExist(err) {
			return err
		}
		c.Settled = c.Settled[len(c.Settled)-1:]
	}
	if err := s.Save(c.path(settledFile)); err != nil {
		return err
	}
	c.Settled = append(c.Settled, mark)
	if err := os.Remove(c.path(latestFile)); err != nil && !os.IsNotExist(err) {
		return err
	}
	return c.write()
}

// keep saves the state at which a run stops.
func (c *checkpoint) keep(f *runfolder.Folder, s *mps.State) error {
	if err := c.make(f); err != nil {
		return err
	}
	if err := s.Save(c.path(latestFile)); err != nil {
		return err
	}
	return c.write()
}

// earlier loads the state of the settled bond dimension before the last (back = 1) or the last (back = 0); nil where there is none.
func (c *checkpoint) earlier(back int) (*mps.State, settled, error) {
	if c.dir == "" || len(c.Settled) <= back {
		return nil, settled{}, nil
	}
	name := settledFile
	if back == 1 {
		name = earlierFile
	}
	s, err := mps.Load(c.path(name))
	if os.IsNotExist(err) {
		return nil, settled{}, nil
	}
	return s, c.Settled[len(c.Settled)-1-back], err
}

func (c *checkpoint) path(name string) string { return filepath.Join(c.dir, name) }

func (c *checkpoint) make(f *runfolder.Folder) (err error) {
	if c.dir == "" {
		c.dir, err = f.Checkpoint()
	}
	return err
}

func (c *checkpoint) write() error {
	c.Format = progressFormat
	text, err := json.MarshalIndent(c.progress, "", " ")
	if err != nil {
		return err
	}
	return atomicfile.Write(c.path(progressFile), 0o666, func(w io.Writer) error {
		_, err := w.Write(append(text, '\n'))
		return err
	})
}
