package mpo

import (
	"math/rand/v2"
	"slices"
	"testing"
)

// pairTerms draws terms of two factors: hopping and density-density on fermion sites.
func pairTerms(sites, terms int, seed uint64) *sum {
	rng := rand.New(rand.NewPCG(seed, 1))
	g := testGroup(0)
	s := newSum(g, slices.Repeat([]kindTable{fermionKind(g)}, sites)...)
	draw := coupling(rng, false)
	for range terms {
		i, j := int32(rng.IntN(sites-1)), int32(0)
		j = i + 1 + int32(rng.IntN(sites-1-int(i)))
		switch rng.IntN(3) {
		case 0:
			s.add(draw(), i, 3, j, 6)
		case 1:
			s.add(draw(), i, 2, j, 3)
		default:
			s.add(draw(), i, 4, j, 4)
		}
	}
	return s
}

// fourfoldTerms draws two-body interactions c^+ c^+ c c of four random sites.
func fourfoldTerms(sites, terms int, seed uint64) *sum {
	rng := rand.New(rand.NewPCG(seed, 2))
	g := testGroup(0)
	s := newSum(g, slices.Repeat([]kindTable{fermionKind(g)}, sites)...)
	draw := coupling(rng, false)
	for range terms {
		at := rng.Perm(sites)[:4]
		slices.Sort(at)
		ops := []int32{2, 2, 3, 3}
		rng.Shuffle(4, func(i, j int) { ops[i], ops[j] = ops[j], ops[i] })
		var factors []int32
		for k, i := range at {
			factors = append(factors, int32(i), ops[k])
		}
		s.add(draw(), factors...)
	}
	return s
}

func BenchmarkBuild(b *testing.B) {
	cases := []struct {
		name string
		sum  func() *sum
	}{
		{"factors=2/sites=64/terms=100000", func() *sum { return pairTerms(64, 100_000, 1) }},
		{"factors=2/sites=128/terms=100000", func() *sum { return pairTerms(128, 100_000, 1) }},
		{"factors=4/sites=64/terms=100000", func() *sum { return fourfoldTerms(64, 100_000, 1) }},
		{"factors=4/sites=128/terms=100000", func() *sum { return fourfoldTerms(128, 100_000, 1) }},
	}
	for _, c := range cases {
		b.Run(c.name, func(b *testing.B) {
			s := c.sum()
			for b.Loop() {
				o, err := Build[float64](s.Strings, Options{})
				if err != nil {
					b.Fatal(err)
				}
				b.ReportMetric(float64(slices.Max(o.BondDims())), "bond")
			}
		})
	}
}
