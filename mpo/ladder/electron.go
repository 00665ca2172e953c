package ladder

import "slices"

// electronRules: element u + 4d is the element u of the mode up left of the element d of the mode down.
type electronRules struct{}

var electronOccupations = [4][2]int{{0, 0}, {1, 0}, {0, 1}, {1, 1}}

func (electronRules) dim() int        { return 4 }
func (electronRules) labels() []Label { return []Label{{Name: "N up"}, {Name: "N down"}} }
func (electronRules) stateLabels(s int) []int {
	return []int{electronOccupations[s][0], electronOccupations[s][1]}
}

func (electronRules) mul(a, b OpID) ([]Weighted, error) {
	sign := complex128(1)
	if modeOdd(a/4) && modeOdd(b%4) {
		sign = -1
	}
	var out []Weighted
	for _, u := range modeProducts[a%4][b%4] {
		for _, d := range modeProducts[a/4][b/4] {
			out = append(out, Weighted{sign * u.Coef * d.Coef, u.Op + 4*d.Op})
		}
	}
	return out, nil
}

func (electronRules) adjoint(a OpID) ([]Weighted, error) {
	sign := complex128(1)
	if modeOdd(a%4) && modeOdd(a/4) {
		sign = -1
	}
	return []Weighted{{sign, modeAdjoint[a%4] + 4*modeAdjoint[a/4]}}, nil
}

func (electronRules) raise(a OpID) []int   { return []int{modeChange[a%4], modeChange[a/4]} }
func (electronRules) odd(a OpID) bool      { return modeOdd(a%4) != modeOdd(a/4) }
func (electronRules) diagonal(a OpID) bool { return modeChange[a%4] == 0 && modeChange[a/4] == 0 }

// matrix: the mode down stands right of up in |up,down> = c_up^+ c_down^+ |0>, so an odd element of down passes the particle up.
func (electronRules) matrix(a OpID) []complex128 {
	up, down := modeElements[a%4], modeElements[a/4]
	m := make([]complex128, 16)
	for out, p := range electronOccupations {
		for in, q := range electronOccupations {
			sign := 1.0
			if modeOdd(a/4) && q[0] == 1 {
				sign = -1
			}
			if v := sign * up[p[0]][q[0]] * down[p[1]][q[1]]; v != 0 {
				m[out*4+in] = complex(v, 0)
			}
		}
	}
	return m
}

func (electronRules) format(a OpID, at string) string {
	if a == 0 {
		return "1"
	}
	up := [4]string{"", "c_up", "c_up^+", "n_up"}[a%4]
	down := [4]string{"", "c_down", "c_down^+", "n_down"}[a/4]
	switch {
	case down == "":
		return up + at
	case up == "":
		return down + at
	}
	return up + at + " " + down + at
}

func (electronRules) symbol(name, super string) ([]Weighted, bool) {
	const up, down = 1, 4
	switch name + "^" + super {
	case "c_up^":
		return []Weighted{{1, modeLower * up}}, true
	case "c_up^+":
		return []Weighted{{1, modeRaise * up}}, true
	case "c_down^":
		return []Weighted{{1, modeLower * down}}, true
	case "c_down^+":
		return []Weighted{{1, modeRaise * down}}, true
	case "n_up^":
		return []Weighted{{1, modeNumber * up}}, true
	case "n_down^":
		return []Weighted{{1, modeNumber * down}}, true
	case "n^":
		return []Weighted{{1, modeNumber * up}, {1, modeNumber * down}}, true
	case "S^z":
		return []Weighted{{0.5, modeNumber * up}, {-0.5, modeNumber * down}}, true
	case "S^+": // c_up^+ c_down
		return []Weighted{{1, modeRaise*up + modeLower*down}}, true
	case "S^-": // c_down^+ c_up = -c_up c_down^+
		return []Weighted{{-1, modeLower*up + modeRaise*down}}, true
	case "S^x":
		return []Weighted{{0.5, modeRaise*up + modeLower*down}, {-0.5, modeLower*up + modeRaise*down}}, true
	case "S^y":
		return []Weighted{{-0.5i, modeRaise*up + modeLower*down}, {-0.5i, modeLower*up + modeRaise*down}}, true
	}
	return nil, false
}

const electronSymbols = "c_up, c_up^+, c_down, c_down^+, n_up, n_down, n, S^z, S^+, S^-, S^x, S^y"

func (electronRules) symbols() string { return electronSymbols }

func (r electronRules) exponential(x []Weighted) ([]Weighted, error) {
	d := diagonalValues(r, x)
	for i := range d {
		d[i] = expOf(d[i])
	}
	const up, down = modeNumber, 4 * modeNumber
	return []Weighted{{d[0], 0}, {d[1] - d[0], up}, {d[2] - d[0], down}, {d[3] - d[1] - d[2] + d[0], up + down}}, nil
}

// singleRules is the two-component fermion without double occupation: the algebra of electronRules, of which only matrices are cut.
type singleRules struct{ electronRules }

func (singleRules) dim() int { return 3 }

func (r singleRules) matrix(a OpID) []complex128 {
	full := r.electronRules.matrix(a)
	return slices.Concat(full[0:3], full[4:7], full[8:11])
}
