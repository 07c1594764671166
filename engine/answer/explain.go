package answer

import (
	"fmt"
	"strings"

	"guardrow/engine"
	"guardrow/engine/ems"
)

// spelledOut is how many lines or components a sentence names one by one.
const spelledOut = 6

// explain says in plain words what tests a term, or why nothing does.
func (t *tester) explain(test ems.Test) string {
	name := t.name(test.Set)
	switch {
	case test.NoDF:
		return t.noDF(t.model, test.Set)
	case !test.Testable():
		return t.unmatched(test)
	case test.Exact():
		line := test.Solution[0].Set
		return fmt.Sprintf("%s is tested against %s: if %s, both mean squares would estimate the same quantity. The test is exact, with %d and %d degrees of freedom.",
			name, t.name(line), t.null(test.Set), t.model.Lines[t.model.Line(test.Set)].DF, t.model.Lines[t.model.Line(line)].DF)
	}
	return t.approximate(test)
}

// null states the hypothesis that a test is about.
func (t *tester) null(s engine.Set) string {
	if t.design.IsRandom(s) {
		return fmt.Sprintf("%s added no variation of its own", t.name(s))
	}
	return fmt.Sprintf("%s had no effect", t.name(s))
}

func (t *tester) approximate(test ems.Test) string {
	combination := fmt.Sprintf("a combination of %d lines", len(test.Solution))
	if len(test.Solution) <= spelledOut {
		combination = t.combination(test.Solution)
	}
	how := "The ratio's degrees of freedom follow from Satterthwaite's formula"
	if test.HasNegative() {
		if t.difference {
			how = "That difference is the error here; it can come out negative, and its degrees of freedom, by Satterthwaite's formula, can fall towards 0"
		} else {
			how = "The part that is subtracted is added to the numerator instead, so that no mean square is negative, and the degrees of freedom of both sides follow from Satterthwaite's formula"
		}
	}
	return fmt.Sprintf("%s has an approximate test. If %s, no single line would estimate the same quantity as its mean square, but %s would. %s.", t.name(test.Set), t.null(test.Set), combination, how)
}

// combination writes a weighted sum of mean squares, such as "MS(a) + 1/2 MS(b) − MS(c)".
func (t *tester) combination(weights []ems.Weight) string {
	var text strings.Builder
	for i, w := range weights {
		weight := w.Weight
		switch {
		case weight.Sign() < 0:
			weight = weight.Neg()
			if i == 0 {
				text.WriteString("−")
			} else {
				text.WriteString(" − ")
			}
		case i > 0:
			text.WriteString(" + ")
		}
		if !weight.IsOne() {
			text.WriteString(weight.String() + " ")
		}
		text.WriteString("MS(" + t.name(w.Set) + ")")
	}
	return text.String()
}

// noDF says why a line has no degrees of freedom.
func (n *namer) noDF(m *ems.Model, s engine.Set) string {
	return fmt.Sprintf("%s has no degrees of freedom, because %s. So it cannot be tested.", n.name(s), n.single(m, s))
}

// single names what in a line without degrees of freedom occurs only once.
func (n *namer) single(m *ems.Model, s engine.Set) string {
	if s == n.design.Residual() {
		return "each combination of levels was observed only once"
	}
	var names []string
	within := engine.Set(0)
	for _, i := range m.Design.Crossed(s).Members() {
		if f := n.design.Factors()[i]; f.Levels == 1 {
			names = append(names, f.Name)
			within |= f.Above
		}
	}
	has := " has only one level"
	if len(names) > 1 {
		has = " have only one level each"
	}
	text := enumerate(names) + has
	if within != 0 {
		text += " within each combination of " + enumerate(n.design.Names(within))
		if within.Len() == 1 {
			text = enumerate(names) + has + " within each level of " + n.design.Names(within)[0]
		}
	}
	return text
}

func (t *tester) unmatched(test ems.Test) string {
	var reasons []string
	names := make(map[string][]string)
	for i, u := range test.Unmatched {
		reason, what := t.single(t.model, u), t.name(u)
		if u == t.design.Residual() {
			what = "single observations (the residual)"
		}
		if i >= spelledOut && len(test.Unmatched) > spelledOut+1 {
			reason, what = reasons[len(reasons)-1], fmt.Sprintf("%d more terms", len(test.Unmatched)-i)
		}
		if names[reason] == nil {
			reasons = append(reasons, reason)
		}
		names[reason] = append(names[reason], what)
		if i >= spelledOut && len(test.Unmatched) > spelledOut+1 {
			break
		}
	}
	parts := make([]string, len(reasons))
	for i, reason := range reasons {
		parts[i] = fmt.Sprintf("the variation of %s, which no line shows by itself because %s", enumerate(names[reason]), reason)
	}
	return fmt.Sprintf("%s cannot be tested. Even if %s, its mean square would hold %s. So there is nothing to compare it with.",
		t.name(test.Set), t.null(test.Set), strings.Join(parts, "; and "))
}

// enumerate writes a list as a person would: "a", "a and b", "a, b and c".
func enumerate(names []string) string {
	if len(names) < 2 {
		return strings.Join(names, "")
	}
	return strings.Join(names[:len(names)-1], ", ") + " and " + names[len(names)-1]
}
