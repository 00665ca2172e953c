package mps

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/npz"
	"rundle/mps/block"
)

// Limits of what a state file may say, far above what a machine holds; they keep arithmetic on sizes from overflowing.
const (
	maxSectorDim = 1 << 20
	maxPairs     = 1 << 26 // sectors of the left bond × sectors of the site
)

// Load reads a state that Save wrote. Errors name the file and what is wrong with it.
func Load(path string) (*State, error) {
	r, err := npz.Open(path)
	if errors.Is(err, os.ErrNotExist) || errors.Is(err, os.ErrPermission) {
		return nil, err
	}
	if err != nil {
		return nil, fmt.Errorf("%w; expected a state file (.npz) of this program", err)
	}
	defer r.Close()
	s, err := decode(r)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return s, nil
}

// advice ends the messages about files that once were good.
const advice = "; restore the file from a copy or compute the state again"

func decode(r *npz.Reader) (*State, error) {
	if !r.Has(metaName) {
		return nil, fmt.Errorf("no array %q in it; expected a state file of this program", metaName)
	}
	text, err := r.ReadText(metaName)
	if err != nil {
		return nil, fmt.Errorf("%w%s", err, advice)
	}
	m, err := readMeta(text)
	if err != nil {
		return nil, err
	}
	if m.Digest != r.Digest(metaName) {
		return nil, errors.New("its arrays are not those it was saved with" + advice)
	}
	var s *State
	if m.Arithmetic == arithmetic(false) {
		s, err = decodeState[float64](r, m)
	} else {
		s, err = decodeState[complex128](r, m)
	}
	if err != nil {
		return nil, fmt.Errorf("%w%s", err, advice)
	}
	return s, nil
}

func readMeta(text string) (*meta, error) {
	var head struct {
		Format string `json:"format"`
	}
	if err := json.Unmarshal([]byte(text), &head); err != nil {
		return nil, fmt.Errorf("array %q is not the metadata of a state: %w", metaName, err)
	}
	if head.Format != format {
		return nil, fmt.Errorf("its format is %q; this version reads %q", head.Format, format)
	}
	var m meta
	if err := json.Unmarshal([]byte(text), &m); err != nil {
		return nil, fmt.Errorf("metadata: %w%s", err, advice)
	}
	switch {
	case m.Arithmetic != arithmetic(false) && m.Arithmetic != arithmetic(true):
		return nil, fmt.Errorf("metadata: arithmetic %q; expected \"real\" or \"complex\"", m.Arithmetic)
	case m.Sites < 1:
		return nil, fmt.Errorf("metadata: %d sites; expected at least 1", m.Sites)
	case m.Center < -1 || m.Center >= m.Sites:
		return nil, fmt.Errorf("metadata: orthogonality centre %d; expected -1 (unknown) to %d", m.Center, m.Sites-1)
	case m.Frames == nil || m.Scope == nil || m.Scope.Ladder() == nil:
		return nil, errors.New("metadata: frames or scope are missing")
	}
	return &m, nil
}

func decodeState[T dense.Scalar](r *npz.Reader, m *meta) (*State, error) {
	c, err := ReadChain[T](r, "", m.Group, m.Sites, m.Center)
	if err != nil {
		return nil, err
	}
	return newState(c, m.Frames, m.Scope)
}

// ReadChain reads what WriteChain wrote, to the bit. The centre is verified.
func ReadChain[T dense.Scalar](r *npz.Reader, prefix string, g block.Group, n, center int) (*Chain[T], error) {
	left, err := readAxis(r, prefix+bondName(0), g, block.In)
	if err != nil {
		return nil, err
	}
	var sites []*block.Tensor[T]
	for i := range n {
		site, err := readAxis(r, prefix+axisName(i), g, block.In)
		if err != nil {
			return nil, err
		}
		right, err := readAxis(r, prefix+bondName(i+1), g, block.Out)
		if err != nil {
			return nil, err
		}
		if len(left.Sectors)*len(site.Sectors) > maxPairs {
			return nil, fmt.Errorf("site %d has more combinations of charges than a state can have", i)
		}
		t, err := readSite[T](r, prefix, i, block.NewStructure(g, []block.Axis{left, site, right}, block.Charge{}))
		if err != nil {
			return nil, err
		}
		sites = append(sites, t)
		left = right.Reversed()
	}
	c, err := NewChain(g, sites)
	if err != nil {
		return nil, err
	}
	if center < -1 || center >= n {
		return nil, fmt.Errorf("orthogonality centre %d; expected -1 (unknown) to %d", center, n-1)
	}
	if c.Center = center; center >= 0 {
		if err := c.checkCenter(); err != nil {
			return nil, err
		}
	}
	return c, nil
}

