package runfolder

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"

	"rundle/internal/atomicfile"
)

// Names in a run folder.
const (
	ModelFile      = "model.toml"
	ResultFile     = "result.json"
	LogFile        = "log.jsonl"
	StatusFile     = "status.json"
	CheckpointName = "checkpoint"
	scratchName    = "scratch"
	lockFile       = ".lock"
)

// Standing says what a folder holds of the model asked for.
type Standing int

// The standings.
const (
	Empty      Standing = iota // nothing yet
	Unfinished                 // begun, no results
	Finished                   // results of this very model
)

// An Origin is a model as the user gave it.
type Origin struct {
	Text []byte // of the model file
	Hash string // of all that determines the results
	// Settings are further choices that enter the hash, by name; they serve to
	// name a difference.
	Settings map[string]string
}

// Options steer Open.
type Options struct {
	Fresh bool // move an existing run folder aside and begin anew
}

// A Folder is a run folder held for writing. It is not for concurrent use.
type Folder struct {
	dir      string
	origin   Origin
	standing Standing
	moved    string
	lock     *atomicfile.Lock
	started  time.Time
	log      *os.File
	taken    bool // the scratch folder is ours
}

// Default returns the run folder of a model file: its name with .run for
// .toml, beside it.
func Default(modelFile string) string {
	return strings.TrimSuffix(modelFile, ".toml") + ".run"
}

// Open takes the folder for a run of the model, creating it if need be, and
// finds out how it stands. The caller closes it.
func Open(dir string, origin Origin, opt Options) (*Folder, error) {
	dir = filepath.Clean(dir)
	f := &Folder{dir: dir, origin: origin, started: time.Now()}
	if opt.Fresh {
		moved, err := moveAside(dir)
		if err != nil {
			return nil, err
		}
		f.moved = moved
	}
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return nil, unusable(dir, err)
	}
	if err := f.take(); err != nil {
		return nil, errors.Join(err, f.Close())
	}
	return f, nil
}

func (f *Folder) take() error {
	var err error
	// A foreign folder must stay as it is: look before the lock makes a file.
	known, err := recognize(f.dir)
	if err != nil {
		return err
	}
	if f.lock, err = hold(f.dir); err != nil {
		return err
	}
	if known {
		if f.standing, err = compare(f.dir, f.origin); err != nil {
			return err
		}
	}
	if f.standing == Finished {
		return nil
	}
	f.taken = true
	if err := errors.Join(atomicfile.RemoveLeftovers(f.dir), os.RemoveAll(f.ScratchPath())); err != nil {
		return unusable(f.dir, err)
	}
	// The hash goes first: a folder with a model but no hash could not be told
	// from another's.
	if err := f.SetStatus(Status{Phase: Starting}); err != nil {
		return unusable(f.dir, err)
	}
	if f.standing == Empty || !exists(f.path(ModelFile)) {
		if err := write(f.path(ModelFile), f.origin.Text); err != nil {
			return unusable(f.dir, err)
		}
	}
	return nil
}

// Close gives the folder free for others.
func (f *Folder) Close() error {
	var errs []error
	if f.log != nil {
		errs = append(errs, f.log.Close())
		f.log = nil
	}
	if f.taken {
		errs = append(errs, os.RemoveAll(f.ScratchPath()))
	}
	errs = append(errs, release(f.lock))
	f.lock, f.taken = nil, false
	return errors.Join(errs...)
}

// Dir returns the folder's path.
func (f *Folder) Dir() string { return f.dir }

// Standing returns what Open found.
func (f *Folder) Standing() Standing { return f.standing }

// Moved returns where Fresh moved the folder that was there, or "".
func (f *Folder) Moved() string { return f.moved }

func (f *Folder) path(name string) string { return filepath.Join(f.dir, name) }

// StatePath returns the path of the file of state k, from 0.
func (f *Folder) StatePath(k int) string { return StatePath(f.dir, k) }

// StatePath returns the path of the file of state k of the folder dir.
func StatePath(dir string, k int) string {
	return filepath.Join(dir, fmt.Sprintf("state-%d.npz", k))
}

// Checkpoint returns the path of the checkpoint folder, which it creates.
func (f *Folder) Checkpoint() (string, error) {
	dir := f.path(CheckpointName)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return "", unusable(f.dir, err)
	}
	return dir, nil
}

// ScratchPath returns the path of the folder for what a run cannot hold in memory, which the run makes. What a killed run left there is
// gone once the folder is opened.
func (f *Folder) ScratchPath() string { return f.path(scratchName) }

// DropCheckpoint removes the checkpoint, once the results are written.
func (f *Folder) DropCheckpoint() error {
	if !exists(f.path(ResultFile)) {
		return fmt.Errorf("%s: the checkpoint stays until the results are written", f.dir)
	}
	return os.RemoveAll(f.path(CheckpointName))
}

// moveAside renames a run folder to the first free name "NAME.old-1",
// "NAME.old-2", ..., keeping the ending .run, and returns the new name; ""
// if there was none.
func moveAside(dir string) (string, error) {
	if !exists(dir) {
		return "", nil
	}
	known, err := recognize(dir)
	if err != nil || !known {
		return "", err // an empty folder is fresh as it is
	}
	lock, err := hold(dir)
	if err != nil {
		return "", err
	}
	stem, isRun := strings.CutSuffix(dir, ".run")
	for n := 1; ; n++ {
		to := fmt.Sprintf("%s.old-%d", stem, n)
		if isRun {
			to += ".run"
		}
		if exists(to) {
			continue
		}
		if err := os.Rename(dir, to); err != nil {
			return "", errors.Join(unusable(dir, err), release(lock))
		}
		return to, release(lock)
	}
}

// recognize tells a run folder (true) from an empty one (false); anything else
// is an error. Names with a dot in front do not count.
func recognize(dir string) (bool, error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return false, unusable(dir, err)
	}
	stranger := ""
	for _, e := range entries {
		switch name := e.Name(); {
		case name == ModelFile || name == StatusFile:
			return true, nil
		case name[0] != '.' && stranger == "":
			stranger = name
		}
	}
	if stranger != "" {
		return false, fmt.Errorf("%s is no run folder: it holds %q but no %s; choose another with --out", dir, stranger, ModelFile)
	}
	return false, nil
}

// hold locks a folder; nil where the file system has no locks, which are a
// guard against mistakes only.
func hold(dir string) (*atomicfile.Lock, error) {
	lock, err := atomicfile.Acquire(filepath.Join(dir, lockFile))
	var held *atomicfile.HeldError
	switch {
	case errors.As(err, &held):
		by := held.Holder
		if by == "" {
			by = "another process"
		}
		return nil, fmt.Errorf("run folder %s is in use by %s; wait until it has ended, or choose another folder with --out", dir, by)
	case errors.Is(err, errors.ErrUnsupported):
		return nil, nil
	case err != nil:
		return nil, unusable(dir, err)
	}
	return lock, nil
}

func release(lock *atomicfile.Lock) error {
	if lock == nil {
		return nil
	}
	return lock.Release()
}

func exists(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}

// unusable words a failure of the file system with a way out.
func unusable(dir string, err error) error {
	var pathError *fs.PathError
	if errors.As(err, &pathError) && pathError.Path == dir {
		err = pathError.Err
	}
	return fmt.Errorf("run folder %s: %w; existing results are intact; free the place or choose another folder with --out", dir, err)
}

func write(path string, data []byte) error {
	return atomicfile.Write(path, 0o666, func(w io.Writer) error {
		_, err := w.Write(data)
		return err
	})
}
