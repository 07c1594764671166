package ems

import (
	"slices"

	"guardrow/engine"
)

// zeroSearch asks quickly, without deriving the whole design again, whether a term has a test once a set of components is
// assumed zero.
type zeroSearch struct {
	model  *Model
	term   engine.Set
	budget *Budget
	lines  []engine.Set // those that contain the term, each after all its subsets
	null   []engine.Set // terms that are negligible already and have degrees of freedom
	zero   []bool       // by line: assumed zero in the trial at hand
	trial  []engine.Set
	value  []engine.Rational // by line: weight over multiplier
	used   []engine.Set
}

func newZeroSearch(m *Model, s engine.Set, budget *Budget) *zeroSearch {
	z := &zeroSearch{
		model: m, term: s, budget: budget,
		lines: slices.Collect(m.above(s)),
		zero:  make([]bool, len(m.Lines)),
		value: make([]engine.Rational, len(m.Lines)),
	}
	for i, t := range m.Design.Terms() {
		if m.line[i] < 0 && m.Design.DF(t) > 0 {
			z.null = append(z.null, t)
		}
	}
	return z
}

// candidates returns the terms that can matter when their components are assumed zero, those of highest order first: those
// that contain the term; those that could then pool into a line without degrees of freedom that the term needs; and those
// whose components keep such a term from pooling. No minimal set has any other member.
func (z *zeroSearch) candidates() []engine.Set {
	m := z.model
	matters := make([]bool, len(m.Lines))
	for _, t := range z.lines {
		matters[m.Line(t)] = true
	}
	for _, t := range append([]engine.Set{z.term}, z.lines...) {
		if m.Lines[m.Line(t)].DF == 0 {
			z.feeders(t, matters)
		}
	}
	var sets []engine.Set
	for i, l := range m.Lines[:len(m.Lines)-1] {
		if matters[i] && l.Set != z.term {
			sets = append(sets, l.Set)
		}
	}
	slices.Reverse(sets)
	return sets
}

// feeders marks the terms that could pool into line t, and what keeps them from it. The term under test is never assumed
// zero, so what its component keeps from pooling stays so.
func (z *zeroSearch) feeders(t engine.Set, matters []bool) {
	m := z.model
	feed := func(s engine.Set) {
		if z.budget.Steps < 0 || s == t || !t.Holds(s) || m.Design.DF(s) == 0 {
			return
		}
		blocks := func(u engine.Set) bool { return !u.Holds(t) && m.multiplier(s, u).Sign() != 0 }
		if z.term.Holds(s) && s != z.term && blocks(z.term) || s == z.term {
			return
		}
		if l := m.Line(s); l >= 0 {
			matters[l] = true
		}
		for u := range m.above(s) {
			z.budget.spend(1)
			if blocks(u) {
				matters[m.Line(u)] = true
			}
		}
	}
	for _, l := range m.inside(t) {
		feed(m.Lines[l].Set)
	}
	for _, s := range z.null {
		feed(s)
	}
}

// serves reports whether the term is testable with the given components zero. It is Solver.Test on the changed design,
// with only the question "any degrees of freedom?" asked of each line.
func (z *zeroSearch) serves(sets []engine.Set) bool {
	m := z.model
	z.trial = sets
	for _, s := range sets {
		z.zero[m.Line(s)] = true
	}
	defer func() {
		for _, s := range sets {
			z.zero[m.Line(s)] = false
		}
	}()
	if !z.available(z.term) {
		return false
	}
	z.used = z.used[:0]
	for _, t := range z.lines {
		l := m.Line(t)
		if z.zero[l] || m.multiplier(z.term, t).Sign() == 0 {
			continue
		}
		x := engine.Whole(1)
		for _, u := range z.used {
			if t.Holds(u) {
				x = x.Sub(z.value[m.Line(u)].Mul(m.ratio(z.term, u, t)))
			}
		}
		z.budget.spend(1 + len(z.used))
		if x.Sign() == 0 {
			continue
		}
		if !z.available(t) {
			return false
		}
		z.value[l] = x
		z.used = append(z.used, t)
	}
	return len(z.used) > 0
}

// available reports whether line t has degrees of freedom in the trial: its own and those pooled into it already stay;
// others come from terms assumed zero, or negligible before, that now pool into it.
func (z *zeroSearch) available(t engine.Set) bool {
	m := z.model
	if m.Lines[m.Line(t)].DF > 0 {
		return true
	}
	for _, list := range [][]engine.Set{z.trial, z.null} {
		for _, s := range list {
			z.budget.spend(1)
			if s != t && t.Holds(s) && m.Design.DF(s) > 0 && z.pools(s, t) {
				return true
			}
		}
	}
	return false
}

// pools reports whether the expectation of s, negligible, equals that of line t in the trial.
func (z *zeroSearch) pools(s, t engine.Set) bool {
	m := z.model
	for u := range m.above(s) {
		z.budget.spend(1)
		if z.zero[m.Line(u)] {
			continue
		}
		q := m.multiplier(s, u)
		if u.Holds(t) {
			if !q.Equal(m.multiplier(t, u)) {
				return false
			}
		} else if q.Sign() != 0 {
			return false
		}
	}
	return true
}

// larger says whether there are minimal sets of more than three components: a set that serves and contains none of the
// smaller sets found. All are tried while the budget lasts.
func (z *zeroSearch) larger(candidates []engine.Set, singles, small [][]int) Existence {
	var rest []int
	for c := range candidates {
		if !containsAny([]int{c}, singles) {
			rest = append(rest, c)
		}
	}
	for size := maxChanges + 1; size <= len(rest); size++ {
		chosen := make([]int, size)
		found := false
		sets := make([]engine.Set, size)
		whole := combinations(chosen, 0, 0, len(rest), func() bool {
			if z.budget.Steps < 0 {
				return false
			}
			picked := make([]int, size)
			for k, c := range chosen {
				picked[k] = rest[c]
				sets[k] = candidates[rest[c]]
			}
			z.budget.spend(1 + len(small))
			found = !containsAny(picked, small) && z.serves(sets)
			return !found
		}, nil)
		switch {
		case found:
			return Present
		case !whole:
			return Unknown
		}
	}
	return Absent
}
