package solve

import (
	"context"
	"fmt"
	"math"

	"rundle/internal/runfolder"
	"rundle/mpo/ladder"
	"rundle/mps"
	"rundle/observables"
)

// judgeCutoff notes the largest probability of a full boson site, and makes the state suspect where it is above the square root of the
// precision. Bosons of max = 1 are left out: hard-core bosons are a model of their own, not a cut of another.
func judgeCutoff(ctx context.Context, s *runfolder.State, psi *mps.State, precision float64) error {
	lad := psi.Scope().Ladder()
	if !hasCutoff(lad) {
		return nil
	}
	occupations, err := observables.Occupations(ctx, psi)
	if err != nil {
		return err
	}
	top, at := -1.0, 0
	for i, p := range occupations {
		if n := lad.Site(i).Size(); cut(lad.Site(i)) && p[n] > top {
			top, at = p[n], i
		}
	}
	s.TopOccupation = &top
	if limit := math.Sqrt(precision); top > limit {
		leg, rung, site := lad.SiteAt(at)
		s.Verdict = runfolder.Suspect
		s.Reason = fmt.Sprintf("boson cutoff: the probability of n = %d is %.1e on leg %q, rung %d, above sqrt(precision) = %.1e; allow a larger max",
			site.Size(), top, leg, rung, limit)
	}
	return nil
}

func cut(s ladder.Site) bool { return s.Kind() == ladder.KindBoson && s.Size() > 1 }

func hasCutoff(l *ladder.Ladder) bool {
	for _, leg := range l.Legs() {
		if s, ok := l.LegSite(leg); ok && cut(s) {
			return true
		}
	}
	return false
}
