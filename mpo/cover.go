package mpo

// graph is a bipartite graph in compressed rows: the right neighbours of left vertex u are adj[start[u]:start[u+1]].
type graph struct {
	right int // number of right vertices
	start []int32
	adj   []int32
}

func (g *graph) left() int { return len(g.start) - 1 }

// none marks an unmatched vertex and an unreached level.
const none = -1

// coverer finds minimum vertex covers. Its slices are kept from call to call; the results of cover are valid until the next.
type coverer struct {
	mateL, mateR []int32 // partner of each vertex or none
	level        []int32 // distance of a left vertex from the free ones along alternating paths
	next         []int32 // first edge of a left vertex not tried in this phase
	queue, path  []int32
	inL, inR     []bool
}

// cover returns the left and right vertices of a minimum vertex cover: a maximum matching by Hopcroft and Karp (1973), turned
// into a cover by Koenig's theorem. Of the covers of equal size it takes one that has as many left vertices as it can.
func (c *coverer) cover(g *graph) (inLeft, inRight []bool) {
	c.match(g)
	// Left vertices that alternating paths reach from free ones are left out; the right ones so reached are in.
	c.inL, c.inR = grow(c.inL, g.left()), grow(c.inR, g.right)
	for u := range c.inL {
		c.inL[u] = c.mateL[u] != none
	}
	clear(c.inR)
	c.queue = c.queue[:0]
	for u := range c.mateL {
		if c.mateL[u] == none {
			c.queue = append(c.queue, int32(u))
		}
	}
	for head := 0; head < len(c.queue); head++ {
		u := c.queue[head]
		for _, v := range g.adj[g.start[u]:g.start[u+1]] {
			if c.inR[v] {
				continue
			}
			c.inR[v] = true
			w := c.mateR[v] // matched, or the path would augment
			c.inL[w] = false
			c.queue = append(c.queue, w)
		}
	}
	return c.inL, c.inR
}

// match finds a maximum matching: a greedy start, then phases of shortest augmenting paths.
func (c *coverer) match(g *graph) (size int) {
	c.mateL, c.mateR = grow(c.mateL, g.left()), grow(c.mateR, g.right)
	c.level, c.next = grow(c.level, g.left()), grow(c.next, g.left())
	fill(c.mateL, none)
	fill(c.mateR, none)
	for u := range c.mateL {
		for _, v := range g.adj[g.start[u]:g.start[u+1]] {
			if c.mateR[v] == none {
				c.mateL[u], c.mateR[v] = v, int32(u)
				size++
				break
			}
		}
	}
	for c.layer(g) {
		copy(c.next, g.start)
		for u := range c.mateL {
			if c.mateL[u] == none && c.augment(g, int32(u)) {
				size++
			}
		}
	}
	return size
}

// layer sets the levels and reports whether an augmenting path exists.
func (c *coverer) layer(g *graph) bool {
	fill(c.level, none)
	c.queue = c.queue[:0]
	for u := range c.mateL {
		if c.mateL[u] == none {
			c.level[u] = 0
			c.queue = append(c.queue, int32(u))
		}
	}
	found := false
	for head := 0; head < len(c.queue); head++ {
		u := c.queue[head]
		for _, v := range g.adj[g.start[u]:g.start[u+1]] {
			switch w := c.mateR[v]; {
			case w == none:
				found = true
			case c.level[w] == none:
				c.level[w] = c.level[u] + 1
				c.queue = append(c.queue, w)
			}
		}
	}
	return found
}

// augment walks down the levels from the free left vertex u to a free right one and swaps the matching along the path. The
// walk keeps its own stack: paths may be as long as the graph.
func (c *coverer) augment(g *graph, u int32) bool {
	c.path = append(c.path[:0], u)
	for len(c.path) > 0 {
		u := c.path[len(c.path)-1]
		if c.next[u] == g.start[u+1] {
			c.level[u] = none
			c.path = c.path[:len(c.path)-1]
			continue
		}
		v := g.adj[c.next[u]]
		w := c.mateR[v]
		if w == none {
			for _, x := range c.path {
				y := g.adj[c.next[x]]
				c.mateL[x], c.mateR[y] = y, x
			}
			return true
		}
		if c.level[w] != c.level[u]+1 {
			c.next[u]++
			continue
		}
		c.path = append(c.path, w)
	}
	return false
}

func fill(s []int32, v int32) {
	for i := range s {
		s[i] = v
	}
}
