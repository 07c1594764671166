package fit

import (
	"guardrow/engine"
	"guardrow/engine/ems"
)

// Plan is what the analysis of a design needs and no reading changes: the tests, and the estimators of its components. It
// is made once for any number of responses.
type Plan struct {
	Model      *ems.Model
	Difference bool    // the difference form of approximate tests instead of the sum form
	Confidence float64 // of intervals, above 0 and below 1

	tests      []ems.Test // by line
	estimators []ems.Estimator
}

// NewPlan solves the tests of the given terms and the estimators of their components; of all where only is nil.
func NewPlan(m *ems.Model, only []engine.Set, difference bool, confidence float64) *Plan {
	p := &Plan{Model: m, Difference: difference, Confidence: confidence, tests: make([]ems.Test, len(m.Lines))}
	solver := m.NewSolver()
	test := func(s engine.Set) {
		if i := m.Line(s); i >= 0 && s != m.Design.Residual() {
			p.tests[i] = solver.Test(s)
		}
	}
	if only == nil {
		for _, l := range m.Lines {
			test(l.Set)
		}
	}
	for _, s := range only {
		test(s)
	}
	p.estimators = m.Estimators(only)
	return p
}
