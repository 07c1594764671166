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
	model  *Model
	weight []engine.Rational // by line
}

// NewSolver returns a solver for the model's tests.
func (m *Model) NewSolver() *Solver {
	return &Solver{model: m, weight: make([]engine.Rational, len(m.Lines))}
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
func (v *Solver) solve(s engine.Set, without []engine.Set) (solution, unmatched []Weight) {
	m := v.model
	used := make([]engine.Set, 0, 8)
	for t := range m.above(s) {
		l := m.Line(t)
		v.weight[l] = engine.Rational{}
		if slices.Contains(without, t) {
			continue
		}
		w := v.need(s, t, used)
		switch {
		case w.Sign() == 0:
		case m.Lines[l].DF == 0:
			unmatched = append(unmatched, Weight{t, w})
		default:
			v.weight[l] = w
			used = append(used, t)
		}
	}
	m.sort(used)
	solution = make([]Weight, len(used))
	for i, u := range used {
		solution[i] = Weight{u, v.weight[m.Line(u)]}
	}
	slices.SortFunc(unmatched, func(a, b Weight) int { return cmp.Compare(m.Design.Index(a.Set), m.Design.Index(b.Set)) })
	return solution, unmatched
}

// need returns what is still missing of the component of t, over N(t), after the lines used so far.
func (v *Solver) need(s, t engine.Set, used []engine.Set) engine.Rational {
	m := v.model
	w := m.multiplier(s, t)
	if inner := (t & m.Design.All() &^ s).Len(); inner < 31 && 1<<inner < len(used) {
		v.needBySubsets(s, t, &w)
		return w
	}
	for _, u := range used {
		if t.Holds(u) {
			w = w.Sub(v.weight[m.Line(u)].Mul(m.multiplier(u, t)))
		}
	}
	return w
}

// needBySubsets does the same by walking the sets between s and t, which is shorter where most lines are used.
func (v *Solver) needBySubsets(s, t engine.Set, w *engine.Rational) {
	m := v.model
	free := t & m.Design.All() &^ s
	for sub := -free & free; sub != 0; sub = (sub - free) & free {
		u := s | sub
		if u == t {
			continue
		}
		if l := m.Line(u); l >= 0 && v.weight[l].Sign() != 0 {
			*w = w.Sub(v.weight[l].Mul(m.multiplier(u, t)))
		}
	}
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
