//go:build amd64 && !purego

package dense

// Kernels of the secular equation: the Go loops of secular.go and merge.go, n numbers at a time. Squares means that D = d^2.

// secularSums returns the sum of z^2/(d-pole-t) and its derivative.
//
//go:noescape
func secularSums512(x, y *float64, n int, pole, t float64) (sum, slope float64)

//go:noescape
func secularSums256(x, y *float64, n int, pole, t float64) (sum, slope float64)

//go:noescape
func secularSumsSquares512(x, y *float64, n int, pole, t float64) (sum, slope float64)

//go:noescape
func secularSumsSquares256(x, y *float64, n int, pole, t float64) (sum, slope float64)

// secularQuotients multiplies y by (x-pole-t)/(x-other).
//
//go:noescape
func secularQuotients512(x, y *float64, n int, pole, t, other float64)

//go:noescape
func secularQuotients256(x, y *float64, n int, pole, t, other float64)

//go:noescape
func secularQuotientsSquares512(x, y *float64, n int, pole, t, other float64)

//go:noescape
func secularQuotientsSquares256(x, y *float64, n int, pole, t, other float64)

// secularRow writes y/(x-pole-t), times x if it is for left vectors, to out and returns the sum of the squares.
//
//go:noescape
func secularRow512(x, y, out *float64, n int, pole, t float64) float64

//go:noescape
func secularRow256(x, y, out *float64, n int, pole, t float64) float64

//go:noescape
func secularRowSquares512(x, y, out *float64, n int, pole, t float64) float64

//go:noescape
func secularRowSquares256(x, y, out *float64, n int, pole, t float64) float64

//go:noescape
func secularRowLeft512(x, y, out *float64, n int, pole, t float64) float64

//go:noescape
func secularRowLeft256(x, y, out *float64, n int, pole, t float64) float64
