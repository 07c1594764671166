package ems

import (
	"cmp"
	"slices"

	"guardrow/engine"
)

// Weight is a line's weight in a combination of mean squares.
type Weight struct {
	Set    engine.Set
	Weight engine.Rational
}

// Test says what tests a term.
//
// Solution is the unique combination of other lines whose expectation equals E[MS_S] less S's own component; its weights
// sum to 1. One line gives an exact test, several an approximate one. Without a solution, Unmatched names the components
// that no line can match; NoDF says that the term itself has no degrees of freedom.
type Test struct {
	Set       engine.Set
	NoDF      bool
	Solution  []Weight // in the contract's order; nil where there is none
	Unmatched []engine.Set
}

// Exact reports whether one line alone tests the term.
func (t Test) Exact() bool { return len(t.Solution) == 1 }

// Testable reports whether the term has a test.
func (t Test) Testable() bool { return len(t.Solution) > 0 }

// HasNegative reports whether a line's weight is negative.
func (t Test) HasNegative() bool {
	for _, w := range t.Solution {
		if w.Weight.Sign() < 0 {
			return true
		}
	}
	return false
}

// Solver finds the tests of one model; it keeps scratch space between calls and is not safe for concurrent use.
type Solver struct {
	model *Model
	value []engine.Rational // by line: weight over multiplier
}

// NewSolver returns a solver for the model's tests.
func (m *Model) NewSolver() *Solver {
	return &Solver{model: m, value: make([]engine.Rational, len(m.Lines))}
}

// Test finds what tests line s, which is not the residual.
func (v *Solver) Test(s engine.Set) Test {
	if v.model.Lines[v.model.Line(s)].DF == 0 {
		return Test{Set: s, NoDF: true}
	}
	test := Test{Set: s}
	solution, unmatched := v.solve(s, nil)
	for _, u := range unmatched {
		test.Unmatched = append(test.Unmatched, u.Set)
	}
	if len(unmatched) == 0 {
		test.Solution = solution
	}
	return test
}

// solve finds the combination of lines whose expectation equals E[MS_S] less the components of s and of the terms in
// without; and, where no line can match a component, how much of it, over N(T), the combination lacks.
//
// Every line used contains s: the smallest sets among the lines used have components of their own that nothing else
// there holds, so these must occur in the target, which is made of supersets of s. Dividing each component by N(T), the
// condition at each T ⊋ S, smaller sets first, is
//
//	w(T) = m(S,T) − Σ over lines U used, S ⊊ U ⊊ T, of w(U)·m(U,T)
//
// which is forward substitution: exact, and unique. Where the right-hand side is not 0 but line T has no degrees of
// freedom, the component of T cannot be matched. Lines with a fixed component never have a weight: no target holds one.
//
// Where m(S,T) = 0, so is w(T): each w(U)·m(U,T) then has the same vanishing factor. Everywhere else the equation is solved
// for w(T)/m(S,T), which needs far smaller numbers: of the factors of m(S,U)·m(U,T)/m(S,T) only those remain that are
// crossed in U and bracketed in T (see ratio).
func (v *Solver) solve(s engine.Set, without []engine.Set) (solution, unmatched []Weight) {
	m := v.model
	used := make([]engine.Set, 0, 8)
	for t := range m.above(s) {
		l := m.Line(t)
		v.value[l] = engine.Rational{}
		if slices.Contains(without, t) || m.multiplier(s, t).Sign() == 0 {
			continue
		}
		x := v.need(s, t, used)
		switch {
		case x.Sign() == 0:
		case m.Lines[l].DF == 0:
			unmatched = append(unmatched, Weight{t, x.Mul(m.multiplier(s, t))})
		default:
			v.value[l] = x
			used = append(used, t)
		}
	}
	m.sort(used)
	solution = make([]Weight, len(used))
	for i, u := range used {
		solution[i] = Weight{u, v.value[m.Line(u)].Mul(m.multiplier(s, u))}
	}
	slices.SortFunc(unmatched, func(a, b Weight) int { return cmp.Compare(m.Design.Index(a.Set), m.Design.Index(b.Set)) })
	return solution, unmatched
}

// need returns w(T)/m(S,T) from the lines used so far.
func (v *Solver) need(s, t engine.Set, used []engine.Set) engine.Rational {
	m := v.model
	x := engine.Whole(1)
	take := func(u engine.Set, value engine.Rational) {
		x = x.Sub(value.Mul(m.ratio(s, u, t)))
	}
	// The sets between s and t are walked where that is shorter than looking at all lines used.
	free := t & m.Design.All() &^ s
	if free.Len() < 31 && 1<<free.Len() < len(used) {
		for sub := -free & free; sub != 0; sub = (sub - free) & free {
			u := s | sub
			if l := m.Line(u); l >= 0 && u != t && v.value[l].Sign() != 0 {
				take(u, v.value[l])
			}
		}
		return x
	}
	for _, u := range used {
		if t.Holds(u) {
			take(u, v.value[m.Line(u)])
		}
	}
	return x
}

// ratio returns m(S,U)·m(U,T)/m(S,T) for S ⊊ U ⊊ T and m(S,T) ≠ 0: the shrinkage of the factors that are crossed in U, not
// in S, and bracketed in T. Where nothing is bracketed it is 1.
func (m *Model) ratio(s, u, t engine.Set) engine.Rational {
	if !m.Design.Restricted() {
		return engine.Whole(1)
	}
	return m.shrinkage(m.Design.Crossed(u) &^ s &^ m.Design.Crossed(t))
}

// Numerator returns the lines of F's numerator with their weights, in the contract's order: the term's own line and, in the
// sum form, those with a negative weight in the solution (Cochran 1951).
func (t Test) Numerator(difference bool) []Weight {
	lines := []Weight{{t.Set, engine.Whole(1)}}
	for _, w := range t.Solution {
		if !difference && w.Weight.Sign() < 0 {
			lines = append(lines, Weight{w.Set, w.Weight.Neg()})
		}
	}
	return lines
}

// Denominator returns the lines of F's denominator: in the sum form those with a positive weight in the solution, in the
// difference form all of them.
func (t Test) Denominator(difference bool) []Weight {
	if difference {
		return t.Solution
	}
	lines := make([]Weight, 0, len(t.Solution))
	for _, w := range t.Solution {
		if w.Weight.Sign() > 0 {
			lines = append(lines, w)
		}
	}
	return lines
}
