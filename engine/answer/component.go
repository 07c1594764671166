package answer

import (
	"fmt"
	"strings"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
	"guardrow/engine/fit"
)

// component writes an estimated component of variance.
func (a *analyst) component(sums *fit.Sums, c fit.Component) api.ComponentEstimate {
	e := c.Estimator
	out := api.ComponentEstimate{
		Terms: a.names(e.Sets), Text: a.total(e), Confidence: a.plan.Confidence,
		Negative: c.Estimate < 0,
	}
	if e.Weights == nil {
		out.Estimate, out.EstimateReason = api.Null, a.withoutLine(e)
		return out
	}
	out.Estimate, out.EstimateReason = squared(sums, c.Estimate)
	out.Lower, out.IntervalReason = squared(sums, c.Lower)
	out.Upper, out.IntervalReason = squared(sums, c.Upper)
	switch c.Method {
	case fit.ChiSquareInterval:
		out.Method = "exact (chi-square)"
	case fit.LargeSampleInterval:
		out.Method = "modified large-sample"
	case fit.NoInterval:
	}
	return out
}

// total writes the sum of components that an estimator estimates, such as "σ²(box) + 1/2 σ²".
func (n *namer) total(e ems.Estimator) string {
	parts := make([]string, len(e.Sets))
	for i, s := range e.Sets {
		parts[i] = n.component(s)
		if !e.Shares[i].IsOne() {
			parts[i] = e.Shares[i].String() + " " + parts[i]
		}
	}
	return strings.Join(parts, " + ")
}

// withoutLine says why a component has no estimate.
func (a *analyst) withoutLine(e ems.Estimator) string {
	reason := fmt.Sprintf("No line shows this variation by itself, because %s", a.single(a.plan.Model, e.Sets[0]))
	switch n := len(e.With); {
	case n == 0:
		return reason + "."
	case n <= spelledOut:
		return fmt.Sprintf("%s; it is part of the mean square of %s.", reason, enumerate(a.names(e.With)))
	}
	return fmt.Sprintf("%s; it is part of the mean squares of %d terms.", reason, len(e.With))
}

// largeSubtraction is the share of an error combination, in the difference form, that may be subtracted before the test
// gets a caution. A simulation in the tests supports it; Gaylor and Hopper (1969) treat the case of two lines.
const largeSubtraction = 0.5

// findings says what a reader of the table should know.
func (a *analyst) findings(table *fit.Table) []api.Finding {
	var list []api.Finding
	add := func(code, severity string, s []engine.Set, format string, args ...any) {
		list = append(list, api.Finding{Code: code, Severity: severity, Message: fmt.Sprintf(format, args...), Where: []string{}, Terms: a.names(s), Remedies: []api.Remedy{}})
	}
	for _, r := range table.Rows {
		if a.listed != nil && !a.listed[r.Set] {
			continue
		}
		name := a.name(r.Set)
		switch {
		case r.Trouble == fit.ZeroError || r.Trouble == fit.ZeroByZero:
			add(api.NoErrorVariation, api.Caution, []engine.Set{r.Set}, "The error line of %s shows no variation at all, so there is no test. Look whether the readings were rounded, copied or truncated.", name)
		case r.Subtracted > largeSubtraction:
			add(api.LargeSubtraction, api.Caution, []engine.Set{r.Set}, "The error of the test of %s is a difference in which the part subtracted is %.0f%% of the part it is subtracted from. Its degrees of freedom have collapsed there, so that the test hardly ever finds an effect; use the sum form.", name, 100*r.Subtracted)
		}
	}
	for _, c := range table.Components {
		if c.Estimate < 0 {
			add(api.NegativeComponent, api.Note, c.Estimator.Sets, "The estimate of %s is negative. A variance is not; the usual reading is that it is small compared with the variation within. It is shown as it comes.", a.total(c.Estimator))
		}
	}
	return list
}
