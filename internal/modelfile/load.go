package modelfile

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"slices"

	"rundle/mpo/ladder"
)

// MaxSize is the largest model file in bytes.
const MaxSize = 16 << 20

// Load reads and checks a model file.
func Load(file string) (*Model, error) {
	f, err := os.Open(file)
	if err != nil {
		return nil, unreadable(file, err)
	}
	defer f.Close()
	data, err := io.ReadAll(io.LimitReader(f, MaxSize+1))
	if err != nil {
		return nil, unreadable(file, err)
	}
	return Parse(file, data)
}

func unreadable(file string, err error) error {
	var p *fs.PathError
	if errors.As(err, &p) {
		err = p.Err
	}
	return fmt.Errorf("%s: cannot read the model file: %w", file, err)
}

// Parse checks the text of a model file; errors call it by the name file. The model keeps data.
func Parse(file string, data []byte) (*Model, error) {
	if len(data) > MaxSize {
		return nil, fmt.Errorf("%s: larger than %d MiB; expected a model file in TOML", file, MaxSize>>20)
	}
	src := newSource(file, bytes.TrimPrefix(data, []byte("\ufeff"))) // some editors begin a file with this mark
	root := parse(src)
	if root == nil || len(src.faults) > 0 {
		return nil, src.err()
	}
	r := &reader{
		section: section{source: src, table: root},
		model:   &Model{File: file, Source: data},
		names:   map[string]*entry{},
	}
	r.read()
	if err := src.err(); err != nil {
		return nil, err
	}
	return r.model, nil
}

// reader goes through the sections in the order in which they build on each other. Each part is checked as far as the parts before it
// are sound, so that one run reports as much as it can.
type reader struct {
	section
	model     *Model
	names     map[string]*entry // constants and profiles, which share one set of names
	constants ladder.Constants
	profiles  []ladder.Profile
	terms     []term
	observed  []observed
}

func (r *reader) read() {
	if e := r.lookup("title"); e != nil {
		r.model.Title, _ = r.text(e)
	}
	r.readLadder()
	r.readScope()
	r.readTerms()
	r.readSolve()
	r.readSector()
	r.readObserve()
	r.refuseUnknown()
	if len(r.faults) > 0 {
		return
	}
	r.buildHamiltonian()
	if len(r.faults) > 0 {
		return
	}
	r.checkObserve()
	r.checkSector()
	if len(r.faults) == 0 {
		r.describe()
	}
}

// later names sections of the design that this version does not read.
var later = map[string]string{
	"basis":  "write the Hamiltonian in the modes that it is to be solved in",
	"survey": "remove it to solve the model as it stands",
}

// refuseUnknown notes what the top level holds beside the sections.
func (r *reader) refuseUnknown() {
	for _, e := range r.table.entries {
		out, planned := later[e.key]
		switch {
		case slices.Contains(sections, e.key):
		case planned:
			r.fault(e.value.at, out, "section %q is not supported by this version", e.key)
		case e.value.kind == group || e.value.appended:
			r.fault(e.value.at, hint(e.key, "sections", sections[1:]), "unknown section %q", e.key)
		default:
			r.fault(e.at, hint(e.key, "before the first section", sections[:1]), "unknown key %q", e.key)
		}
	}
}
