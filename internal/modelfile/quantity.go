package modelfile

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"
)

// units of memory, in bytes.
var units = map[string]float64{
	"B": 1, "kB": 1e3, "KB": 1e3, "MB": 1e6, "GB": 1e9, "TB": 1e12,
	"KiB": 1 << 10, "MiB": 1 << 20, "GiB": 1 << 30, "TiB": 1 << 40,
}

// Size reads an amount of memory such as "8 GiB" or "500 MB", in bytes.
func Size(s string) (int64, error) {
	digits := strings.TrimRight(s, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ")
	unit, ok := units[s[len(digits):]]
	x, err := strconv.ParseFloat(strings.TrimSpace(digits), 64)
	if err != nil || !ok {
		return 0, fmt.Errorf("memory size %q; expected a number and a unit, as in \"8 GiB\" or \"500 MB\"", s)
	}
	if bytes := x * unit; bytes >= 1 && bytes < math.MaxInt64 {
		return int64(bytes), nil
	}
	return 0, fmt.Errorf("memory size %q out of range; expected at least one byte, as in \"8 GiB\"", s)
}

// Duration reads a time such as "90s", "2h30m" or "1d12h".
func Duration(s string) (time.Duration, error) {
	rest, days := s, int64(0)
	if head, tail, ok := strings.Cut(s, "d"); ok {
		k, err := strconv.ParseInt(head, 10, 64)
		if err != nil || k < 0 || k > 100_000 {
			return 0, badDuration(s)
		}
		rest, days = tail, k
	}
	total := time.Duration(days) * 24 * time.Hour
	if rest != "" {
		d, err := time.ParseDuration(strings.TrimSpace(rest))
		if err != nil || d < 0 || d > 100_000*24*time.Hour {
			return 0, badDuration(s)
		}
		total += d
	}
	if total <= 0 {
		return 0, badDuration(s)
	}
	return total, nil
}

func badDuration(s string) error {
	return fmt.Errorf("time %q; expected a positive time with units, as in \"90s\", \"2h30m\" or \"1d12h\"", s)
}
