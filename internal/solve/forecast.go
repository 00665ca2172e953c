package solve

import (
	"slices"

	"rundle/internal/dense"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// Forecast is what a bond dimension will cost, about.
type Forecast struct {
	Bond         int     `json:"bond"`
	Memory       float64 `json:"memory_bytes"`      // of state and environments
	State        float64 `json:"state_bytes"`       // of it the state: what a checkpoint writes
	Environments float64 `json:"environment_bytes"` // of it the environments: what goes to disk under a cap on memory, but for a few
	Flops        float64 `json:"flops_per_sweep"`   // right and left, bond dimension settled
}

// forecastBonds are the bond dimensions looked at.
var forecastBonds = []int{100, 300, 1000, 3000}

// forecastWork bounds the forecast's own work, in charges visited: about two seconds.
const forecastWork = 2e7

// forecast counts elements and operations for states whose bonds are shared among the charges as the configurations are. largest is the
// cap that the model sets, 0 for none. It stops where the ladder has no more states, and on very long ladders after the first bond dimensions.
func forecast[T dense.Scalar](op *mpo.Operator[T], total block.Charge, largest int) ([]Forecast, error) {
	var all []Forecast
	list := forecastBonds
	if largest > 0 {
		list = append(slices.DeleteFunc(slices.Clone(list), func(b int) bool { return b >= largest }), largest)
	}
	last, work := 0, 0.0
	for i, bond := range list {
		work += float64(len(op.Phys)) * float64(max(512, 4*bond)) // the charges that ExpectedBonds follows
		if i > 0 && work > forecastWork {
			break
		}
		bonds, err := mps.ExpectedBonds(op.Group, op.Phys, total, bond)
		if err != nil {
			return nil, err
		}
		reached := 0
		for _, a := range bonds {
			reached = max(reached, a.Dim())
		}
		if reached == last {
			break
		}
		last = reached
		f := Forecast{Bond: reached}
		element, flop := 8.0, 2.0
		if dense.IsComplex[T]() {
			element, flop = 16, 8
		}
		for i := range op.Phys {
			f.State += element * siteSize(op, bonds, i)
			f.Environments += element * environmentSize(op, bonds, i) // left of the site or right of it, never both
		}
		f.Memory = f.State + f.Environments
		for i := range len(op.Phys) - 1 {
			f.Flops += 2 * flop * updateWork(op, bonds, i)
		}
		all = append(all, f)
	}
	return all, nil
}

// siteSize counts the elements of a site tensor.
func siteSize[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis, i int) float64 {
	var n float64
	for _, l := range bonds[i].Sectors {
		for _, s := range op.Phys[i].Sectors {
			n += float64(l.Dim) * float64(s.Dim) * dimAt(bonds[i+1], op.Group.Add(l.Charge, s.Charge))
		}
	}
	return n
}

// environmentSize counts the elements of the environment left of site i.
func environmentSize[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis, i int) float64 {
	var n float64
	for k, r := range environmentRows(op, bonds, i) {
		n += r * float64(bonds[i].Sectors[k].Dim)
	}
	return n
}

// environmentRows returns, for each sector of bond b, the elements of an environment for one state of it: MPO indices times states on the other side.
func environmentRows[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis, b int) []float64 {
	rows := make([]float64, len(bonds[b].Sectors))
	w := op.Bonds[b].Axis(block.In)
	for k, s := range bonds[b].Sectors {
		for _, q := range w.Sectors {
			rows[k] += float64(q.Dim) * dimAt(bonds[b], op.Group.Add(s.Charge, q.Charge))
		}
	}
	return rows
}

// updateProducts is about how many products with the effective Hamiltonian a bond update takes, environments included.
const updateProducts = 7

// svdWork is about the operations of a singular value decomposition of a square matrix in units of a product of two such.
const svdWork = 10

// updateWork counts the multiply-adds of the update of sites i and i+1: the products with the left and the right environment, which dominate the
// effective Hamiltonian, and the decomposition.
func updateWork[T dense.Scalar](op *mpo.Operator[T], bonds []block.Axis, i int) float64 {
	left, right := bonds[i], bonds[i+2]
	rowsLeft, rowsRight := environmentRows(op, bonds, i), environmentRows(op, bonds, i+2)
	var product, decomposition float64
	var middle cutMatrix
	for k, l := range left.Sectors {
		for _, s := range op.Phys[i].Sectors {
			q := op.Group.Add(l.Charge, s.Charge)
			middle.at(q)[0] += float64(l.Dim) * float64(s.Dim)
			for _, t := range op.Phys[i+1].Sectors {
				end := op.Group.Add(q, t.Charge)
				if at, ok := right.Find(end); ok {
					block := float64(l.Dim) * float64(s.Dim) * float64(t.Dim) * float64(right.Sectors[at].Dim)
					product += block * (rowsLeft[k] + rowsRight[at])
				}
			}
		}
	}
	for _, r := range right.Sectors {
		for _, t := range op.Phys[i+1].Sectors {
			middle.at(op.Group.Sub(r.Charge, t.Charge))[1] += float64(r.Dim) * float64(t.Dim)
		}
	}
	for _, m := range middle.sizes {
		decomposition += svdWork * m[0] * m[1] * min(m[0], m[1])
	}
	return updateProducts*product + decomposition
}

// cutMatrix holds rows and columns of each block of the matrix that a decomposition cuts, in order of appearance.
type cutMatrix struct {
	index map[block.Charge]int
	sizes [][2]float64
}

func (c *cutMatrix) at(q block.Charge) *[2]float64 {
	if c.index == nil {
		c.index = map[block.Charge]int{}
	}
	k, ok := c.index[q]
	if !ok {
		k = len(c.sizes)
		c.index[q] = k
		c.sizes = append(c.sizes, [2]float64{})
	}
	return &c.sizes[k]
}

func dimAt(a block.Axis, c block.Charge) float64 {
	if at, ok := a.Find(c); ok {
		return float64(a.Sectors[at].Dim)
	}
	return 0
}
