package dmrg

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"rundle/internal/dense"
	"rundle/internal/krylov"
	"rundle/mpo"
	"rundle/mps"
	"rundle/mps/block"
)

// bundle searches for several of the lowest states at once on common isometries (White 1993): one centre tensor a state, cut by the mean of their
// density matrices. Its states are orthonormal up to truncation, and at each update the lowest combinations of what the update spans, so that levels that
// lie close together come out in order, and at the pace of the distance to the levels beyond the bundle, not of that between its own.
type bundle[T dense.Scalar] struct {
	*engine[T]
	centers []*block.Tensor[T] // at the site psi.Center, axes (left bond, site, right bond); the first one is also that of psi
	values  []float64          // energies of the last update, increasing
	gains   []float64          // of the last update
}

// newBundle begins from the span of several states of one sector, which it may change. Those that the others span count for nothing: the
// first update finds random ones for them. prepare must follow.
func newBundle[T dense.Scalar](op *mpo.Operator[T], states []*mps.Chain[T], opt settled, halt func() error) *bundle[T] {
	b := &bundle[T]{values: make([]float64, len(states)), gains: make([]float64, len(states))}
	var psi *mps.Chain[T]
	for k := range states {
		c := directSum(states, k)
		b.centers = append(b.centers, c.Sites[0])
		if psi == nil {
			psi = c
		}
	}
	var ws block.Workspace[T]
	for i := psi.Len() - 1; i > 1; i-- {
		l, q, _ := block.LQ(psi.Sites[i], 1, &ws, nil) // without a stop it does not fail
		psi.Sites[i], psi.Sites[i-1] = q, block.Contract(psi.Sites[i-1], l, []int{2}, []int{0})
	}
	l, q, _ := block.LQ(psi.Sites[1], 1, &ws, nil)
	psi.Sites[1] = q
	for k, c := range b.centers {
		b.centers[k] = block.Contract(c, l, []int{2}, []int{0})
	}
	psi.Sites[0], psi.Center = b.centers[0], 0
	b.engine = newEngine(op, psi, opt, halt)
	return b
}

// directSum is state k in the direct sum of the bonds of all; but for the first site it is the same for every k.
func directSum[T dense.Scalar](states []*mps.Chain[T], k int) *mps.Chain[T] {
	share := func(j int) T {
		if j == k {
			return dense.FromFloat[T](1)
		}
		return dense.FromFloat[T](0)
	}
	if len(states) == 1 {
		return states[0].Clone()
	}
	sum := mps.Add(share(0), states[0], share(1), states[1])
	for j := 2; j < len(states); j++ {
		sum = mps.Add(dense.FromFloat[T](1), sum, share(j), states[j])
	}
	return sum
}

// bundleOutcome is what a sweep of a bundle reports, state by state: the energies of the last update, the gains of all updates of the left-going half.
type bundleOutcome struct {
	outcome
	energies, gains []float64
}

// sweep goes right and left once over all bonds.
func (b *bundle[T]) sweep(s setting) (bundleOutcome, error) {
	b.sweeps++
	out := bundleOutcome{gains: make([]float64, len(b.centers))}
	n := b.psi.Len()
	for i := b.psi.Center; i < n-1; i++ {
		if err := b.step(i, true, s, &out); err != nil {
			return out, err
		}
	}
	clear(out.gains)
	out.outcome = outcome{change: out.change}
	for i := n - 2; i >= 0; i-- {
		if err := b.step(i, false, s, &out); err != nil {
			return out, err
		}
	}
	out.energies = slices.Clone(b.values)
	out.energy = b.values[0]
	return out, nil
}

func (b *bundle[T]) step(i int, right bool, s setting, out *bundleOutcome) error {
	if err := b.halt(); err != nil {
		return err
	}
	b.reseed(i, right)
	discarded, err := b.update(i, right, s)
	if err != nil {
		return b.at(i, err)
	}
	out.discarded = max(out.discarded, discarded)
	out.total += discarded
	out.largest = max(out.largest, b.psi.Bond(i).Dim())
	out.residual = max(out.residual, b.residual)
	out.rest = math.Hypot(out.rest, b.residual)
	for k, g := range b.gains {
		out.gains[k] += g
	}
	return nil
}

