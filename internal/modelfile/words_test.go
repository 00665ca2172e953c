package modelfile

import (
	"testing"
	"time"
)

func TestNearest(t *testing.T) {
	keys := []string{"name", "site", "max", "rungs", "observable_precision", "J"}
	for word, want := range map[string]string{"nam": "name", "Rungs": "rungs", "rugns": "rungs", "mx": "max", "observable-precision": "observable_precision", "colour": "", "x": "", "j": "J", "k": ""} {
		if got := nearest(word, keys); got != want {
			t.Errorf("nearest(%q) = %q, want %q", word, got, want)
		}
	}
}

func TestSize(t *testing.T) {
	for s, want := range map[string]int64{"8 GiB": 8 << 30, "1.5GB": 1_500_000_000, "500 kB": 500_000, "2 TiB": 2 << 40, "10 B": 10,
		"": 0, "8": 0, "GiB": 0, "8 G": 0, "-1 GB": 0, "0 B": 0, "1e30 TB": 0, "nan GB": 0, "8 gib": 0} {
		got, err := Size(s)
		if got != want || (err == nil) != (want > 0) {
			t.Errorf("Size(%q) = %d, %v; want %d", s, got, err, want)
		}
	}
}

func TestDuration(t *testing.T) {
	for s, want := range map[string]time.Duration{"90s": 90 * time.Second, "2h30m": 150 * time.Minute, "1d12h": 36 * time.Hour, "3d": 72 * time.Hour, "1d 2h": 26 * time.Hour,
		"": 0, "5": 0, "d": 0, "-2h": 0, "1d-2h": 0, "0s": 0, "9999999d": 0, "2 hours": 0, "1e9h": 0} {
		got, err := Duration(s)
		if got != want || (err == nil) != (want > 0) {
			t.Errorf("Duration(%q) = %v, %v; want %v", s, got, err, want)
		}
	}
}
