package ems_test

import (
	"math/big"
	"slices"

	"guardrow/engine"
)

// compareGroups finds components that occur only together from the columns of the table of expectations, lines with
// degrees of freedom only: columns that are multiples of each other, and not empty.
func (s *subject) compareGroups() {
	s.t.Helper()
	var want [][]int
	grouped := make([]bool, len(s.terms))
	for a := range s.terms {
		if grouped[a] || s.pooled.null[a] || s.empty(a) {
			continue
		}
		group := []int{a}
		for b := a + 1; b < len(s.terms); b++ {
			if !s.pooled.null[b] && !s.empty(b) && s.proportional(a, b) {
				group = append(group, b)
				grouped[b] = true
			}
		}
		if len(group) > 1 {
			want = append(want, group)
		}
	}
	got := s.model.Inseparable()
	if len(got) != len(want) {
		s.errorf("inseparable are %v, by the expectations %v", got, want)
		return
	}
	for i, group := range want {
		if !slices.Equal(got[i].Sets, s.sets(group)) {
			s.errorf("inseparable are %v, by the expectations %v", got[i].Sets, s.sets(group))
			continue
		}
		equal := true
		for j, b := range group {
			share := s.share(group[0], b)
			equal = equal && share.Cmp(big.NewRat(1, 1)) == 0
			if got[i].Shares[j].String() != share.RatString() {
				s.errorf("%s has share %v beside %s, by the expectations %s", s.name(b), got[i].Shares[j], s.name(group[0]), share.RatString())
			}
		}
		s.cover.count("groups", 1)
		s.cover.when(len(group) > 2, "groups: of three or more")
		s.cover.when(!equal, "groups: unequal shares")
		s.cover.when(slices.ContainsFunc(group, func(k int) bool { return !s.terms[k].random }), "groups: with a fixed component")
	}
}

// seen reports whether line l is one that the study sees.
func (s *subject) seen(l int) bool { return !s.pooled.null[l] && s.pooled.df[l] > 0 }

func (s *subject) empty(t int) bool {
	for l := range s.terms {
		if s.seen(l) && s.matrix.row[l][t] != 0 {
			return false
		}
	}
	return true
}

func (s *subject) proportional(a, b int) bool {
	share := s.share(a, b)
	for l := range s.terms {
		if s.seen(l) && new(big.Rat).Mul(share, s.matrix.rat[l][a]).Cmp(s.matrix.rat[l][b]) != 0 {
			return false
		}
	}
	return true
}

// share returns b's coefficient over a's in the first line where a occurs.
func (s *subject) share(a, b int) *big.Rat {
	for l := range s.terms {
		if s.seen(l) && s.matrix.row[l][a] != 0 {
			return new(big.Rat).Quo(s.matrix.rat[l][b], s.matrix.rat[l][a])
		}
	}
	return nil
}

// compareEstimators holds every estimator to what it says: the expectation of its combination of mean squares is the sum
// of the components that it names, in the shares that it gives. Where it gives none, there is no combination of mean
// squares whose expectation is the component and others that are never seen in a line of their own.
func (s *subject) compareEstimators() {
	s.t.Helper()
	named := make(map[engine.Set]bool)
	for _, e := range s.model.Estimators(nil) {
		for _, set := range e.Sets {
			if k := s.position(set); s.pooled.null[k] || !s.terms[k].random {
				s.errorf("an estimator names %s", s.name(k))
			}
			named[set] = true
		}
		if len(e.Sets) != len(e.Shares) || e.Shares[0].String() != "1" {
			s.errorf("estimator %+v", e)
		}
		if e.Weights == nil {
			s.cover.count("estimators: none", 1)
			if len(e.With) == 0 && !s.empty(s.position(e.Sets[0])) {
				s.errorf("nothing estimates %v, and no company is named", e.Sets)
			}
			continue
		}
		s.cover.when(len(e.Sets) > 1, "estimators: of a sum")
		want := make([]*big.Rat, len(s.terms))
		for i, set := range e.Sets {
			want[s.position(set)] = e.Shares[i].Rat()
		}
		for t := range s.terms {
			if s.pooled.null[t] {
				continue
			}
			sum := new(big.Rat)
			for _, w := range e.Weights {
				l := s.position(w.Set)
				if !s.seen(l) {
					s.errorf("the estimator of %v uses %s", e.Sets, s.name(l))
				}
				sum.Add(sum, new(big.Rat).Mul(w.Weight.Rat(), s.matrix.rat[l][t]))
			}
			if want[t] == nil {
				want[t] = new(big.Rat)
			}
			if sum.Cmp(want[t]) != 0 {
				s.errorf("the estimator of %v holds %s of %s, and says %s", e.Sets, sum.RatString(), s.name(t), want[t].RatString())
			}
		}
	}
	for k, term := range s.terms {
		if term.random && !s.pooled.null[k] && !named[s.set(k)] {
			s.errorf("no estimator names %s", s.name(k))
		}
	}
}
