package dmrg

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"os"

	"rundle/internal/atomicfile"
	"rundle/internal/npz"
	"rundle/mps"
	"rundle/mps/block"
)

// waypointFormat names the layout of a waypoint's file: the arrays of a chain as in state files, and the metadata of waypointMeta.
const waypointFormat = "rundle-waypoint/1"

// waypointMeta is the metadata array of a waypoint's file.
type waypointMeta struct {
	Format  string          `json:"format"`
	Complex bool            `json:"complex"`
	Sites   int             `json:"sites"`
	Center  int             `json:"center"`
	Group   block.Group     `json:"group"`
	Sweeps  int             `json:"sweeps"`
	Stages  int             `json:"stages"`
	Journal json.RawMessage `json:"journal"`
	Note    string          `json:"note"`
	Digest  uint32          `json:"digest"` // npz.Digest of all arrays but this one
}

const waypointMetaName = "meta"

// Save writes the waypoint to an .npz file, with a note of the caller's, replacing one that is there only when all is safely written.
func (w *Waypoint) Save(path, note string) error {
	return atomicfile.Write(path, 0o644, func(to io.Writer) error { return w.encode(to, note) })
}

func (w *Waypoint) encode(to io.Writer, note string) error {
	out := npz.NewWriter(to)
	m := waypointMeta{Format: waypointFormat, Complex: w.complex != nil, Sweeps: w.Sweeps, Stages: w.Stages, Journal: w.journal, Note: note}
	var err error
	if w.complex != nil {
		m.Sites, m.Center, m.Group = w.complex.Len(), w.complex.Center, w.complex.Group
		err = mps.WriteChain(out, "", w.complex)
	} else {
		m.Sites, m.Center, m.Group = w.real.Len(), w.real.Center, w.real.Group
		err = mps.WriteChain(out, "", w.real)
	}
	if err != nil {
		return err
	}
	m.Digest = out.Digest()
	text, err := json.Marshal(m)
	if err != nil {
		return err
	}
	if err := out.WriteText(waypointMetaName, string(text)); err != nil {
		return err
	}
	return out.Close()
}

// LoadWaypoint reads what Save wrote, with its note. The error is ErrDeparted where another version of the program wrote it.
func LoadWaypoint(path string) (w *Waypoint, note string, err error) {
	r, err := npz.Open(path)
	if errors.Is(err, os.ErrNotExist) || errors.Is(err, os.ErrPermission) {
		return nil, "", err
	}
	if err != nil {
		return nil, "", fmt.Errorf("%w; expected a waypoint (.npz) of this program", err)
	}
	defer r.Close()
	if w, note, err = decodeWaypoint(r); err != nil {
		return nil, "", fmt.Errorf("%s: %w", path, err)
	}
	return w, note, nil
}

func decodeWaypoint(r *npz.Reader) (*Waypoint, string, error) {
	text, err := r.ReadText(waypointMetaName)
	if err != nil {
		return nil, "", err
	}
	var head struct {
		Format string `json:"format"`
	}
	if err := json.Unmarshal([]byte(text), &head); err != nil {
		return nil, "", fmt.Errorf("array %q is not the metadata of a waypoint: %w", waypointMetaName, err)
	}
	if head.Format != waypointFormat {
		return nil, "", fmt.Errorf("%w: its format is %q; this version reads %q", ErrDeparted, head.Format, waypointFormat)
	}
	var m waypointMeta
	if err := json.Unmarshal([]byte(text), &m); err != nil {
		return nil, "", fmt.Errorf("metadata: %w", err)
	}
	if m.Sites < 1 {
		return nil, "", fmt.Errorf("metadata: %d sites; expected at least 1", m.Sites)
	}
	if m.Digest != r.Digest(waypointMetaName) {
		return nil, "", errors.New("its arrays are not those it was saved with")
	}
	w := &Waypoint{Sweeps: m.Sweeps, Stages: m.Stages, journal: m.Journal}
	if m.Complex {
		w.complex, err = mps.ReadChain[complex128](r, "", m.Group, m.Sites, m.Center)
	} else {
		w.real, err = mps.ReadChain[float64](r, "", m.Group, m.Sites, m.Center)
	}
	return w, m.Note, err
}
