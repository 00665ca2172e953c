package dense

import (
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestChooseKernels(t *testing.T) {
	best := goKernels
	if haveNetlib {
		best = netlibKernels
	}
	for _, row := range []struct {
		wish string
		want kernelSet
		err  string // part of the message, empty for none
	}{
		{"", best, ""},
		{"go", goKernels, ""},
		{"Go", best, `unknown kernels "Go"`},
		{"fast", best, `unknown kernels "fast"; expected "go"`},
	} {
		t.Run(row.wish, func(t *testing.T) {
			got, err := chooseKernels(row.wish)
			assert.Equal(t, row.want, got)
			if row.err == "" {
				assert.NoError(t, err)
				return
			}
			require.Error(t, err)
			assert.Contains(t, err.Error(), "RUNDLE_KERNELS")
			assert.Contains(t, err.Error(), row.err)
		})
	}
	got, err := chooseKernels("netlib")
	if haveNetlib {
		assert.NoError(t, err)
		assert.Equal(t, netlibKernels, got)
	} else {
		assert.ErrorContains(t, err, "tag netlib")
		assert.Equal(t, goKernels, got)
	}
}

func TestKernels(t *testing.T) {
	name, err := Kernels()
	if err == nil {
		assert.Contains(t, []string{"go", "netlib"}, name)
	}
	assert.Equal(t, name == "netlib", useNetlib())
}
