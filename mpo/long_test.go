//go:build long

package mpo

import (
	"testing"

	"github.com/stretchr/testify/require"
)

const seeds = 60

// A hundred thousand terms, at all cuts against the singular values.
func TestManyTermsAtOperatorRank(t *testing.T) {
	cases := []struct {
		name string
		sum  *sum
	}{
		{"factors=2/sites=128", pairTerms(128, 100_000, 1)},
		{"factors=4/sites=64", fourfoldTerms(64, 100_000, 1)},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			o, err := Build[float64](c.sum.Strings, Options{})
			require.NoError(t, err)
			requireStringRank(t, c.sum, o)
		})
	}
}
