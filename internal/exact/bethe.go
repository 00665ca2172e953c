package exact

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// HeisenbergRing returns the lowest energy of sum S_j . S_{j+1}, spin 1/2, on
// a ring of the given even number of sites. Bethe equations with M = sites/2
// real roots (Bethe 1931; form as in Karbach, Mueller 1997):
//
//	sites theta(l_j; 1/2) = 2 pi I_j + sum_k theta(l_j - l_k; 1),
//	I_j = -(M-1)/2 .. (M-1)/2,  E = sites/4 - sum (1/2)/(l_j^2 + 1/4).
func HeisenbergRing(sites int) (float64, error) {
	if sites < 2 || sites%2 == 1 {
		return 0, fmt.Errorf("exact: Heisenberg ring of %d sites: need an even number", sites)
	}
	m, size := sites/2, float64(sites)
	quantum := func(j int) float64 { return 2 * math.Pi * (float64(j) - float64(m-1)/2) }
	x := make([]float64, m)
	for j := range x {
		x[j] = math.Tan(quantum(j)/size/2) / 2
	}
	err := newton(x, func(x, r []float64, jacobian *mat.Dense) {
		for j := range x {
			r[j] = size*theta(x[j], 0.5) - quantum(j)
			own := size * dtheta(x[j], 0.5)
			for k := range x {
				r[j] -= theta(x[j]-x[k], 1)
				if k != j {
					d := dtheta(x[j]-x[k], 1)
					own -= d
					jacobian.Set(j, k, d)
				}
			}
			jacobian.Set(j, j, own)
		}
	})
	return heisenbergEnergy(size/4, x), err
}

// HeisenbergChain returns the lowest energy of sum S_j . S_{j+1}, spin 1/2, on
// an open chain with the given number of spins down. Bethe equations with
// positive roots (Alcaraz, Barber, Batchelor, Baxter, Quispel 1987):
//
//	2 sites theta(l_j; 1/2) = 2 pi I_j
//	    + sum_{k != j} (theta(l_j - l_k; 1) + theta(l_j + l_k; 1)),
//	I_j = 1 .. down,  E = (sites-1)/4 - sum (1/2)/(l_j^2 + 1/4).
func HeisenbergChain(sites, down int) (float64, error) {
	if sites < 2 || down < 0 || 2*down > sites {
		return 0, fmt.Errorf("exact: Heisenberg chain of %d sites, %d spins down: need at most half", sites, down)
	}
	size := float64(sites)
	x := make([]float64, down)
	for j := range x {
		x[j] = math.Tan(math.Pi*float64(j+1)/(2*size+2)) / 2
	}
	err := newton(x, func(x, r []float64, jacobian *mat.Dense) {
		for j := range x {
			r[j] = 2*size*theta(x[j], 0.5) - 2*math.Pi*float64(j+1)
			own := 2 * size * dtheta(x[j], 0.5)
			for k := range x {
				if k == j {
					continue
				}
				minus, plus := dtheta(x[j]-x[k], 1), dtheta(x[j]+x[k], 1)
				r[j] -= theta(x[j]-x[k], 1) + theta(x[j]+x[k], 1)
				own -= minus + plus
				jacobian.Set(j, k, minus-plus)
			}
			jacobian.Set(j, j, own)
		}
	})
	return heisenbergEnergy((size-1)/4, x), err
}

func heisenbergEnergy(ferromagnet float64, roots []float64) float64 {
	e := ferromagnet
	for _, l := range roots {
		e -= 0.5 / (l*l + 0.25)
	}
	return e
}

// HubbardChain returns the lowest energy of
//
//	-t sum (c_{j+1}^+ c_j + h.c.) + U sum n_up n_down,  t, U > 0,
//
// on an open chain with the given numbers of electrons (down <= up, together
// at most one a site). Open Lieb-Wu equations with positive roots k_j, l_a,
// u = U/4t (Schulz 1985):
//
//	2 (sites+1) k_j = 2 pi I_j - sum_a (theta(sin k_j - l_a; u) + theta(sin k_j + l_a; u))
//	sum_j (theta(l_a - sin k_j; u) + theta(l_a + sin k_j; u)) = 2 pi J_a
//	    + sum_{b != a} (theta(l_a - l_b; 2u) + theta(l_a + l_b; 2u))
//	I_j = 1 .. up+down, J_a = 1 .. down,  E = -2t sum cos k_j.
func HubbardChain(sites, up, down int, t, bigU float64) (float64, error) {
	if down < 0 || down > up || up+down > sites || !(t > 0) || !(bigU > 0) {
		return 0, fmt.Errorf("exact: Hubbard chain of %d sites, %d+%d electrons, t=%g, U=%g: "+
			"need down <= up, at most one electron a site, positive t and U", sites, up, down, t, bigU)
	}
	w := liebWu{float64(sites), up + down, bigU / (4 * t)}
	x := make([]float64, w.n+down)
	for j := range w.n {
		x[j] = math.Pi * float64(j+1) / (w.size + 1)
	}
	for a := range down { // the equation of l_a with all sin k = 0, no other l
		x[w.n+a] = w.u * math.Tan(math.Pi*float64(a+1)/float64(2*w.n+2))
	}
	// The equations are easy at large u: go down from there.
	for u := max(4, w.u); ; u = max(u*0.7, w.u) {
		if err := newton(x, liebWu{w.size, w.n, u}.equations); err != nil {
			return 0, fmt.Errorf("exact: Lieb-Wu equations at U/4t = %g: %w", u, err)
		}
		if u == w.u {
			break
		}
		for a := range down { // the roots go with u
			x[w.n+a] *= max(u*0.7, w.u) / u
		}
	}
	var e float64
	for _, k := range x[:w.n] {
		e -= 2 * t * math.Cos(k)
	}
	return e, nil
}

type liebWu struct {
	size float64
	n    int
	u    float64
}

func (w liebWu) equations(x, r []float64, jacobian *mat.Dense) {
	k, l := x[:w.n], x[w.n:]
	jacobian.Zero()
	add := func(i, j int, v float64) { jacobian.Set(i, j, jacobian.At(i, j)+v) }
	for j := range k {
		sin, cos := math.Sincos(k[j])
		r[j] = 2*(w.size+1)*k[j] - 2*math.Pi*float64(j+1)
		add(j, j, 2*(w.size+1))
		for a := range l {
			row := w.n + a
			r[j] += theta(sin-l[a], w.u) + theta(sin+l[a], w.u)
			minus, plus := dtheta(sin-l[a], w.u), dtheta(sin+l[a], w.u)
			add(j, j, (minus+plus)*cos)
			add(j, row, plus-minus)
			add(row, row, minus+plus)
			add(row, j, (plus-minus)*cos)
		}
	}
	for a := range l {
		row := w.n + a
		r[row] = -2 * math.Pi * float64(a+1)
		for j := range k {
			sin := math.Sin(k[j])
			r[row] += theta(l[a]-sin, w.u) + theta(l[a]+sin, w.u)
		}
		for b := range l {
			if b == a {
				continue
			}
			minus, plus := dtheta(l[a]-l[b], 2*w.u), dtheta(l[a]+l[b], 2*w.u)
			r[row] -= theta(l[a]-l[b], 2*w.u) + theta(l[a]+l[b], 2*w.u)
			add(row, row, -minus-plus)
			add(row, w.n+b, minus-plus)
		}
	}
}
