package ladder

// The basis of one fermionic mode: 1, c, c^+, n = c^+ c.
const (
	modeOne OpID = iota
	modeLower
	modeRaise
	modeNumber
)

// modeProducts[a][b] is a·b in the basis of one mode; c c^+ = 1 - n.
var modeProducts = [4][4][]Weighted{
	{{{1, 0}}, {{1, 1}}, {{1, 2}}, {{1, 3}}},
	{{{1, 1}}, nil, {{1, 0}, {-1, 3}}, {{1, 1}}},
	{{{1, 2}}, {{1, 3}}, nil, nil},
	{{{1, 3}}, nil, {{1, 2}}, {{1, 3}}},
}

var (
	modeAdjoint  = [4]OpID{0, 2, 1, 3}
	modeChange   = [4]int{0, -1, 1, 0}
	modeElements = [4][2][2]float64{{{1, 0}, {0, 1}}, {{0, 1}, {0, 0}}, {{0, 0}, {1, 0}}, {{0, 0}, {0, 1}}} // [op][out][in]
)

func modeOdd(a OpID) bool { return a == modeLower || a == modeRaise }

type fermionRules struct{}

func (fermionRules) dim() int                { return 2 }
func (fermionRules) labels() []Label         { return []Label{{Name: "N"}} }
func (fermionRules) stateLabels(s int) []int { return []int{s} }
func (fermionRules) mul(a, b OpID) ([]Weighted, error) {
	return modeProducts[a][b], nil
}
func (fermionRules) adjoint(a OpID) ([]Weighted, error) { return []Weighted{{1, modeAdjoint[a]}}, nil }
func (fermionRules) raise(a OpID) []int                 { return []int{modeChange[a]} }
func (fermionRules) odd(a OpID) bool                    { return modeOdd(a) }
func (fermionRules) diagonal(a OpID) bool               { return modeChange[a] == 0 }

func (fermionRules) matrix(a OpID) []complex128 {
	e := modeElements[a]
	return []complex128{complex(e[0][0], 0), complex(e[0][1], 0), complex(e[1][0], 0), complex(e[1][1], 0)}
}

func (fermionRules) format(a OpID, at string) string {
	return [4]string{"1", "c" + at, "c^+" + at, "n" + at}[a]
}

func (fermionRules) symbol(name, super string) ([]Weighted, bool) {
	switch name + "^" + super {
	case "c^":
		return []Weighted{{1, modeLower}}, true
	case "c^+":
		return []Weighted{{1, modeRaise}}, true
	case "n^":
		return []Weighted{{1, modeNumber}}, true
	}
	return nil, false
}

func (fermionRules) symbols() string { return "c, c^+, n" }

func (r fermionRules) exponential(x []Weighted) ([]Weighted, error) {
	d := diagonalValues(r, x)
	e0, e1 := expOf(d[0]), expOf(d[1])
	return []Weighted{{e0, modeOne}, {e1 - e0, modeNumber}}, nil
}

// diagonalValues returns the diagonal of a sum of diagonal elements.
func diagonalValues(r rules, x []Weighted) []complex128 {
	n := r.dim()
	d := make([]complex128, n)
	for _, w := range x {
		m := r.matrix(w.Op)
		for s := range d {
			d[s] += w.Coef * m[s*n+s]
		}
	}
	return d
}
