package block

import (
	"cmp"
	"fmt"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/task"
)

// ContractPlan is a planned contraction of two structures: GEMM tasks on offsets into the slabs, in chains of which each
// writes its own part of the result. It is immutable and may be run many times, by several goroutines at once.
type ContractPlan struct {
	A, B *Structure
	Out  *Structure // free axes of A, then of B; total the sum

	permuteA, permuteB *PermutePlan // nil: used as stored
	opA, opB           dense.Op
	gemms              []gemm
	chains             []chain // largest first
	empty              []int   // blocks of Out that get no contribution
	flops              float64
}

// gemm multiplies an m×k by a k×n matrix at offsets a and b into the matrix at offset c.
type gemm struct{ a, b, c, m, n, k, lda, ldb, ldc int }

func (g *gemm) flops() float64 { return 2 * float64(g.m) * float64(g.n) * float64(g.k) }

// chain is a stretch of gemms that share a result: the first overwrites it, the others add.
type chain struct{ from, to int }

// side is one operand as the plan uses it: stored or permuted, with its free and contracted axes.
type side struct {
	s                *Structure
	permute          *PermutePlan
	op               dense.Op
	free, contracted []int
}

// PlanContract plans the sum over pairs of axes, axesA[i] of a with axesB[i] of b. Paired axes need equal sectors and
// opposite flow.
func PlanContract(a, b *Structure, axesA, axesB []int) *ContractPlan {
	mustPair(a, b, axesA, axesB)
	sa, sb := chooseSides(a, b, axesA, axesB)
	axes := make([]Axis, 0, len(sa.free)+len(sb.free))
	for _, k := range sa.free {
		axes = append(axes, sa.s.Axes[k])
	}
	for _, k := range sb.free {
		axes = append(axes, sb.s.Axes[k])
	}
	p := &ContractPlan{A: a, B: b, Out: NewStructure(a.Group, axes, a.Group.Add(a.Total, b.Total)),
		permuteA: sa.permute, permuteB: sb.permute, opA: sa.op, opB: sb.op}
	p.build(p.pair(sa, sb))
	return p
}

func mustPair(a, b *Structure, axesA, axesB []int) {
	fail := func(why string) {
		panic(fmt.Sprintf("block: contraction of axes %v of %v with axes %v of %v: %s", axesA, a, axesB, b, why))
	}
	if a.Group != b.Group {
		fail("different groups")
	}
	if len(axesA) != len(axesB) {
		fail("different numbers of axes")
	}
	for i, k := range axesA {
		l := axesB[i]
		if k < 0 || k >= len(a.Axes) || l < 0 || l >= len(b.Axes) {
			fail(fmt.Sprintf("pair %d: no such axis", i))
		}
		if slices.Contains(axesA[:i], k) || slices.Contains(axesB[:i], l) {
			fail(fmt.Sprintf("pair %d: axis named twice", i))
		}
		if !a.Axes[k].Equal(b.Axes[l].Reversed()) {
			fail(fmt.Sprintf("pair %d: axis %v does not pair with %v", i, a.Axes[k], b.Axes[l]))
		}
	}
	if free := len(a.Axes) + len(b.Axes) - 2*len(axesA); free > MaxAxes {
		fail(fmt.Sprintf("the result has %d axes, at most %d are supported", free, MaxAxes))
	}
}

// chooseSides orders the pairs by the axes of a or of b, whichever moves fewer elements into GEMM order.
func chooseSides(a, b *Structure, axesA, axesB []int) (side, side) {
	var best [2]side
	cost := -1
	for _, by := range [2][]int{axesA, axesB} {
		order := make([]int, len(by))
		for i := range order {
			order[i] = i
		}
		slices.SortFunc(order, func(i, j int) int { return cmp.Compare(by[i], by[j]) })
		sa, sb := newSide(a, pick(axesA, order)), newSide(b, pick(axesB, order))
		directA, directB := sa.direct(dense.Trans, dense.NoTrans), sb.direct(dense.NoTrans, dense.Trans)
		moved := 0
		if !directA {
			moved += a.Size
		}
		if !directB {
			moved += b.Size
		}
		if cost < 0 || moved < cost {
			cost, best = moved, [2]side{sa, sb}
		}
	}
	best[0].settle(false)
	best[1].settle(true)
	return best[0], best[1]
}

