package answer

import (
	"context"
	"errors"
	"fmt"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/data"
	"guardrow/engine/ems"
	"guardrow/engine/fit"
)

// defaultConfidence is the confidence level of intervals where a request gives none.
const defaultConfidence = 0.95

// Readings are the bulk columns of a request for /v1/anova, as text. One of the three is set.
type Readings struct {
	JSON      []byte // the text of "data", an object of arrays
	CSVString []byte // the text of "csv", a JSON string with its quotes; it is unescaped in place
	CSV       []byte // CSV as it is, from a form
	MaxRows   int    // 0: no limit
}

// Stats are the sizes of a piece of work, for the log.
type Stats struct {
	Terms        int
	Observations int64
}

// Anova answers /v1/anova. The error is a *data.SyntaxError, whose offset is within the bulk text, or that of the context.
func Anova(ctx context.Context, request *api.AnovaRequest, readings Readings) (*api.AnovaAnswer, Stats, []engine.Fault, error) {
	var stats Stats
	a, faults := newAnalyst(request)
	columns, more, err := readings.scan(request)
	if faults = append(faults, more...); err != nil || faults != nil {
		if a != nil && columns != nil {
			// Lost readings do not hide labels that do not match.
			_, more = data.Lay(a.design, columns)
			faults = append(faults, more...)
		}
		return nil, stats, faults, err
	}
	stats = Stats{Terms: len(a.design.Terms()), Observations: int64(columns.Rows)}
	if limit := maxComponents(a.design) * (MaxAnalysed / MaxComponents); a.size*len(columns.Responses) > limit {
		return nil, stats, []engine.Fault{{Code: api.TooManyComponents, Place: "responses", Detail: fmt.Sprintf("The analyses of %d responses hold more than %d components in all. Post fewer responses at a time, or name fewer lines in \"only\".", len(columns.Responses), limit)}}, nil
	}
	answer := &api.AnovaAnswer{
		Title: a.design.Title(), Constraint: constraint(a.design), ApproximateForm: form(a.plan.Difference),
		Confidence: a.plan.Confidence, IgnoredColumns: columns.Ignored,
	}
	if request.DataFingerprint {
		answer.DataFingerprint = data.Fingerprint(columns)
	}
	if err := ctx.Err(); err != nil {
		return nil, stats, nil, err
	}
	grid, faults := data.Lay(a.design, columns)
	if faults != nil {
		return nil, stats, faults, nil
	}
	kernel := fit.NewKernel(grid)
	for i := range grid.Responses {
		analysis, err := a.analyse(ctx, kernel, grid, i)
		switch {
		case errors.Is(err, fit.ErrNotFinite):
			return nil, stats, []engine.Fault{{Code: api.ReadingOutOfRange, Place: "data", Detail: fmt.Sprintf("The readings of %s are so far apart that their differences are no longer numbers. Give them in a larger unit.", engine.Quote(grid.Responses[i].Name))}}, nil
		case err != nil:
			return nil, stats, nil, err
		}
		answer.Analyses = append(answer.Analyses, *analysis)
	}
	return answer, stats, nil, nil
}

// scan reads the bulk columns. It needs the factors' names only, so that faults in the data are found beside those in the
// design.
func (r Readings) scan(request *api.AnovaRequest) (*data.Columns, []engine.Fault, error) {
	plan := data.Plan{Responses: request.Responses, Missing: request.Missing, MaxRows: r.MaxRows}
	for _, f := range request.Design.Factors {
		plan.Factors = append(plan.Factors, f.Name)
	}
	switch {
	case r.JSON != nil:
		return data.ScanJSON(r.JSON, plan)
	case r.CSVString != nil:
		return data.ScanCSVString(r.CSVString, plan)
	}
	plan.Place = "data"
	columns, faults := data.ScanCSV(r.CSV, plan)
	return columns, faults, nil
}

// analyst writes the analyses of one design.
type analyst struct {
	*namer
	plan   *fit.Plan
	listed map[engine.Set]bool // nil: all lines
	size   int                 // components in the lines listed
	ems    map[engine.Set]string
}

