package mps

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"rundle/mps/block"
)

// sector is a charge that a bond may carry: how many configurations lead to it from either side, counted up to a cap, and the
// logarithm of their full number.
type sector struct {
	charge            block.Charge
	left, right       int
	logLeft, logRight float64
}

// layer holds the charges of one bond, increasing.
type layer []sector

func (l layer) find(q block.Charge) (int, bool) {
	return slices.BinarySearchFunc(l, q, func(s sector, q block.Charge) int { return s.charge.Compare(q) })
}

// sectorLayers returns for each of the len(axes)+1 bonds the charges that lie on a configuration of total charge total. Counts stop at
// limit. Of more than width charges on a bond only those nearest to the even share of the total are followed. It is an
// error if nothing is left.
func sectorLayers(g block.Group, axes []block.Axis, total block.Charge, limit, width int) ([]layer, error) {
	n := len(axes)
	share := newShare(g, axes, total)
	layers := make([]layer, n+1)
	layers[0] = layer{{left: 1}}
	narrowed := false
	for i, a := range axes {
		next := grow(g, layers[i], a, limit)
		if len(next) > width {
			next, narrowed = share.nearest(next, i+1, width), true
		}
		layers[i+1] = next
	}
	at, ok := layers[n].find(total)
	if !ok {
		if narrowed {
			return nil, fmt.Errorf("mps: no way found through the charges to the total %v; start from a product state", total)
		}
		return nil, fmt.Errorf("mps: the %d sites cannot hold the total charge %v", n, total)
	}
	layers[n] = layers[n][at : at+1]
	layers[n][0].right = 1
	for i := n - 1; i >= 0; i-- {
		layers[i] = back(g, layers[i], axes[i], layers[i+1], limit)
	}
	return layers, nil
}

// grow counts the configurations one site further.
func grow(g block.Group, from layer, a block.Axis, limit int) layer {
	index := make(map[block.Charge]int)
	var next layer
	for _, s := range from {
		for _, x := range a.Sectors {
			q := g.Add(s.charge, x.Charge)
			k, ok := index[q]
			if !ok {
				k = len(next)
				index[q] = k
				next = append(next, sector{charge: q, logLeft: math.Inf(-1)})
			}
			t := &next[k]
			t.left = capped(t.left, s.left, x.Dim, limit)
			t.logLeft = logSum(t.logLeft, s.logLeft+math.Log(float64(x.Dim)))
		}
	}
	slices.SortFunc(next, func(x, y sector) int { return x.charge.Compare(y.charge) })
	return next
}

// back keeps the charges from which the next layer is reached and counts the configurations on the right.
func back(g block.Group, from layer, a block.Axis, next layer, limit int) layer {
	keep := from[:0]
	for _, s := range from {
		s.logRight = math.Inf(-1)
		for _, x := range a.Sectors {
			if k, ok := next.find(g.Add(s.charge, x.Charge)); ok {
				s.right = capped(s.right, next[k].right, x.Dim, limit)
				s.logRight = logSum(s.logRight, next[k].logRight+math.Log(float64(x.Dim)))
			}
		}
		if s.right > 0 {
			keep = append(keep, s)
		}
	}
	return keep
}

// capped returns min(limit, n + a*b) for positive a, b without overflow.
func capped(n, a, b, limit int) int {
	if a > (limit-n)/b {
		return limit
	}
	return n + a*b
}

// logSum returns ln(e^a + e^b).
func logSum(a, b float64) float64 {
	if a < b {
		a, b = b, a
	}
	if math.IsInf(b, -1) {
		return a
	}
	return a + math.Log1p(math.Exp(b-a))
}

// share is the line of even filling: between the least and the largest charge that the first i sites can have, always at the
// fraction where the total lies for all sites.
type share struct {
	g        block.Group
	low, top [][block.MaxCharges]float64
	fraction [block.MaxCharges]float64
}

