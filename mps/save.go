package mps

import (
	"encoding/json"
	"fmt"
	"io"

	"rundle/internal/atomicfile"
	"rundle/internal/dense"
	"rundle/internal/npz"
	"rundle/mpo/ladder"
	"rundle/mps/block"
)

// format names the layout that the package comment describes.
const format = "rundle-state/1"

// meta is the metadata array of a state file.
type meta struct {
	Format     string         `json:"format"`
	Arithmetic string         `json:"arithmetic"`
	Sites      int            `json:"sites"`
	Center     int            `json:"center"`
	Group      block.Group    `json:"group"`
	Frames     *ladder.Frames `json:"frames"`
	Scope      *ladder.Scope  `json:"scope"`
	Digest     uint32         `json:"digest"` // npz.Digest of all arrays but this one
}

const metaName = "meta"

func bondName(i int) string     { return fmt.Sprintf("bond_%04d", i) }
func axisName(i int) string     { return fmt.Sprintf("site_%04d/axis", i) }
func blocksName(i int) string   { return fmt.Sprintf("site_%04d/blocks", i) }
func blockName(i, k int) string { return fmt.Sprintf("site_%04d/block_%04d", i, k) }
func arithmetic(cplx bool) string {
	if cplx {
		return "complex"
	}
	return "real"
}

// Save writes the state to an .npz file, replacing one that is there only when all is safely written. The package comment describes the
// layout. The same state gives the same bytes.
func (s *State) Save(path string) error {
	return atomicfile.Write(path, 0o644, s.encode)
}

func (s *State) encode(to io.Writer) error {
	w := npz.NewWriter(to)
	m := meta{Format: format, Arithmetic: arithmetic(s.complex != nil), Sites: s.Sites(), Frames: s.frames, Scope: s.scope}
	var err error
	if s.real != nil {
		m.Group, m.Center = s.real.Group, s.real.Center
		err = WriteChain(w, "", s.real)
	} else {
		m.Group, m.Center = s.complex.Group, s.complex.Center
		err = WriteChain(w, "", s.complex)
	}
	if err != nil {
		return err
	}
	m.Digest = w.Digest()
	text, err := json.Marshal(m)
	if err != nil {
		return fmt.Errorf("metadata of the state: %w", err)
	}
	if err := w.WriteText(metaName, string(text)); err != nil {
		return err
	}
	return w.Close()
}

// WriteChain writes the tensors of a chain as the arrays that the package comment describes, their names preceded by prefix. Group, number of
// sites and centre are left to the caller's metadata.
func WriteChain[T dense.Scalar](w *npz.Writer, prefix string, c *Chain[T]) error {
	if err := writeAxis(w, prefix+bondName(0), c.Group, c.Sites[0].Axes[0]); err != nil {
		return err
	}
	for i, t := range c.Sites {
		if err := writeAxis(w, prefix+axisName(i), c.Group, t.Axes[1]); err != nil {
			return err
		}
		if err := writeAxis(w, prefix+bondName(i+1), c.Group, t.Axes[2]); err != nil {
			return err
		}
		var rows []int64
		for _, b := range t.Blocks {
			for _, pos := range b.Sectors {
				rows = append(rows, int64(pos))
			}
		}
		if err := npz.Write(w, prefix+blocksName(i), []int{len(t.Blocks), 3}, rows); err != nil {
			return err
		}
		for k, b := range t.Blocks {
			if err := npz.Write(w, prefix+blockName(i, k), b.Shape, t.Block(k)); err != nil {
				return err
			}
		}
	}
	return nil
}

// writeAxis writes an axis as a table: a row for each sector, dimension first, then its charges.
func writeAxis(w *npz.Writer, name string, g block.Group, a block.Axis) error {
	var table []int64
	for _, s := range a.Sectors {
		table = append(table, int64(s.Dim))
		for k := range g.Len() {
			table = append(table, int64(s.Charge[k]))
		}
	}
	return npz.Write(w, name, []int{len(a.Sectors), 1 + g.Len()}, table)
}
