package answer

import (
	"context"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// Work that one answer may spend on searching remedies, and one test of it. Steps are counted, not timed, so that the same
// request always gets the same answer.
const (
	searchSteps        = 20_000_000
	searchStepsPerTest = 4_000_000
	remedyBytes        = 32 << 20 // about, of remedies in one answer
)

// Tests answers /v1/tests. The error is that of the context.
func Tests(ctx context.Context, request *api.TestsRequest) (*api.TestsAnswer, []engine.Fault, error) {
	d, faults := check(request.Design)
	if faults != nil {
		return nil, faults, nil
	}
	m := ems.New(d)
	chosen, faults := lines(m, request.Only, true)
	variances, more := variances(m, request.Components)
	if faults = append(faults, more...); faults != nil {
		return nil, faults, nil
	}
	t := &tester{
		namer: newNamer(d), model: m, variances: variances,
		difference: request.ApproximateForm == api.DifferenceForm,
		budget:     searchSteps,
		room:       remedyBytes,
	}
	answer := &api.TestsAnswer{Title: d.Title(), Constraint: constraint(d), ApproximateForm: form(t.difference), Tests: make([]api.Test, len(chosen))}
	solver := m.NewSolver()
	for i, s := range chosen {
		if err := ctx.Err(); err != nil {
			return nil, nil, err
		}
		answer.Tests[i] = t.test(solver.Test(s))
	}
	return answer, nil, nil
}

func form(difference bool) string {
	if difference {
		return api.DifferenceForm
	}
	return api.SumForm
}

// tester writes the tests of one model.
type tester struct {
	*namer
	model      *ems.Model
	variances  map[engine.Set]float64 // nil where none were supplied
	difference bool
	budget     int // steps left for searching remedies
	room       int // bytes left for writing them
}

func status(t ems.Test) string {
	switch {
	case !t.Testable():
		return api.None
	case t.Exact():
		return api.Exact
	}
	return api.Approximate
}

func (t *tester) test(test ems.Test) api.Test {
	line := t.model.Lines[t.model.Line(test.Set)]
	out := api.Test{
		Term: t.term(test.Set), Effect: t.effect(test.Set), DF: line.DF, Status: status(test),
		Remedies: []api.Remedy{}, Explanation: t.explain(test),
	}
	if !test.Testable() {
		out.Unmatched = t.names(test.Unmatched)
		t.remedies(test, &out)
		return out
	}
	numerator, denominator := test.Numerator(t.difference), test.Denominator(t.difference)
	out.Solution = t.shares(test.Solution)
	out.Numerator = t.weights(t.model, numerator)
	out.Denominator = t.weights(t.model, denominator)
	out.DFNumerator, out.DFNumeratorBounds = t.df(t.model, numerator)
	out.DFDenominator, out.DFDenominatorBounds = t.df(t.model, denominator)
	return out
}

// df returns the degrees of freedom of a combination of lines: a number for one line; for several, bounds, and a number too
// where variances were supplied.
//
// Satterthwaite's df lie between the smallest df of a line used and the sum of all; a negative weight lets them fall to 0.
func (t *tester) df(m *ems.Model, weights []ems.Weight) (df api.Number, bounds []float64) {
	smallest, sum, negative := int64(0), int64(0), false
	for i, w := range weights {
		n := m.Lines[m.Line(w.Set)].DF
		if i == 0 || n < smallest {
			smallest = n
		}
		sum += n
		negative = negative || w.Weight.Sign() < 0
	}
	if len(weights) == 1 {
		return api.Num(float64(sum)), nil
	}
	if negative {
		smallest = 0
	}
	bounds = []float64{float64(smallest), float64(sum)}
	if t.variances == nil {
		return api.Number{}, bounds
	}
	return api.Num(t.satterthwaite(m, weights)), bounds
}

// satterthwaite returns the df of a combination at the supplied variances, with no effect in fixed terms.
func (t *tester) satterthwaite(m *ems.Model, weights []ems.Weight) float64 {
	n := len(weights)
	w, ms, df := make([]float64, n), make([]float64, n), make([]float64, n)
	for i, weight := range weights {
		w[i], df[i] = weight.Weight.Float64(), float64(m.Lines[m.Line(weight.Set)].DF)
		for _, c := range m.Expectation(weight.Set) {
			ms[i] += c.Coefficient.Float64() * t.variances[c.Set]
		}
	}
	return ems.Satterthwaite(w, ms, df)
}
