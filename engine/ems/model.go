// Package ems derives, from a checked design, what each mean square expects and so what tests what: expected mean squares
// with exact coefficients, pooling of negligible terms, the exact or approximate test of every term, and the remedies
// where there is none.
//
// Everything is arithmetic on terms as sets of factors (engine.Set). With E[MS_S] = Σ over T ⊇ S of c(S,T)·component(T),
// every coefficient is c(S,T) = N(T)·m(S,T): N(T) observations behind each effect of T, which does not depend on S, and
// a multiplier m(S,T) that is 1, 0 or, for finite populations, a fraction. Weights of lines follow from the multipliers
// alone (see Model.Test).
package ems

import (
	"cmp"
	"math/bits"
	"slices"

	"guardrow/engine"
)

// Line is a line of the model after pooling: a term that is not negligible.
type Line struct {
	Set    engine.Set
	Own    int64        // degrees of freedom of its own
	DF     int64        // with those of the terms pooled into it
	Pooled []engine.Set // terms pooled into it, in the contract's order
}

// Model is a design with its negligible terms pooled. It is immutable and safe to share.
type Model struct {
	Design *engine.Design
	Lines  []Line       // in the contract's order, the residual last
	Apart  []engine.Set // negligible terms that pool with no line, in the contract's order

	line  []int32 // by position in Design.Terms: position in Lines, -1 where negligible
	fixed engine.Set
}

// New pools a design's negligible terms.
//
// A negligible term loses its component; its line pools (df, and later SS, added) with the line whose expectation then
// equals its own. If no line's does, it stays apart and tests nothing.
func New(d *engine.Design) *Model {
	m := &Model{Design: d, fixed: d.All() &^ d.RandomFactors()}
	terms := d.Terms()
	m.line = make([]int32, len(terms))
	m.Lines = make([]Line, 0, len(terms)-d.NegligibleCount())
	for i, s := range terms {
		m.line[i] = -1
		if !d.Negligible(s) {
			m.line[i] = int32(len(m.Lines))
			df := d.DF(s)
			m.Lines = append(m.Lines, Line{Set: s, Own: df, DF: df})
		}
	}
	if d.NegligibleCount() == 0 {
		return m
	}
	for i, s := range terms {
		if m.line[i] >= 0 {
			continue
		}
		if u := m.pool(s); u >= 0 {
			l := &m.Lines[u]
			l.Pooled = append(l.Pooled, s)
			l.DF += d.DF(s)
		} else {
			m.Apart = append(m.Apart, s)
		}
	}
	return m
}

// Line returns the position in Lines of term s, or -1 where it is negligible or no term.
func (m *Model) Line(s engine.Set) int {
	i := m.Design.Index(s)
	if i < 0 {
		return -1
	}
	return int(m.line[i])
}

// pool returns the line whose expectation equals that of the negligible term s, or -1.
//
// The components left in E[MS_s] belong to terms T ⊋ s. The line's own term U is one of them and, since every component
// of its expectation belongs to a superset of U, the smallest: the intersection of all. That leaves one candidate, whose
// multipliers must be the same.
func (m *Model) pool(s engine.Set) int {
	meet := m.Design.Residual()
	for t := range m.above(s) {
		if m.multiplier(s, t).Sign() != 0 {
			meet &= t
		}
	}
	u := m.Line(meet)
	if u < 0 {
		return -1
	}
	for t := range m.above(s) {
		q := m.multiplier(s, t)
		if t.Holds(meet) {
			if !q.Equal(m.multiplier(meet, t)) {
				return -1
			}
		} else if q.Sign() != 0 {
			return -1
		}
	}
	return u
}

// above yields the sets of all lines that properly contain s, each after all its subsets.
func (m *Model) above(s engine.Set) func(yield func(engine.Set) bool) {
	return func(yield func(engine.Set) bool) {
		free := m.Design.All() &^ s
		// Counting through the subsets of free: (sub − free) & free is the next one.
		for sub := -free & free; sub != 0; sub = (sub - free) & free {
			if i := m.Design.Index(s | sub); i >= 0 && m.line[i] >= 0 && !yield(s|sub) {
				return
			}
		}
		if residual := m.Design.Residual(); s != residual {
			yield(residual)
		}
	}
}

// multiplier returns m(S,T) for S ⊆ T: the product over the crossed factors of T that are not in S of
//
//	restricted:    0 if the factor is fixed, 1 − a/A if its a levels came from a population of A, 1 if random
//	unrestricted:  1; but 0 where T is fixed and T ≠ S
//
// (Cornfield and Tukey 1956). It is 1 for T = S.
func (m *Model) multiplier(s, t engine.Set) engine.Rational {
	if s == t {
		return engine.Whole(1)
	}
	d := m.Design
	if !d.Restricted() {
		if d.IsRandom(t) {
			return engine.Whole(1)
		}
		return engine.Rational{}
	}
	return m.shrinkage(d.Crossed(t) &^ s)
}

// shrinkage returns, under the restricted constraint, the product over a set of factors of 0 for a fixed one, 1 − a/A for one
// from a finite population, and 1 for any other.
func (m *Model) shrinkage(factors engine.Set) engine.Rational {
	if factors&m.fixed != 0 {
		return engine.Rational{}
	}
	q := engine.Whole(1)
	for rest := factors & m.Design.FiniteFactors(); rest != 0; rest &= rest - 1 {
		f := m.Design.Factors()[bits.TrailingZeros32(uint32(rest))]
		q = q.Mul(engine.Fraction(f.Population-f.Levels, f.Population))
	}
	return q
}

// sort puts terms in the contract's order.
func (m *Model) sort(sets []engine.Set) {
	slices.SortFunc(sets, func(a, b engine.Set) int { return cmp.Compare(m.Design.Index(a), m.Design.Index(b)) })
}