func newShare(g block.Group, axes []block.Axis, total block.Charge) share {
	s := share{g: g, low: make([][block.MaxCharges]float64, len(axes)+1), top: make([][block.MaxCharges]float64, len(axes)+1)}
	for i, a := range axes {
		for k := range s.fraction {
			low, top := math.Inf(1), math.Inf(-1)
			for _, x := range a.Sectors {
				low, top = min(low, float64(x.Charge[k])), max(top, float64(x.Charge[k]))
			}
			s.low[i+1][k], s.top[i+1][k] = s.low[i][k]+low, s.top[i][k]+top
		}
	}
	last := len(axes)
	for k := range s.fraction {
		if d := s.top[last][k] - s.low[last][k]; d > 0 {
			s.fraction[k] = (float64(total[k]) - s.low[last][k]) / d
		}
	}
	return s
}

// nearest returns the width charges of bond i next to the line. Charges that count modulo q are all equally near.
func (s share) nearest(l layer, i, width int) layer {
	distance := func(x sector) float64 {
		d := 0.0
		for k := range s.g.Len() {
			if s.g.Rule(k).Modulus == 0 {
				line := s.low[i][k] + s.fraction[k]*(s.top[i][k]-s.low[i][k])
				d += (float64(x.charge[k]) - line) * (float64(x.charge[k]) - line)
			}
		}
		return d
	}
	slices.SortStableFunc(l, func(x, y sector) int { return cmp.Compare(distance(x), distance(y)) })
	l = l[:width]
	slices.SortFunc(l, func(x, y sector) int { return x.charge.Compare(y.charge) })
	return l
}

// weights returns the part of all configurations that pass through each charge of a bond, up to a common factor.
func (l layer) weights() []float64 {
	p := make([]float64, len(l))
	top := math.Inf(-1)
	for _, s := range l {
		top = max(top, s.logLeft+s.logRight)
	}
	for i, s := range l {
		p[i] = math.Exp(s.logLeft + s.logRight - top)
	}
	return p
}

// bondSectors shares bond states among the charges of each layer in proportion to their weights, none more than either side can
// fill. One path of likely charges always keeps a state, so that the chain does not fall apart.
func bondSectors(g block.Group, axes []block.Axis, layers []layer, bond int) []block.Axis {
	out := make([]block.Axis, len(layers))
	at := 0 // the path
	for i, l := range layers {
		p := l.weights()
		if i > 0 {
			at = follow(g, layers[i-1][at].charge, axes[i-1], l, p)
		}
		most := make([]int, len(l))
		for k, s := range l {
			most[k] = min(s.left, s.right)
		}
		dims := divide(p, most, at, bond)
		sectors := make([]block.Sector, len(l))
		for k, s := range l {
			sectors[k] = block.Sector{Charge: s.charge, Dim: dims[k]}
		}
		out[i] = block.NewAxis(block.In, sectors...)
	}
	return out
}

// follow returns the likeliest charge of the layer that the site leads to from q.
func follow(g block.Group, q block.Charge, a block.Axis, l layer, p []float64) int {
	best := -1
	for _, x := range a.Sectors {
		if k, ok := l.find(g.Add(q, x.Charge)); ok && (best < 0 || p[k] > p[best]) {
			best = k
		}
	}
	return best
}

// divide hands out bond seats in proportion to p with at most most[i] for i and at least one for must: the method of d'Hondt, each
// seat worth the same weight t, which is found by bisection.
func divide(p []float64, most []int, must, bond int) []int {
	dims := make([]int, len(p))
	fill := func(t float64) (sum int) {
		for i := range dims {
			dims[i] = most[i]
			if seats := p[i] / t; seats < float64(most[i]) {
				dims[i] = int(seats)
			}
			if i == must {
				dims[i] = max(dims[i], 1)
			}
			sum += dims[i]
		}
		return sum
	}
	total := 0
	for _, m := range most {
		total = min(bond, total+m)
	}
	low, top := -800.0, 1.0 // ln t; exp(-800) is zero: everyone gets all
	for range 100 {
		mid := (low + top) / 2
		if fill(math.Exp(mid)) > bond {
			low = mid
		} else {
			top = mid
		}
	}
	sum := fill(math.Exp(top))
	// Ties may leave seats over.
	order := make([]int, len(p))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(p[j], p[i]) })
	for sum < total {
		for _, i := range order {
			if sum < total && dims[i] < most[i] {
				dims[i]++
				sum++
			}
		}
	}
	return dims
}
