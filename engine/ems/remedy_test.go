package ems_test

import (
	"fmt"
	"math"
	"math/bits"
	"math/rand/v2"
	"slices"
	"testing"

	"guardrow/engine"
	"guardrow/engine/ems"
)

// TestRandomRemedies compares the remedies of terms without a test with what is found by trying every set of components
// to assume zero and every set of one-level factors to replicate, each by elimination over the whole table of
// expectations.
func TestRandomRemedies(t *testing.T) {
	cover := make(coverage)
	random := rand.New(rand.NewPCG(*seed, 5))
	for range effort(t, 900) {
		p := randomPlan(random, invention{factors: 4, rows: 400, negligible: true})
		s := newSubject(t, cover, p)
		solver := s.model.NewSolver()
		for k := range s.terms[:len(s.terms)-1] {
			if s.pooled.null[k] {
				continue
			}
			test := solver.Test(s.set(k))
			if test.Testable() {
				continue
			}
			r := s.model.Remedies(test, &ems.Budget{Steps: math.MaxInt})
			if !r.Complete || len(r.List) >= 200 {
				s.errorf("the remedies of %s were not all found: %d", s.name(k), len(r.List))
			}
			s.compareZero(k, r)
			s.compareRaise(k, r)
		}
		if t.Failed() {
			return
		}
	}
	cover.report(t, "terms without a test", "zero: of 1", "zero: of 2", "zero: of 3", "zero: none", "zero: a fixed component",
		"zero: a term without df of its own", "zero: a component that the term's line does not hold", "zero: for a term without df", "zero: only by the df of a term that was pooled elsewhere",
		"larger: tried", "larger: present", "larger: absent",
		"raise: of 1", "raise: of 2", "raise: of 3", "raise: the replicates", "raise: none", "raise: for a term without df")
}

// compareZero tries all sets of up to three components, or of any number where they are few.
func (s *subject) compareZero(k int, r ems.Remedies) {
	s.t.Helper()
	var candidates []int
	for l := range s.terms[:len(s.terms)-1] {
		if l != k && !s.pooled.null[l] {
			candidates = append(candidates, l)
		}
	}
	few := len(candidates) <= 9
	var minimal []uint32
	larger := false
	for _, chosen := range bySize(len(candidates), few) {
		if slices.ContainsFunc(minimal, func(m uint32) bool { return m&chosen == m }) {
			continue
		}
		if s.testable(s.matrix, s.matrix.pool(s.df, s.alsoNull(candidates, chosen)), k) {
			minimal = append(minimal, chosen)
			larger = larger || bits.OnesCount32(chosen) > 3
		}
	}
	want := make(map[string][]int)
	for _, chosen := range minimal {
		if bits.OnesCount32(chosen) <= 3 {
			terms := members(candidates, chosen)
			want[fmt.Sprint(terms)] = terms
		}
	}
	size, last := 0, 0
	for _, remedy := range r.List {
		if len(remedy.Zero) == 0 {
			continue
		}
		var terms []int
		for _, set := range remedy.Zero {
			terms = append(terms, s.position(set))
		}
		if want[fmt.Sprint(terms)] == nil || len(remedy.Raise) > 0 || len(terms) < last {
			s.errorf("assuming %v null does not make %s testable, or a part of it does, or smaller sets come later", terms, s.name(k))
			continue
		}
		delete(want, fmt.Sprint(terms))
		size, last = size+1, len(terms)
		changed := s.plan.alsoNegligible(s.reference, terms)
		s.compareAfter(k, remedy, changed)
		s.countZero(k, terms, s.changed(changed))
	}
	for _, terms := range want {
		s.errorf("assuming %v null makes %s testable, and is not among the remedies", s.sets(terms), s.name(k))
	}
	s.cover.count("terms without a test", 1)
	s.cover.when(size == 0, "zero: none")
	if few {
		s.cover.count("larger: tried", 1)
		s.cover.when(larger, "larger: present")
		s.cover.when(!larger, "larger: absent")
		if wanted := map[bool]ems.Existence{true: ems.Present, false: ems.Absent}[larger]; r.Larger != wanted {
			s.errorf("minimal sets of more than three for %s: the engine says %v, all sets tried say %v", s.name(k), r.Larger, wanted)
		}
	}
}

