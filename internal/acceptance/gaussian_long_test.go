//go:build long

package acceptance

import "testing"

func TestGaussianLong(t *testing.T) {
	for _, g := range []gaussian{
		{rungs: 64, legs: 2},
		{rungs: 32, legs: 3},
		{rungs: 32, legs: 2, pairing: true},
		{rungs: 64, legs: 2, pairing: true},
	} {
		t.Run(g.String(), g.run)
	}
}
