package runfolder

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"time"
)

// StatusFormat names the layout of status.json.
const StatusFormat = "rundle-status/1"

// A Phase says what a run does.
type Phase string

// The phases. A run that was killed still says Running: Updated is then old.
const (
	Starting Phase = "starting"
	Running  Phase = "running"
	Stopped  Phase = "stopped" // by a signal or a limit; the same command goes on
	Done     Phase = "done"
	Failed   Phase = "failed"
)

// A Status is the content of status.json. The folder fills in what it knows:
// all fields from Format to Updated.
type Status struct {
	Format   string            `json:"format"`
	Hash     string            `json:"hash"`
	Settings map[string]string `json:"settings,omitempty"`
	Host     string            `json:"host"`
	Process  int               `json:"process"`
	Started  time.Time         `json:"started"`
	Updated  time.Time         `json:"updated"`

	Phase       Phase    `json:"phase"`
	State       int      `json:"state"`
	Sector      Numbers  `json:"sector,omitempty"`
	Sweep       int      `json:"sweep"`
	Energy      *float64 `json:"energy,omitempty"`
	LargestBond int      `json:"largest_bond,omitempty"`
	Message     string   `json:"message,omitempty"`
}

// SetStatus writes status.json.
func (f *Folder) SetStatus(s Status) error {
	if err := checkFinite(&s); err != nil {
		return fmt.Errorf("%s: %w", f.path(StatusFile), err)
	}
	s.Format, s.Hash, s.Settings = StatusFormat, f.origin.Hash, f.origin.Settings
	s.Host, _ = os.Hostname() // "" says unknown
	s.Process = os.Getpid()
	s.Started, s.Updated = f.started.Round(time.Millisecond), time.Now().Round(time.Millisecond)
	text, err := json.MarshalIndent(s, "", " ")
	if err != nil {
		return fmt.Errorf("%s: %w", f.path(StatusFile), err)
	}
	return write(f.path(StatusFile), append(text, '\n'))
}

// ReadStatus reads the status.json of a run folder.
func ReadStatus(dir string) (Status, error) {
	text, err := os.ReadFile(filepath.Join(dir, StatusFile))
	if err != nil {
		return Status{}, err
	}
	var s Status
	if err := json.Unmarshal(text, &s); err != nil {
		return Status{}, fmt.Errorf("%s is damaged: %w", StatusFile, err)
	}
	if s.Format != StatusFormat {
		return Status{}, fmt.Errorf("%s has the format %q: this program reads %q", StatusFile, s.Format, StatusFormat)
	}
	return s, nil
}