func newAnalyst(request *api.AnovaRequest) (*analyst, []engine.Fault) {
	confidence := defaultConfidence
	var faults []engine.Fault
	if c := request.Confidence; c != nil {
		confidence = *c
		if !(confidence > 0 && confidence < 1) {
			faults = append(faults, engine.Fault{Code: api.InvalidConfidence, Place: "confidence", Detail: "The confidence level is not between 0 and 1. Write 95% as 0.95."})
		}
	}
	d, more := check(request.Design)
	if faults = append(faults, more...); more != nil {
		return nil, faults
	}
	m := ems.New(d)
	chosen, more := lines(m, request.Only, false)
	if faults = append(faults, more...); faults != nil {
		return nil, faults
	}
	a := &analyst{namer: newNamer(d), size: m.CountComponents(chosen, MaxComponents), ems: make(map[engine.Set]string)}
	if request.Only == nil {
		chosen = nil
	} else {
		a.listed = make(map[engine.Set]bool, len(chosen))
		for _, s := range chosen {
			a.listed[s] = true
		}
	}
	a.plan = fit.NewPlan(m, chosen, request.ApproximateForm == api.DifferenceForm, confidence)
	return a, nil
}

func (a *analyst) analyse(ctx context.Context, kernel *fit.Kernel, grid *data.Grid, response int) (*api.Analysis, error) {
	table, err := a.plan.Analyse(ctx, kernel, response)
	if err != nil {
		return nil, err
	}
	analysis := &api.Analysis{
		Response: grid.Responses[response].Name, Observations: a.design.Observations(), Mean: api.Num(table.Sums.Mean),
		Total: api.Total{DF: a.design.Observations() - 1}, Components: []api.ComponentEstimate{}, Findings: []api.Finding{},
	}
	analysis.Total.SS, analysis.Total.SSReason = squared(table.Sums, table.Sums.Total)
	for i := range table.Rows {
		if r := &table.Rows[i]; a.listed == nil || a.listed[r.Set] {
			analysis.Rows = append(analysis.Rows, a.row(table.Sums, r))
		}
	}
	for _, c := range table.Components {
		analysis.Components = append(analysis.Components, a.component(table.Sums, c))
	}
	analysis.Findings = append(analysis.Findings, a.findings(table)...)
	return analysis, nil
}

// squared writes a sum of squares or mean square in squared units of the readings.
func squared(sums *fit.Sums, x float64) (api.Number, string) {
	n := api.Num(sums.InReadings(x))
	if _, ok := n.Value(); !ok {
		return n, tooLargeToSquare
	}
	return n, ""
}

const tooLargeToSquare = "The squares of these readings are larger than a double can hold. Give the readings in a larger unit."

func (a *analyst) row(sums *fit.Sums, r *fit.Row) api.Row {
	out := api.Row{Term: a.term(r.Set), Effect: a.effect(r.Set), DF: r.DF, Negligible: r.Line < 0, EMS: a.expected(r.Set), Pooled: []api.Pooled{}}
	out.SS, out.SSReason = squared(sums, r.SS)
	if r.DF > 0 {
		out.MS, out.MSReason = squared(sums, r.MS)
	}
	if r.Line < 0 {
		return out
	}
	out.Pooled = a.pooled(&a.plan.Model.Lines[r.Line])
	if r.Set == a.design.Residual() {
		return out
	}
	out.Status = status(r.Test)
	if !r.Test.Testable() {
		return out
	}
	out.Numerator = a.weights(a.plan.Model, r.Numerator)
	out.Denominator = a.weights(a.plan.Model, r.Denominator)
	out.Solution = a.shares(r.Test.Solution)
	out.F, out.P = api.Num(r.F), api.Num(r.P)
	out.FReason = trouble(r.Trouble)
	if out.FReason != "" {
		out.PReason = "There is no F to take it from."
	}
	out.DFNumerator, out.DFDenominator = api.Num(r.DFNumerator), api.Num(r.DFError)
	if r.Subtracted == r.Subtracted { // not NaN
		out.SubtractedShare = api.Num(r.Subtracted)
	}
	return out
}

// trouble says why a line has no F; nothing where it has one.
func trouble(t fit.Trouble) string {
	switch t {
	case fit.ZeroError:
		return "The error line's mean square is 0, so the ratio has no finite value. Readings that never differ within a group are usually rounded or copied; look at them."
	case fit.ZeroByZero:
		return "Both mean squares are 0, so the ratio has no value: these readings do not vary."
	case fit.NegativeError:
		return "The difference of mean squares that serves as error is not above 0 in these data. Use the sum form instead."
	case fit.NotFinite:
		return "The mean squares are too far apart for their ratio to be a number."
	case fit.NoTrouble:
	}
	return ""
}

// expected writes the expectation of a line, once for all responses.
func (a *analyst) expected(s engine.Set) string {
	text, ok := a.ems[s]
	if !ok {
		text = a.sum(a.plan.Model.Expectation(s))
		a.ems[s] = text
	}
	return text
}