// update optimizes sites i and i+1 of all states and moves the centre on. On an error the states are as they were.
func (b *bundle[T]) update(i int, right bool, s setting) (discarded float64, err error) {
	left, beyond, err := b.envs.around(i, i+1)
	if err != nil {
		return 0, err
	}
	thetas := make([]*block.Tensor[T], len(b.centers))
	for k, c := range b.centers {
		if right {
			thetas[k] = block.Contract(c, b.psi.Sites[i+1], []int{2}, []int{0})
		} else {
			thetas[k] = block.Contract(b.psi.Sites[i], c, []int{2}, []int{0})
		}
	}
	h := b.plan.Project(i, 2, left, beyond, thetas[0].Structure)
	defer h.Release()
	if err := b.solve(h, thetas, s); err != nil {
		return 0, err
	}
	iso, centers, discarded, err := b.cut(h, thetas, right, s)
	if err != nil {
		return 0, err
	}
	b.centers = centers
	if right {
		b.psi.Sites[i], b.psi.Sites[i+1] = iso, centers[0]
		b.envs.dropRight(i)
		b.psi.Center = i + 1
		err = b.growLeft(i)
	} else {
		b.psi.Sites[i], b.psi.Sites[i+1] = centers[0], iso
		b.envs.dropLeft(i + 1)
		b.psi.Center = i
		err = b.growRight(i + 1)
	}
	return discarded, err
}

// solve improves the states one after the other, each orthogonal to those before, and then takes the lowest combinations (Rayleigh, Ritz).
func (b *bundle[T]) solve(h *mpo.Projected[T], thetas []*block.Tensor[T], s setting) error {
	var halted error
	apply := func(dst, src []T) {
		if halted = b.halt(); halted != nil {
			clear(dst)
			return
		}
		h.Apply(dst, src, &b.work, b.pool)
		b.products++
		b.count(h.Flops())
	}
	against := b.constraints(h)
	var live, dead []*block.Tensor[T]
	var worst float64
	for k, theta := range thetas {
		if s.noise > 0 && theta.Norm() > 0 {
			b.shake(theta, s.noise)
		}
		if theta.Norm() == 0 {
			b.randomize(theta)
		}
		if !b.freed(theta, against) {
			dead = append(dead, theta)
			continue
		}
		r := krylov.Lowest(apply, theta.Data, against, krylov.Options{MaxVectors: s.vectors, Tolerance: s.tolerance, Pool: b.pool}, &b.kry)
		if halted != nil {
			return halted
		}
		if math.IsNaN(r.Value) || math.IsInf(r.Value, 0) {
			return fmt.Errorf("the energy is not finite; look for couplings whose products overflow")
		}
		worst = max(worst, r.Residual)
		b.gains[k] = r.Start - r.Value
		against, live = append(against, theta.Data), append(live, theta)
	}
	if b.residual = worst; len(dead) > 0 {
		b.residual = math.Inf(1) // the space of these two sites is too small for as many states; wider bonds come
	}
	if len(live) == 0 {
		for k := range b.values {
			b.values[k] = math.Inf(1)
		}
		return nil
	}
	for _, theta := range dead {
		clear(theta.Data)
	}
	b.combine(apply, live)
	return halted
}

// combine turns orthonormal states into the eigenvectors of the Hamiltonian in their span.
func (b *bundle[T]) combine(apply func(dst, src []T), live []*block.Tensor[T]) {
	m := len(live)
	matrix, vectors, image := make([]T, m*m), make([]T, m*m), make([]T, len(live[0].Data))
	for j, t := range live {
		apply(image, t.Data)
		for i, u := range live {
			matrix[i*m+j] = dense.Dot(u.Data, image)
		}
	}
	values := make([]float64, m)
	if dense.Eigen(m, hermitian(m, matrix), m, values, vectors, m, nil) != nil {
		return // the states stay as they are
	}
	for k := range b.values {
		b.values[k] = values[min(k, m-1)]
	}
	mixed := make([]*block.Tensor[T], m)
	for k := range mixed {
		mixed[k] = block.New[T](live[0].Structure)
		for i, t := range live {
			mixed[k].Axpy(vectors[i*m+k], t)
		}
	}
	for k := range live {
		copy(live[k].Data, mixed[k].Data)
	}
}