func (s *subject) countZero(k int, terms []int, after *subject) {
	s.cover.count(fmt.Sprintf("zero: of %d", len(terms)), 1)
	s.cover.when(s.pooled.df[k] == 0, "zero: for a term without df")
	for _, l := range terms {
		s.cover.when(!s.terms[l].random, "zero: a fixed component")
		s.cover.when(s.df[l] == 0, "zero: a term without df of its own")
		s.cover.when(s.matrix.row[k][l] == 0, "zero: a component that the term's line does not hold")
	}
	without := *after.pooled
	without.df = slices.Clone(without.df)
	for x, into := range s.pooled.into {
		if now := after.pooled.into[x]; into >= 0 && now >= 0 && now != into {
			without.df[now] -= s.df[x]
		}
	}
	s.cover.when(!after.testable(after.matrix, &without, k), "zero: only by the df of a term that was pooled elsewhere")
}

// bySize returns all sets of up to three of n things, or of any number, as bits, smaller sets first.
func bySize(n int, mixed bool) []uint32 {
	var sets []uint32
	for chosen := uint32(1); chosen < 1<<n; chosen++ {
		if mixed || bits.OnesCount32(chosen) <= 3 {
			sets = append(sets, chosen)
		}
	}
	slices.SortStableFunc(sets, func(a, b uint32) int { return bits.OnesCount32(a) - bits.OnesCount32(b) })
	return sets
}

func members(candidates []int, chosen uint32) []int {
	var list []int
	for i, c := range candidates {
		if chosen>>i&1 == 1 {
			list = append(list, c)
		}
	}
	return list
}

func (s *subject) alsoNull(candidates []int, chosen uint32) []bool {
	null := slices.Clone(s.pooled.null)
	for _, k := range members(candidates, chosen) {
		null[k] = true
	}
	return null
}

// alsoNegligible returns the plan with further terms declared null.
func (p *plan) alsoNegligible(r *reference, terms []int) *plan {
	q := p.clone()
	for _, k := range terms {
		q.negligible = append(q.negligible, r.terms[k].crossed)
	}
	return q
}

// compareAfter derives the changed plan afresh and compares the remedy's test, and its lines, with what that gives.
func (s *subject) compareAfter(k int, remedy ems.Remedy, changed *plan) {
	s.t.Helper()
	after := *s.changed(changed)
	after.t, after.cover, after.design, after.model = s.t, make(coverage), remedy.Model.Design, remedy.Model
	after.comparePooling()
	after.compareTest(k, remedy.Test)
	if !remedy.Test.Testable() || remedy.Test.Set != s.set(k) {
		s.errorf("a remedy of %s is %+v", s.name(k), remedy)
	}
}

// changed derives a changed plan from its own rows, once for all terms.
func (s *subject) changed(p *plan) *subject {
	key := p.String()
	if after, done := s.derived[key]; done {
		return after
	}
	after := &subject{reference: newReference(p)}
	after.matrix = newMatrix(after.expectations())
	after.pooled = after.matrix.pool(after.df, after.declaredNull())
	s.derived[key] = after
	return after
}

// compareRaise tries all sets of up to three factors with one level, and the replicates where there is one.
func (s *subject) compareRaise(k int, r ems.Remedies) {
	s.t.Helper()
	p := s.plan
	var candidates []int
	for i, f := range p.factors {
		if f.levels == 1 && f.population != 1 {
			candidates = append(candidates, i)
		}
	}
	if p.replicates == 1 {
		candidates = append(candidates, engine.MaxFactors)
	}
	want := make(map[string]*plan)
	var minimal []uint32
	for _, chosen := range bySize(len(candidates), false) {
		if slices.ContainsFunc(minimal, func(m uint32) bool { return m&chosen == m }) {
			continue
		}
		changed := p.clone()
		for _, i := range members(candidates, chosen) {
			if i == engine.MaxFactors {
				changed.replicates = 2
			} else {
				changed.factors[i].levels = 2
			}
		}
		if after := s.changed(changed); after.testable(after.matrix, after.pooled, k) {
			minimal = append(minimal, chosen)
			want[fmt.Sprint(members(candidates, chosen))] = changed
		}
	}
	found := len(want)
	for _, remedy := range r.List {
		if len(remedy.Raise) == 0 {
			continue
		}
		key := fmt.Sprint(remedy.Raise)
		if want[key] == nil || len(remedy.Zero) > 0 {
			s.errorf("raising %v does not make %s testable, or a part of it does", remedy.Raise, s.name(k))
			continue
		}
		s.compareAfter(k, remedy, want[key])
		delete(want, key)
		s.cover.count(fmt.Sprintf("raise: of %d", len(remedy.Raise)), 1)
		s.cover.when(slices.Contains(remedy.Raise, engine.MaxFactors), "raise: the replicates")
		s.cover.when(s.pooled.df[k] == 0, "raise: for a term without df")
	}
	s.cover.when(found == 0, "raise: none")
	for raised := range want {
		s.errorf("raising %s makes %s testable, and is not among the remedies", raised, s.name(k))
	}
}
