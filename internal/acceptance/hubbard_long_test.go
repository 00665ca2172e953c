//go:build long

package acceptance

import "testing"

func TestHubbardChainLong(t *testing.T) {
	for _, c := range []hubbard{
		{32, 16, 16, 8}, // half filled
		{32, 12, 12, 8}, // doped
		{32, 14, 10, 8}, // doped, magnetized
	} {
		t.Run(c.String(), c.run)
	}
}