// hermitian replaces a matrix by its Hermitian part.
func hermitian[T dense.Scalar](n int, a []T) []T {
	half := dense.FromFloat[T](0.5)
	for i := range n {
		for j := range i + 1 {
			x := half * (a[i*n+j] + dense.Conj(a[j*n+i]))
			a[i*n+j], a[j*n+i] = x, dense.Conj(x)
		}
	}
	return a
}

// cut splits the states by the mean of their density matrices, perturbed where the setting says so.
func (b *bundle[T]) cut(h *mpo.Projected[T], thetas []*block.Tensor[T], right bool, s setting) (iso *block.Tensor[T], centers []*block.Tensor[T], discarded float64, err error) {
	b.cutting.reset()
	each := make([][]side[T], len(thetas))
	for k, theta := range thetas {
		each[k] = b.densities(theta, right)
	}
	sides := slices.Clone(each[0])
	for _, other := range each[1:] {
		for i := range other {
			dense.Axpy(dense.FromFloat[T](1), other[i].rho, sides[i].rho)
		}
	}
	if s.perturbation > 0 {
		for _, theta := range thetas {
			sides = b.perturb(sides, h, theta, right, s.perturbation)
		}
	}
	if err := b.diagonalize(sides); err != nil {
		return nil, nil, 0, err
	}
	if s.perturbation > 0 {
		choose(sides, s.bond, s.perturbation)
	} else {
		chooseByWeight(sides, s.bond, s.weight)
	}
	if err := b.chosenVectors(sides); err != nil {
		return nil, nil, 0, err
	}
	for k, theta := range thetas {
		for i := range sides {
			sides[i].matrix = nil
			if i < len(each[k]) {
				sides[i].matrix = each[k][i].matrix
			}
		}
		var center *block.Tensor[T]
		iso, center = b.assemble(theta, sides, right)
		if kept := center.Norm(); kept > 0 {
			discarded += max(0, 1-kept*kept) / float64(len(thetas))
			center.Scale(dense.FromFloat[T](1 / kept))
		}
		centers = append(centers, center)
	}
	return iso, centers, discarded, nil
}

// chooseByWeight marks the largest eigenvalues to stay: bond at most, no more than it takes to discard no more than the weight.
func chooseByWeight[T dense.Scalar](sides []side[T], bond int, weight float64) {
	type candidate struct {
		value float64
		side  int
	}
	var all []candidate
	var trace float64
	for i := range sides {
		for _, v := range sides[i].values {
			all = append(all, candidate{max(v, 0), i})
			trace += max(v, 0)
		}
	}
	slices.SortStableFunc(all, func(a, b candidate) int { return cmp.Compare(b.value, a.value) })
	keep, rest := len(all), 0.0
	for keep > 1 && (keep > bond || rest+all[keep-1].value <= max(weight, densityRounding)*trace) {
		keep--
		rest += all[keep].value
	}
	for _, c := range all[:keep] {
		sides[c.side].keep++
	}
}

// chains are the states, each on its own.
func (b *bundle[T]) chains() []*mps.Chain[T] {
	var all []*mps.Chain[T]
	for k := range b.centers {
		if c := b.chain(k); c.Norm() > 0 {
			all = append(all, c)
		}
	}
	return all
}

// chain is state k, on its own.
func (b *bundle[T]) chain(k int) *mps.Chain[T] {
	c := b.psi.Clone()
	c.Sites[c.Center] = b.centers[k].Clone()
	c.Normalize()
	return c
}
