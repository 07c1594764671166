package ems

import (
	"slices"

	"guardrow/engine"
)

// maxChanges is the largest number of changes, or of components assumed zero, that a remedy combines.
const maxChanges = 3

// maxRemedies is the largest number of remedies listed for one test.
const maxRemedies = 200

// Remedy is a change of the design under which a term has a test, derived again in full. No part of it suffices alone.
type Remedy struct {
	Raise []int        // factors with one level raised to two; engine.MaxFactors stands for the replicates
	Zero  []engine.Set // terms whose components are assumed zero
	Model *Model       // of the changed design
	Test  Test         // of the term, there
}

// Existence says whether something exists, where that was found out.
type Existence int

// What is known of minimal sets of more than three components to assume zero.
const (
	Unknown Existence = iota
	Absent
	Present
)

// Remedies is what makes a term testable.
type Remedies struct {
	List     []Remedy
	Complete bool      // List holds every minimal remedy of up to three changes of one kind
	Larger   Existence // minimal sets of more than three components to assume zero
}

// Budget bounds the work of a search, in steps of derivation, so that the same request does the same work everywhere.
type Budget struct{ Steps int }

func (b *Budget) spend(n int) bool {
	b.Steps -= n
	return b.Steps >= 0
}

// Remedies finds what would make term t.Set testable: all minimal sets of up to three factors with one level (or the
// replicates) to raise to two, then all minimal sets of up to three components to assume zero, smaller sets first and
// interactions of higher order first among sets of one size.
//
// Every remedy was found by deriving the changed design; the search stops when the budget is spent, and says so.
func (m *Model) Remedies(t Test, budget *Budget) Remedies {
	r := Remedies{Complete: true, Larger: Absent}
	if budget.Steps < 0 {
		return Remedies{}
	}
	m.raise(t.Set, budget, &r)
	if t.NoDF && !m.Design.IsRandom(t.Set) {
		return r // nothing pools into the line of a fixed term
	}
	m.assume(t.Set, budget, &r)
	return r
}

// raise searches sets of one-level factors to replicate.
func (m *Model) raise(s engine.Set, budget *Budget, r *Remedies) {
	var candidates []int
	for i, f := range m.Design.Factors() {
		if f.Levels == 1 && f.Population != 1 {
			candidates = append(candidates, i)
		}
	}
	if m.Design.Replicates() == 1 {
		candidates = append(candidates, engine.MaxFactors)
	}
	complete := minimalSets(len(candidates), maxChanges, func(chosen []int) verdict {
		if len(r.List) >= maxRemedies || !budget.spend(8*len(m.Design.Terms())) {
			return stop
		}
		d := m.Design
		raised := make([]int, len(chosen))
		for k, c := range chosen {
			raised[k] = candidates[c]
			d = d.WithLevels(candidates[c], 2)
		}
		changed := New(d)
		test := changed.NewSolver().Test(s)
		if !test.Testable() {
			return fails
		}
		r.List = append(r.List, Remedy{Raise: raised, Model: changed, Test: test})
		return serves
	})
	r.Complete = r.Complete && complete
}

// assume searches sets of components to assume zero.
func (m *Model) assume(s engine.Set, budget *Budget, r *Remedies) {
	z := newZeroSearch(m, s, budget)
	candidates := z.candidates()
	if budget.Steps < 0 {
		r.Complete, r.Larger = false, Unknown
		return
	}
	var singles, small [][]int
	complete := minimalSets(len(candidates), maxChanges, func(chosen []int) verdict {
		if len(r.List) >= maxRemedies || budget.Steps < 0 {
			return stop
		}
		sets := make([]engine.Set, len(chosen))
		for k, c := range chosen {
			sets[k] = candidates[c]
		}
		if !z.serves(sets) {
			return fails
		}
		if !budget.spend(8 * len(m.Design.Terms())) {
			return stop
		}
		m.sort(sets)
		changed := New(m.Design.WithNegligible(sets...))
		test := changed.NewSolver().Test(s)
		if !test.Testable() {
			panic("ems: a remedy found by search does not serve when derived again")
		}
		r.List = append(r.List, Remedy{Zero: sets, Model: changed, Test: test})
		if len(chosen) == 1 {
			singles = append(singles, slices.Clone(chosen))
		} else {
			small = append(small, slices.Clone(chosen))
		}
		return serves
	})
	r.Complete = r.Complete && complete
	r.Larger = Unknown
	if complete {
		r.Larger = z.larger(candidates, singles, small)
	}
}

// verdict is what a trial of a set of changes found.
type verdict int

const (
	fails verdict = iota
	serves
	stop
)

// minimalSets tries all subsets of 0 … n−1 with up to largest members, smaller ones first, leaving out those that contain
// one that serves. It reports whether it came to the end.
func minimalSets(n, largest int, try func(chosen []int) verdict) bool {
	var served [][]int
	for size := 1; size <= min(n, largest); size++ {
		chosen := make([]int, size)
		if !combinations(chosen, 0, 0, n, func() bool {
			if containsAny(chosen, served) {
				return true
			}
			switch try(chosen) {
			case stop:
				return false
			case serves:
				served = append(served, slices.Clone(chosen))
			case fails:
			}
			return true
		}, served) {
			return false
		}
	}
	return true
}

// combinations fills chosen[k:] with ascending indexes from first to n−1 in every way. Partial choices that contain one of
// skip are cut short.
func combinations(chosen []int, k, first, n int, visit func() bool, skip [][]int) bool {
	if k == len(chosen) {
		return visit()
	}
	for i := first; i <= n-(len(chosen)-k); i++ {
		chosen[k] = i
		if k+1 < len(chosen) && containsAny(chosen[:k+1], skip) {
			continue
		}
		if !combinations(chosen, k+1, i+1, n, visit, skip) {
			return false
		}
	}
	return true
}

// containsAny reports whether the ascending list holds one of the ascending lists of sets whole.
func containsAny(list []int, sets [][]int) bool {
	for _, set := range sets {
		k := 0
		for _, x := range list {
			if k < len(set) && set[k] == x {
				k++
			}
		}
		if k == len(set) {
			return true
		}
	}
	return false
}