// readAxis reads the table of an axis.
func readAxis(r *npz.Reader, name string, g block.Group, flow block.Flow) (block.Axis, error) {
	shape, table, err := npz.Read[int64](r, name)
	if err != nil {
		return block.Axis{}, err
	}
	columns := 1 + g.Len()
	if len(shape) != 2 || shape[0] == 0 || shape[1] != columns {
		return block.Axis{}, fmt.Errorf("array %q has shape %v; expected rows of a dimension and %d charges", name, shape, g.Len())
	}
	sectors := make([]block.Sector, shape[0])
	for i := range sectors {
		row := table[i*columns : (i+1)*columns]
		if row[0] < 1 || row[0] > maxSectorDim {
			return block.Axis{}, fmt.Errorf("array %q: row %d has dimension %d; expected 1 to %d", name, i, row[0], maxSectorDim)
		}
		var q block.Charge
		for k, x := range row[1:] {
			if x < math.MinInt32 || x > math.MaxInt32 {
				return block.Axis{}, fmt.Errorf("array %q: row %d has charge %d, which is too large", name, i, x)
			}
			q[k] = int32(x)
		}
		if g.Normalize(q) != q || i > 0 && sectors[i-1].Charge.Compare(q) >= 0 {
			return block.Axis{}, fmt.Errorf("array %q: row %d: charges are not in increasing order, or not reduced by their modulus", name, i)
		}
		sectors[i] = block.Sector{Charge: q, Dim: int(row[0])}
	}
	return block.NewAxis(flow, sectors...), nil
}

// readSite reads the blocks of a site. The slab is allocated when all blocks are there: sizes that were merely claimed cost nothing.
func readSite[T dense.Scalar](r *npz.Reader, prefix string, i int, s *block.Structure) (*block.Tensor[T], error) {
	shape, rows, err := npz.Read[int64](r, prefix+blocksName(i))
	if err != nil {
		return nil, err
	}
	if !slices.Equal(shape, []int{len(s.Blocks), 3}) {
		return nil, fmt.Errorf("array %q has shape %v; the charges allow %d blocks", blocksName(i), shape, len(s.Blocks))
	}
	blocks := make([][]T, len(s.Blocks))
	for k, b := range s.Blocks {
		for axis, pos := range b.Sectors {
			if rows[3*k+axis] != int64(pos) {
				return nil, fmt.Errorf("array %q: row %d is %v; expected %v", blocksName(i), k, rows[3*k:3*k+3], b.Sectors)
			}
		}
		shape, data, err := npz.Read[T](r, prefix+blockName(i, k))
		if err != nil {
			return nil, err
		}
		if !slices.Equal(shape, b.Shape) {
			return nil, fmt.Errorf("array %q has shape %v; its charges have dimensions %v", blockName(i, k), shape, b.Shape)
		}
		blocks[k] = data
	}
	t := block.New[T](s)
	for k, data := range blocks {
		copy(t.Block(k), data)
	}
	return t, nil
}

// checkCenter verifies the isometries on both sides of the centre on one random vector for each bond sector, V^H V x = x, which
// a matrix that is none fails with certainty but for rounding. The norm would be wrong otherwise.
func (c *Chain[T]) checkCenter() error {
	const tolerance = 1e-8
	rng := rand.New(rand.NewPCG(0, 0))
	for i, t := range c.Sites {
		var x, y *block.Tensor[T]
		switch {
		case i < c.Center:
			x = probe[T](c.Group, t.Axes[2].Reversed(), rng)
			y = block.Contract(t, x, []int{2}, []int{0})
			y = block.Contract(t.Conj(), y, []int{0, 1}, []int{0, 1})
		case i > c.Center:
			x = probe[T](c.Group, t.Axes[0].Reversed(), rng)
			y = block.Contract(t, x, []int{0}, []int{0})
			y = block.Contract(t.Conj(), y, []int{1, 2}, []int{0, 1})
		default:
			continue
		}
		y.Axpy(dense.FromFloat[T](-1), x)
		if !(y.Norm() <= tolerance*x.Norm()) {
			return fmt.Errorf("site %d is not canonical, although the metadata put the orthogonality centre at site %d", i, c.Center)
		}
	}
	return nil
}

// probe returns a random vector in each sector of an axis, as a tensor with a second axis of one state a sector.
func probe[T dense.Scalar](g block.Group, a block.Axis, rng *rand.Rand) *block.Tensor[T] {
	sectors := slices.Clone(a.Sectors)
	for i := range sectors {
		sectors[i].Dim = 1
	}
	return block.Random[T](block.NewStructure(g, []block.Axis{a, block.NewAxis(-a.Flow, sectors...)}, block.Charge{}), rng)
}
