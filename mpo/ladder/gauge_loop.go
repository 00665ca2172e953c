package ladder

import (
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"sort"
	"strings"
)

// Naming what forbids the real gauge. Moves of one or two labels by one step each are edges of a graph whose nodes are the labels with
// a sign (a pairing term turns the sign) and one ground node for single labels. A closed walk whose phase is no multiple of pi is an
// obstruction; the shortest one through a few well chosen roots is shown, found by breadth-first search.

// edge joins two nodes; the phase is added on the way from a to b.
type edge struct {
	from, to int32
	phase    float64
	move     int32
}

// moveGraph is the signed double cover: node 2v stands for +theta_v, 2v+1 for -theta_v, the last node for zero.
type moveGraph struct {
	out [][]edge
}

func newMoveGraph(variables int, moves []move) *moveGraph {
	g := &moveGraph{out: make([][]edge, 2*variables+1)}
	join := func(a, b int32, phase float64, m int) {
		g.out[a] = append(g.out[a], edge{a, b, phase, int32(m)})
		g.out[b] = append(g.out[b], edge{b, a, -phase, int32(m)})
	}
	ground := int32(2 * variables)
	for i, m := range moves {
		switch {
		case len(m.steps) == 1 && magnitude(int64(m.steps[0].n)) == 1:
			s := m.steps[0]
			join(node(s.at, s.n), ground, m.phase, i) // n theta + phase = 0
			join(node(s.at, -s.n), ground, -m.phase, i)
		case len(m.steps) == 2 && magnitude(int64(m.steps[0].n)) == 1 && magnitude(int64(m.steps[1].n)) == 1:
			a, b := m.steps[0], m.steps[1] // n_a theta_a + phase = -n_b theta_b
			join(node(a.at, a.n), node(b.at, -b.n), m.phase, i)
			join(node(a.at, -a.n), node(b.at, b.n), -m.phase, i)
		}
	}
	return g
}

func node(v, sign int32) int32 {
	if sign > 0 {
		return 2 * v
	}
	return 2*v + 1
}

// tree is a breadth-first tree from one root.
type tree struct {
	depth []int32 // -1: not reached
	angle []float64
	back  []edge // edge by which the node was reached
}

// loop is a contradictory closed walk: its moves in order, and the phase around it.
type loop struct {
	moves []int32
	phase float64
}

// search grows the tree from root and returns the shortest contradictory cycle it closes, shorter than limit; nil if there is none.
func (g *moveGraph) search(t *tree, root int32, limit int) *loop {
	var reached []int32
	defer func() {
		for _, v := range reached {
			t.depth[v] = -1
		}
	}()
	t.depth[root], t.angle[root] = 0, 0
	reached = append(reached, root)
	var best *loop
	for head := 0; head < len(reached); head++ {
		v := reached[head]
		if int(t.depth[v]) >= limit {
			break
		}
		for _, e := range g.out[v] {
			angle := t.angle[v] + e.phase
			if t.depth[e.to] < 0 {
				t.depth[e.to], t.angle[e.to], t.back[e.to] = t.depth[v]+1, angle, e
				reached = append(reached, e.to)
				continue
			}
			around := angle - t.angle[e.to]
			if p := (phase{around, angleTolerance * float64(t.depth[v]+t.depth[e.to]+1)}); p.vanishes() {
				continue
			}
			if cycle := t.cycle(e); len(cycle) < limit {
				best, limit = &loop{cycle, around}, len(cycle)
			}
		}
	}
	return best
}

// cycle lists the moves of the cycle that the edge closes, in order around it.
func (t *tree) cycle(e edge) []int32 {
	var left, right []int32
	a, b := e.from, e.to
	for a != b {
		if t.depth[a] >= t.depth[b] {
			left = append(left, t.back[a].move)
			a = t.back[a].from
		} else {
			right = append(right, t.back[b].move)
			b = t.back[b].from
		}
	}
	out := append([]int32{e.move}, right...)
	slices.Reverse(left)
	return append(out, left...)
}

// shortestLoop returns a short contradictory cycle, or nil.
func shortestLoop(variables int, moves []move) *loop {
	const rounds = 16 // improvements tried from the nodes of a cycle found before
	g := newMoveGraph(variables, moves)
	n := len(g.out)
	t := &tree{depth: make([]int32, n), angle: make([]float64, n), back: make([]edge, n)}
	for v := range t.depth {
		t.depth[v] = -1
	}
	var best *loop
	seen := make([]bool, n)
	for root := 0; root < n && best == nil; root++ {
		if !seen[root] && len(g.out[root]) > 0 {
			g.mark(seen, int32(root))
			best = g.search(t, int32(root), math.MaxInt32)
		}
	}
	for round := 0; best != nil && round < rounds; round++ {
		better := (*loop)(nil)
		for _, m := range best.moves[:min(len(best.moves), rounds)] {
			if better = g.search(t, node(moves[m].steps[0].at, 1), len(best.moves)); better != nil {
				break
			}
		}
		if better == nil {
			break
		}
		best = better
	}
	return best
}

