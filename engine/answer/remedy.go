package answer

import (
	"fmt"
	"strings"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// remedies fills in what would make a term testable.
func (t *tester) remedies(test ems.Test, out *api.Test) {
	budget := ems.Budget{Steps: min(t.budget, searchStepsPerTest)}
	before := budget.Steps
	found := t.model.Remedies(test, &budget)
	t.budget -= before - budget.Steps
	for _, r := range found.List {
		// A remedy names its terms, and the lines of the test that follows, some ten times in all.
		if t.room -= 10 * nameBytes(t.design); t.room < 0 {
			found.Complete, found.Larger = false, ems.Unknown
			break
		}
		out.Remedies = append(out.Remedies, t.remedy(test, r))
	}
	out.RemediesComplete = &found.Complete
	out.LargerSets = map[ems.Existence]string{ems.Present: api.LargerSetsExist, ems.Absent: api.LargerSetsNone, ems.Unknown: api.LargerSetsUnknown}[found.Larger]
}

func (t *tester) remedy(before ems.Test, r ems.Remedy) api.Remedy {
	after := r.Test
	effect := api.RemedyEffect{
		Term: t.term(after.Set), StatusBefore: status(before), StatusAfter: status(after),
		NumeratorAfter:   t.weights(r.Model, after.Numerator(t.difference)),
		DenominatorAfter: t.weights(r.Model, after.Denominator(t.difference)),
	}
	effect.DFDenominatorAfter, effect.DFDenominatorBoundsAfter = t.df(r.Model, after.Denominator(t.difference))
	out := api.Remedy{Factors: []string{}, Effect: []api.RemedyEffect{effect}}
	var action string
	if r.Zero != nil {
		action = t.assume(r.Zero, &out)
	} else {
		action = t.raise(r.Raise, &out)
	}
	out.Text = fmt.Sprintf("%s Then %s.", action, t.outcome(r))
	if r.Zero != nil {
		out.Text += " Assume this only if there are grounds for it other than these data."
	}
	return out
}

// outcome says what tests the term after a remedy.
func (t *tester) outcome(r ems.Remedy) string {
	after := &tester{namer: t.namer, model: r.Model, difference: t.difference}
	if r.Test.Exact() {
		line := r.Test.Solution[0].Set
		return fmt.Sprintf("%s is tested exactly against %s, with %d and %d degrees of freedom", t.name(r.Test.Set), t.name(line),
			r.Model.Lines[r.Model.Line(r.Test.Set)].DF, r.Model.Lines[r.Model.Line(line)].DF)
	}
	if len(r.Test.Solution) > spelledOut {
		return fmt.Sprintf("%s has an approximate test against a combination of %d lines", t.name(r.Test.Set), len(r.Test.Solution))
	}
	return fmt.Sprintf("%s has an approximate test against %s", t.name(r.Test.Set), after.combination(r.Test.Solution))
}

// raise writes the remedy that replicates what occurs only once.
func (t *tester) raise(raised []int, out *api.Remedy) string {
	out.Action = api.Replicate
	var parts []string
	for _, i := range raised {
		if i == engine.MaxFactors {
			out.Change.Replicates = 2
			parts = append(parts, "take at least 2 observations of every combination instead of 1")
			continue
		}
		f := t.design.Factors()[i]
		if out.Change.Levels == nil {
			out.Change.Levels = make(map[string]int64, len(raised))
		}
		out.Change.Levels[f.Name] = 2
		out.Factors = append(out.Factors, f.Name)
		part := "use at least 2 levels of " + f.Name
		if f.Above != 0 {
			part += " within each " + strings.Join(t.design.Names(f.Above), " and ")
		}
		parts = append(parts, part+" instead of 1")
	}
	text := strings.Join(parts, ", and ")
	return strings.ToUpper(text[:1]) + text[1:] + "."
}

// assume writes the remedy that takes components as zero.
func (t *tester) assume(zero []engine.Set, out *api.Remedy) string {
	out.Action = api.AssumeZero
	out.Terms = t.names(zero)
	var factors engine.Set
	var parts []string
	for _, s := range zero {
		crossed, _ := t.design.Parts(s)
		out.Change.Negligible = append(out.Change.Negligible, crossed)
		factors |= s
		parts = append(parts, t.component(s))
	}
	out.Factors = t.design.Names(factors)
	if len(parts) == 1 {
		return fmt.Sprintf("Assume that %s is zero, by declaring the term negligible.", parts[0])
	}
	return fmt.Sprintf("Assume that %s are zero, by declaring these terms negligible.", enumerate(parts))
}
