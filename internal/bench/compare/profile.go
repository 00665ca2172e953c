package main

import (
	"io"
	"regexp"
	"runtime"
	"strings"
	"time"

	"github.com/google/pprof/profile"

	"rundle/internal/dense"
)

// shares are the seconds of a CPU profile by what they were spent on.
type shares struct {
	Total   float64
	Seconds map[part]float64
}

// of is the share of a part.
func (s shares) of(p part) float64 {
	if s.Total == 0 {
		return 0
	}
	return s.Seconds[p] / s.Total
}

// part is something that a sweep spends time on.
type part string

// The parts. A sample belongs to the first that claims it.
const (
	memoryPart        part = "allocation and collection"
	innerProductsPart part = "products in decompositions"
	decompositionPart part = "decompositions"
	productsPart      part = "products"
	movesPart         part = "moves"
	krylovPart        part = "Krylov vectors"
	planningPart      part = "planning"
	otherPart         part = "other"
)

var (
	collecting    = regexp.MustCompile(`^runtime\.(mallocgc|gc[A-Z]|bgsweep|bgscavenge|growslice|newobject|makeslice)`)
	multiplying   = regexp.MustCompile(`^rundle/internal/dense\..*[gG]emm|^rundle/internal/dense\.(runTiles|blocked|plain)`)
	decomposing   = regexp.MustCompile(`^rundle/(internal/dense\.(\(\*SVD|Eigen|QR|LQ|\(\*QR)|mps/block\.(SVD|decompose|\(\*decomposition))`)
	moving        = regexp.MustCompile(`^rundle/mpo\..*(move|Move|runMiddle|gather|scatter|\)\.run$)`)
	searching     = regexp.MustCompile(`^rundle/internal/krylov\.`)
	applying      = regexp.MustCompile(`^rundle/mpo\..*\.(Apply|Run)$`)
	planningParts = regexp.MustCompile(`^rundle/(mpo\.\(\*Planner|mpo\.Project|mps/block\.(Plan|NewStructure))`)
)

// claim tells which part the functions on a stack, the innermost first, belong to.
func claim(stack []string) part {
	on := func(r *regexp.Regexp) bool {
		for _, f := range stack {
			if r.MatchString(f) {
				return true
			}
		}
		return false
	}
	product, decomposition := on(multiplying), on(decomposing)
	switch {
	case on(collecting):
		return memoryPart
	case product && decomposition:
		return innerProductsPart
	case decomposition:
		return decompositionPart
	case product:
		return productsPart
	case on(planningParts):
		return planningPart
	case on(moving), on(applying):
		return movesPart
	case on(searching):
		return krylovPart
	}
	return otherPart
}

// readProfile adds up a CPU profile.
func readProfile(r io.Reader) (shares, error) {
	p, err := profile.Parse(r)
	if err != nil {
		return shares{}, err
	}
	out := shares{Seconds: map[part]float64{}}
	for _, s := range p.Sample {
		var stack []string
		for _, l := range s.Location {
			for _, f := range l.Line {
				if f.Function != nil {
					stack = append(stack, bare(f.Function.Name))
				}
			}
		}
		seconds := time.Duration(s.Value[len(s.Value)-1]).Seconds()
		out.Seconds[claim(stack)] += seconds
		out.Total += seconds
	}
	return out, nil
}

// bare is a function's name without type arguments.
func bare(name string) string { return strings.ReplaceAll(name, "[...]", "") }

// largeSize is that of the product that sets the scale of rates.
const largeSize = 1024

// largeProduct is the rate of one large product in Gflop/s, real operations: the median of seven.
func largeProduct(complex bool) float64 {
	if complex {
		return 4 * rateOf[complex128]()
	}
	return rateOf[float64]()
}

func rateOf[T dense.Scalar]() float64 {
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	const n = largeSize
	a, b, c := make([]T, n*n), make([]T, n*n), make([]T, n*n)
	for i := range a {
		a[i], b[i] = dense.FromFloat[T](float64(i%7)-3), dense.FromFloat[T](float64(i%5)-2)
	}
	var times []float64
	for range 7 {
		start := processSeconds()
		dense.Gemm(dense.NoTrans, dense.NoTrans, n, n, n, 1, a, n, b, n, 0, c, n)
		times = append(times, processSeconds()-start)
	}
	return 2 * n * n * n / median(times) / 1e9
}
