package ems

import (
	"cmp"
	"slices"
	"strings"

	"guardrow/engine"
)

// Component is a component of variance in an expectation: σ² of a random term, or κ² = Σ(effect²)/df of a fixed one, with
// its coefficient, not 0.
type Component struct {
	Set         engine.Set
	Coefficient engine.Rational
}

// Coefficient returns c(S,T), the coefficient of the component of term t in the expectation of line s ⊆ t:
//
//	c(S,T) = Π over factors not in T of (levels) × m(S,T)
//
// with the replicates counted among the levels of factors not in T unless T is the residual.
func (m *Model) Coefficient(s, t engine.Set) engine.Rational {
	q := m.multiplier(s, t)
	if q.Sign() == 0 {
		return q
	}
	return engine.Whole(m.Design.Behind(t)).Mul(q)
}

// Expectation returns the components of E[MS_S], the residual's first and then in the reverse of the contract's order, so
// that the term's own is last.
func (m *Model) Expectation(s engine.Set) []Component {
	components := make([]Component, 0, 8)
	add := func(t engine.Set) {
		if q := m.Coefficient(s, t); q.Sign() != 0 {
			components = append(components, Component{t, q})
		}
	}
	if m.Line(s) >= 0 {
		add(s)
	}
	for t := range m.above(s) {
		add(t)
	}
	slices.SortFunc(components, func(a, b Component) int {
		return cmp.Compare(m.Design.Index(b.Set), m.Design.Index(a.Set))
	})
	return components
}

// CountComponents returns how many components the expectations of the given lines hold in all, and stops counting once
// there are more than limit.
func (m *Model) CountComponents(lines []engine.Set, limit int) int {
	n := 0
	for _, s := range lines {
		n++
		for t := range m.above(s) {
			if m.multiplier(s, t).Sign() != 0 {
				n++
			}
		}
		if n > limit {
			return n
		}
	}
	return n
}

// Formula returns the coefficient c(S,T) in level symbols: lower-case letters for level counts, capitals for the sizes of
// populations, such as "bn(1 - c/C)"; "1" for an empty product.
func (m *Model) Formula(s, t engine.Set) string {
	return m.formula(s, t, func(level, population string) string { return "(1 - " + level + "/" + population + ")" })
}

// LatexFormula is Formula in LaTeX.
func (m *Model) LatexFormula(s, t engine.Set) string {
	return m.formula(s, t, func(level, population string) string {
		return `\left(1 - \frac{` + level + "}{" + population + `}\right)`
	})
}

func (m *Model) formula(s, t engine.Set, factor func(level, population string) string) string {
	d := m.Design
	var text strings.Builder
	text.WriteString(d.LevelSymbols(d.Residual() &^ t))
	if s != t {
		for _, i := range (d.Crossed(t) &^ s & d.FiniteFactors()).Members() {
			f := d.Factors()[i]
			text.WriteString(factor(strings.ToLower(f.Symbol), f.Symbol))
		}
	}
	if text.Len() == 0 {
		return "1"
	}
	return text.String()
}