func pick(x, order []int) []int {
	y := make([]int, len(order))
	for i, j := range order {
		y[i] = x[j]
	}
	return y
}

func newSide(s *Structure, contracted []int) side {
	d := side{s: s, contracted: contracted}
	for k := range s.Axes {
		if !slices.Contains(contracted, k) {
			d.free = append(d.free, k)
		}
	}
	return d
}

// direct reports whether the blocks are matrices as stored, and sets the op for contracted axes that lead or trail, in order.
func (d *side) direct(leads, trails dense.Op) bool {
	lead, trail := true, true
	for i, k := range d.contracted {
		lead = lead && k == i
		trail = trail && k == len(d.free)+i
	}
	switch {
	case lead && trail:
		d.op = dense.NoTrans
	case lead:
		d.op = leads
	case trail:
		d.op = trails
	}
	return lead || trail
}

// settle plans the permutation of an operand that is not direct: contracted axes first if lead, else last.
func (d *side) settle(lead bool) {
	leads, trails := dense.Trans, dense.NoTrans
	if lead {
		leads, trails = trails, leads
	}
	if d.direct(leads, trails) {
		return
	}
	order := slices.Concat(d.free, d.contracted)
	at := len(d.free)
	if lead {
		order = slices.Concat(d.contracted, d.free)
		at = 0
	}
	d.permute = PlanPermute(d.s, order...)
	d.s, d.op = d.permute.Out, dense.NoTrans
	for i := range d.contracted {
		d.contracted[i] = at + i
	}
	for i := range d.free {
		d.free[i] = (at+len(d.contracted))%len(order) + i
	}
}

// matrix returns the sizes of block i as a matrix of free by contracted states.
func (d *side) matrix(b *Block) (free, contracted int) {
	free, contracted = 1, 1
	for _, k := range d.free {
		free *= b.Shape[k]
	}
	for _, k := range d.contracted {
		contracted *= b.Shape[k]
	}
	return free, contracted
}

// pair lists the products of blocks with equal contracted sectors, in the order of the blocks of Out to which they add, and where
// the stretch of each block of Out begins.
func (p *ContractPlan) pair(sa, sb side) (sorted []gemm, start []int) {
	key := func(d *side, b *Block) (c [MaxAxes]int32) {
		for i, k := range d.contracted {
			c[i] = int32(b.Sectors[k])
		}
		return c
	}
	partners := make(map[[MaxAxes]int32][]int, len(sb.s.Blocks))
	for j := range sb.s.Blocks {
		k := key(&sb, &sb.s.Blocks[j])
		partners[k] = append(partners[k], j)
	}
	var products []gemm
	var target []int
	start = make([]int, len(p.Out.Blocks)+1)
	var sectors [MaxAxes]int
	for i := range sa.s.Blocks {
		x := &sa.s.Blocks[i]
		for f, k := range sa.free {
			sectors[f] = x.Sectors[k]
		}
		m, k := sa.matrix(x)
		for _, j := range partners[key(&sa, x)] {
			y := &sb.s.Blocks[j]
			for f, l := range sb.free {
				sectors[len(sa.free)+f] = y.Sectors[l]
			}
			to, ok := p.Out.Find(sectors[:len(p.Out.Axes)]...)
			if !ok {
				panic(fmt.Sprintf("block: no result block at %v of %v for %v and %v", sectors[:len(p.Out.Axes)], p.Out, p.A, p.B))
			}
			n, _ := sb.matrix(y)
			g := gemm{a: x.Offset, b: y.Offset, c: p.Out.Blocks[to].Offset, m: m, n: n, k: k, lda: k, ldb: n, ldc: n}
			if sa.op == dense.Trans {
				g.lda = m
			}
			if sb.op == dense.Trans {
				g.ldb = k
			}
			products = append(products, g)
			target = append(target, to)
			start[to+1]++
		}
	}
	for to := range p.Out.Blocks {
		start[to+1] += start[to]
	}
	sorted = make([]gemm, len(products))
	next := slices.Clone(start)
	for i, to := range target {
		sorted[next[to]] = products[i]
		next[to]++
	}
	return sorted, start
}