// mark notes the nodes connected with root.
func (g *moveGraph) mark(seen []bool, root int32) {
	stack := []int32{root}
	seen[root] = true
	for len(stack) > 0 {
		v := stack[len(stack)-1]
		stack = stack[:len(stack)-1]
		for _, e := range g.out[v] {
			if !seen[e.to] {
				seen[e.to] = true
				stack = append(stack, e.to)
			}
		}
	}
}

// rivalry says that two terms (or one with itself) move the same labels with different phases.
func (x *expansion) rivalry(m move) string {
	if len(m.steps) == 0 || m.rival == m.term {
		return fmt.Sprintf("the term %s has a phase of %s that no change of phases of the sites alters",
			x.show(m.rival), inUnitsOfPi(cmplx.Phase(x.coef[m.rival])))
	}
	return fmt.Sprintf("the terms %s and %s move the same charges with phases that differ by %s",
		x.show(m.term), x.show(m.rival), inUnitsOfPi(cmplx.Phase(x.coef[m.term])-cmplx.Phase(x.coef[m.rival])))
}

// obstruction describes a short combination of terms whose phases cannot all be made real.
func (x *expansion) obstruction(moves []move) string {
	const shown = 6
	l := shortestLoop(x.lb.variables(), moves)
	if l == nil {
		l = contradiction(x.lb.variables(), moves)
	}
	if l == nil {
		return "the phases of several terms together contradict one another"
	}
	var parts []string
	for _, i := range l.moves {
		if len(parts) == shown {
			parts = append(parts, fmt.Sprintf("%d more", len(l.moves)-shown))
			break
		}
		parts = append(parts, x.show(moves[i].term))
	}
	for _, i := range l.moves {
		if x.exchanged(moves[i].term) {
			l.phase += math.Pi
		}
	}
	return fmt.Sprintf("the loop of %d terms %s, %s, encloses a phase of %s; only multiples of pi can be made real",
		len(l.moves), x.place(moves, l.moves), strings.Join(parts, ", "), inUnitsOfPi(l.phase))
}

// exchanged reports whether a term of two odd factors stands as c c^+, minus the hopping c^+ c that one thinks of.
func (x *expansion) exchanged(term int32) bool {
	var odd []*localOp
	for _, f := range x.factors[x.start[term]:x.start[term+1]] {
		if o := x.op(f); o.odd {
			odd = append(odd, o)
		}
	}
	sum := func(o *localOp) (n int32) {
		for _, s := range o.steps {
			n += s
		}
		return n
	}
	return len(odd) == 2 && sum(odd[0]) < 0 && sum(odd[1]) > 0
}

// contradiction finds a combination of moves by elimination with a tag for each: used where moves change more than two labels.
func contradiction(variables int, moves []move) *loop {
	const most = 4000
	var tagged []relation
	for i := range moves {
		if len(moves[i].steps) == 0 || len(tagged) == most {
			continue
		}
		r := relationsOf(moves[i : i+1])[0]
		r.terms = append(r.terms, entry{int32(variables + i), exactOf(1)})
		tagged = append(tagged, r)
	}
	sort.SliceStable(tagged, func(a, b int) bool { return len(tagged[a].terms) < len(tagged[b].terms) })
	e := newElimination(variables+len(moves), variables)
	var best *loop
	for _, r := range tagged {
		left := e.substitute(r)
		if left.terms[0].at < int32(variables) {
			e.take(deferred{relation: left}, nil, &solution{})
			continue
		}
		if left.rhs.vanishes() || best != nil && len(left.terms) >= len(best.moves) {
			continue
		}
		best = &loop{phase: left.rhs.angle}
		for _, t := range left.terms {
			best.moves = append(best.moves, t.at-int32(variables))
		}
	}
	return best
}

// place says between which rungs a loop lies.
func (x *expansion) place(moves []move, loop []int32) string {
	first, last := math.MaxInt, -1
	for _, i := range loop {
		for _, s := range moves[i].steps {
			_, rung, _ := x.lb.ladder.SiteAt(x.lb.siteOf(int(s.at)))
			first, last = min(first, rung), max(last, rung)
		}
	}
	if first == last {
		return fmt.Sprintf("on rung %d", first)
	}
	return fmt.Sprintf("between rungs %d and %d", first, last)
}

// inUnitsOfPi writes an angle folded into 0..pi.
func inUnitsOfPi(angle float64) string {
	a := math.Abs(math.Remainder(angle, 2*math.Pi)) / math.Pi
	return fmt.Sprintf("%.6g pi", a)
}
