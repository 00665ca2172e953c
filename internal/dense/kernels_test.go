package dense

import (
	"fmt"
	"testing"

	"github.com/stretchr/testify/assert"
	"github.com/stretchr/testify/require"
)

func TestChooseKernels(t *testing.T) {
	best := goKernels
	for _, set := range []kernelSet{avx2Kernels, avx512Kernels, netlibKernels} {
		if set.available() {
			best = set
		}
	}
	for _, row := range []struct {
		wish string
		want kernelSet
		err  string // part of the message, empty for none
	}{
		{"", best, ""},
		{"go", goKernels, ""},
		{"Go", best, `unknown kernels "Go"`},
		{"fast", best, `unknown kernels "fast"; expected one of "go"`},
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
	for _, row := range []struct {
		set kernelSet
		err string
	}{
		{avx2Kernels, "tag purego"},
		{avx512Kernels, "tag purego"},
		{netlibKernels, "tag netlib"},
	} {
		t.Run("wish for "+row.set.String(), func(t *testing.T) {
			got, err := chooseKernels(row.set.String())
			if row.set.available() {
				assert.NoError(t, err)
				assert.Equal(t, row.set, got)
				return
			}
			assert.Equal(t, best, got)
			assert.ErrorContains(t, err, row.err)
			assert.ErrorContains(t, err, fmt.Sprintf("%q", best))
		})
	}
}

func TestKernels(t *testing.T) {
	for set := range kernelSet(len(kernelNames)) {
		use(t, set)
		name, _ := Kernels()
		assert.Equal(t, set.String(), name)
		assert.Equal(t, set == netlibKernels && haveNetlib, useNetlib())
	}
}
