package runfolder

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// A Sweep is a line of log.jsonl.
type Sweep struct {
	State           int     `json:"state"` // level searched for, in the order of the search
	Sector          Numbers `json:"sector,omitempty"`
	Stage           int     `json:"stage"`
	Sweep           int     `json:"sweep"`
	Energy          float64 `json:"energy"`
	DiscardedWeight float64 `json:"discarded_weight"`
	LargestBond     int     `json:"largest_bond"`
	Seconds         float64 `json:"seconds"`
	Note            string  `json:"note,omitempty"`
}

// Log appends a line to log.jsonl.
func (f *Folder) Log(s Sweep) error {
	if err := checkFinite(&s); err != nil {
		return fmt.Errorf("%s: %w", f.path(LogFile), err)
	}
	text, err := json.Marshal(s)
	if err != nil {
		return fmt.Errorf("%s: %w", f.path(LogFile), err)
	}
	if f.log == nil {
		if f.log, err = openLog(f.path(LogFile)); err != nil {
			return unusable(f.dir, err)
		}
	}
	if _, err := f.log.Write(append(text, '\n')); err != nil {
		// Half a line must not swallow the next one: open anew, which mends it.
		_ = f.log.Close()
		f.log = nil
		return unusable(f.dir, err)
	}
	return nil
}

// KeepLog drops the lines of sweeps after the given number, which are to be done again, and lines that cannot be read.
func (f *Folder) KeepLog(sweeps int) error {
	path := f.path(LogFile)
	text, err := os.ReadFile(path)
	if os.IsNotExist(err) {
		return nil
	}
	if err != nil {
		return unusable(f.dir, err)
	}
	if f.log != nil {
		_ = f.log.Close()
		f.log = nil
	}
	var kept []byte
	for line := range bytes.Lines(text) {
		var s Sweep
		if bytes.HasSuffix(line, []byte("\n")) && json.Unmarshal(line, &s) == nil && s.Sweep <= sweeps {
			kept = append(kept, line...)
		}
	}
	if len(kept) == len(text) {
		return nil
	}
	return write(path, kept)
}

// openLog opens the log for appending and cuts off half a line at its end.
func openLog(path string) (*os.File, error) {
	file, err := os.OpenFile(path, os.O_RDWR|os.O_CREATE|os.O_APPEND, 0o666)
	if err != nil {
		return nil, err
	}
	if err := mend(file); err != nil {
		_ = file.Close()
		return nil, err
	}
	return file, nil
}

func mend(file *os.File) error {
	size, err := file.Seek(0, io.SeekEnd)
	if err != nil {
		return err
	}
	end := size
	buffer := make([]byte, 4096)
	for end > 0 {
		from := max(0, end-int64(len(buffer)))
		part := buffer[:end-from]
		if _, err := file.ReadAt(part, from); err != nil {
			return err
		}
		if i := bytes.LastIndexByte(part, '\n'); i >= 0 {
			end = from + int64(i) + 1
			break
		}
		end = from
	}
	if end == size {
		return nil
	}
	return file.Truncate(end)
}

// ReadLog reads the log of a run folder, up to half a line at its end. A folder
// without a log has no lines.
func ReadLog(dir string) ([]Sweep, error) {
	path := filepath.Join(dir, LogFile)
	text, err := os.ReadFile(path)
	if os.IsNotExist(err) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	lines := bytes.Split(text, []byte("\n"))
	sweeps := make([]Sweep, len(lines)-1)
	for i := range sweeps {
		if err := json.Unmarshal(lines[i], &sweeps[i]); err != nil {
			return nil, fmt.Errorf("%s:%d is damaged: %w", path, i+1, err)
		}
	}
	return sweeps, nil
}
