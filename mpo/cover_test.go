package mpo

import (
	"math/bits"
	"testing"

	"github.com/stretchr/testify/require"
	"pgregory.net/rapid"
)

// smallestCover tries all sets of left vertices: the right vertices a set leaves necessary are the neighbours of the others.
func smallestCover(g *graph) int {
	best := g.left()
	for set := range 1 << g.left() {
		needed := 0
		for u := range g.left() {
			if set>>u&1 == 0 {
				for _, v := range g.adj[g.start[u]:g.start[u+1]] {
					needed |= 1 << v
				}
			}
		}
		best = min(best, bits.OnesCount(uint(set))+bits.OnesCount(uint(needed)))
	}
	return best
}

func drawGraph(t *rapid.T) *graph {
	left, right := rapid.IntRange(0, 9).Draw(t, "left"), rapid.IntRange(1, 9).Draw(t, "right")
	g := &graph{right: right, start: make([]int32, 1, left+1)}
	for range left {
		for v := range right {
			if rapid.IntRange(0, 3).Draw(t, "edge") == 0 {
				g.adj = append(g.adj, int32(v))
			}
		}
		g.start = append(g.start, int32(len(g.adj)))
	}
	return g
}

func TestCoverIsSmallest(t *testing.T) {
	var c coverer // reused, as Build does
	rapid.Check(t, func(t *rapid.T) {
		g := drawGraph(t)
		inL, inR := c.cover(g)
		size := 0
		for u := range g.left() {
			if inL[u] {
				size++
			}
			for _, v := range g.adj[g.start[u]:g.start[u+1]] {
				require.True(t, inL[u] || inR[v], "edge %d-%d is not covered", u, v)
			}
		}
		for v := range g.right {
			if inR[v] {
				size++
			}
		}
		require.Equal(t, smallestCover(g), size)
		require.Equal(t, size, c.match(g), "Koenig: cover and matching are of one size")
	})
}

// On a ladder of alternating edges the greedy matching is bad and an augmenting path runs the whole length.
func TestMatchLongPath(t *testing.T) {
	const n = 20_000
	g := &graph{right: n, start: []int32{0}}
	for u := range int32(n) {
		if u+1 < n {
			g.adj = append(g.adj, u+1, u)
		} else {
			g.adj = append(g.adj, u)
		}
		g.start = append(g.start, int32(len(g.adj)))
	}
	g.adj[len(g.adj)-1] = n - 1 // taken by its neighbour
	var c coverer
	require.Equal(t, n, c.match(g))
}
