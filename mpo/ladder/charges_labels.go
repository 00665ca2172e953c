package ladder

// species says what a label of a site counts.
type species byte

const (
	particle species = iota // fermions or bosons without components
	up                      // up fermions of a two-component site
	down
	spin  // S^z in steps of one, from the fully raised state: m - s, hence 0, -1, ..., -2s
	clock // m modulo q
)

// siteClass holds what all sites of one kind share.
type siteClass struct {
	site    Site
	species []species // per label
	modulus int       // q of a clock, 0 otherwise
	twoS    int       // 2s of a spin
	steps   [][]int32 // steps[state][label]; zero for state 0
	// Mean and covariance of the labels over all states with equal weight.
	covariance [][]float64
	mean       []float64
}

// labelling numbers the labels of all sites: label a of site i is variable first[i] + a. Every conserved charge and every gauge
// angle is a function on these variables.
type labelling struct {
	ladder    *Ladder
	hasClocks bool
	classes   []*siteClass // by leg
	class     []int32      // leg of each site
	first     []int32      // len sites + 1
}

func newLabelling(l *Ladder) *labelling {
	n := l.Sites()
	lb := &labelling{ladder: l, class: make([]int32, n), first: make([]int32, n+1), classes: make([]*siteClass, len(l.legs))}
	for k, g := range l.legs {
		for i := range k {
			if l.legs[i].site == g.site {
				lb.classes[k] = lb.classes[i]
			}
		}
		if lb.classes[k] == nil {
			lb.classes[k] = newSiteClass(g.site)
		}
		lb.hasClocks = lb.hasClocks || g.site.Kind() == KindClock
	}
	for i, s := range l.sites {
		lb.class[i] = s.leg
		lb.first[i+1] = lb.first[i] + int32(len(lb.classes[s.leg].species))
	}
	return lb
}

func newSiteClass(site Site) *siteClass {
	c := &siteClass{site: site}
	switch site.Kind() {
	case KindElectron:
		c.species = []species{up, down}
	case KindSpin:
		c.species, c.twoS = []species{spin}, site.Size()
	case KindClock:
		c.species, c.modulus = []species{clock}, site.Size()
	default:
		c.species = []species{particle}
	}
	zero := site.StateLabels(0)
	for s := range site.Dim() {
		c.steps = append(c.steps, c.toSteps(site.StateLabels(s), zero))
	}
	c.mean, c.covariance = moments(c.steps, len(c.species))
	return c
}

// toSteps counts label differences in steps of one: labels of spins change by two.
func (c *siteClass) toSteps(labels, from []int) []int32 {
	steps := make([]int32, len(labels))
	for a, x := range labels {
		steps[a] = int32(x)
		if from != nil {
			steps[a] -= int32(from[a])
		}
		if c.species[a] == spin {
			steps[a] /= 2
		}
	}
	return steps
}

func moments(steps [][]int32, n int) (mean []float64, cov [][]float64) {
	mean = make([]float64, n)
	for _, s := range steps {
		for a, x := range s {
			mean[a] += float64(x) / float64(len(steps))
		}
	}
	cov = make([][]float64, n)
	for a := range cov {
		cov[a] = make([]float64, n)
		for b := range n {
			for _, s := range steps {
				cov[a][b] += (float64(s[a]) - mean[a]) * (float64(s[b]) - mean[b]) / float64(len(steps))
			}
		}
	}
	return mean, cov
}

func (lb *labelling) sites() int { return len(lb.class) }

func (lb *labelling) variables() int { return int(lb.first[lb.sites()]) }

func (lb *labelling) at(site int) *siteClass { return lb.classes[lb.class[site]] }

// clockRelations states that q steps of a clock lead nowhere.
func (lb *labelling) clockRelations() []relation {
	var out []relation
	for i := range lb.sites() {
		if q := lb.at(i).modulus; q != 0 {
			out = append(out, relation{terms: []entry{{lb.first[i], exactOf(int64(q))}}})
		}
	}
	return out
}