// A chain is split along the longer side of its result when it is worth several tasks, so that a tensor of few large blocks
// keeps more than one thread busy. The rule looks at sizes only: results do not depend on the number of threads.
const (
	splitFlops = 3e7 // least work of a part
	splitWidth = 64  // least width of a part
	splitParts = 8   // most parts
)

// build splits the chains and stores them, largest first.
func (p *ContractPlan) build(sorted []gemm, start []int) {
	gemms := make([]gemm, 0, len(sorted))
	chains := make([]chain, 0, len(start))
	work := make([]float64, 0, len(start))
	for to := range p.Out.Blocks {
		list := sorted[start[to]:start[to+1]]
		if len(list) == 0 {
			p.empty = append(p.empty, to)
			continue
		}
		total := 0.0
		for i := range list {
			total += list[i].flops()
		}
		p.flops += total
		long := max(list[0].m, list[0].n)
		parts := max(1, min(splitParts, int(total/splitFlops), long/splitWidth))
		for part := range parts {
			from, to := part*long/parts, (part+1)*long/parts
			chains = append(chains, chain{len(gemms), len(gemms) + len(list)})
			work = append(work, total/float64(parts))
			for _, g := range list {
				gemms = append(gemms, p.part(g, from, to))
			}
		}
	}
	p.gemms, p.chains = make([]gemm, 0, len(gemms)), make([]chain, 0, len(chains))
	for _, i := range task.ByWork(work) {
		c := chains[i]
		at := len(p.gemms)
		p.gemms = append(p.gemms, gemms[c.from:c.to]...)
		p.chains = append(p.chains, chain{at, len(p.gemms)})
	}
}

// part restricts g to the rows (or, if there are more, the columns) from..to-1 of its result.
func (p *ContractPlan) part(g gemm, from, to int) gemm {
	if g.m >= g.n {
		if g.m = to - from; p.opA == dense.Trans {
			g.a += from
		} else {
			g.a += from * g.lda
		}
		g.c += from * g.ldc
		return g
	}
	if g.n = to - from; p.opB == dense.Trans {
		g.b += from * g.ldb
	} else {
		g.b += from
	}
	g.c += from
	return g
}

// Flops returns the real operations of one run with real numbers; complex numbers take four times as many.
func (p *ContractPlan) Flops() float64 { return p.flops }

// RunContract overwrites dst, a slab of p.Out, with the contraction of the slabs a of p.A and b of p.B. dst must not overlap
// them. ws may be nil.
func RunContract[T dense.Scalar](p *ContractPlan, dst, a, b []T, ws *Scratch[T], pool *task.Pool) {
	mustFit("contraction, first operand", p.A, a)
	mustFit("contraction, second operand", p.B, b)
	mustFit("contraction, result", p.Out, dst)
	if ws == nil {
		ws = new(Scratch[T])
	}
	r := &ws.run
	if p.permuteA != nil {
		x := ws.Take(p.permuteA.Out.Size)
		r.permute(p.permuteA, x, a, pool)
		defer ws.Give(x)
		a = x
	}
	if p.permuteB != nil {
		x := ws.Take(p.permuteB.Out.Size)
		r.permute(p.permuteB, x, b, pool)
		defer ws.Give(x)
		b = x
	}
	r.contract(p, dst, a, b, pool)
}

// Contract returns the sum over pairs of axes, axesA[i] of a with axesB[i] of b: free axes of a, then those of b. With no pairs
// it is the outer product.
func Contract[T dense.Scalar](a, b *Tensor[T], axesA, axesB []int) *Tensor[T] {
	p := PlanContract(a.Structure, b.Structure, axesA, axesB)
	out := New[T](p.Out)
	RunContract(p, out.Data, a.Data, b.Data, nil, nil)
	return out
}
