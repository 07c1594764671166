package fit

import (
	"context"
	"math"

	"guardrow/engine"
	"guardrow/engine/ems"
	"guardrow/engine/prob"
)

// Trouble says why a line's F has no value.
type Trouble int

// Reasons why there is no F.
const (
	NoTrouble     Trouble = iota
	ZeroError             // the error line's mean square is 0, so the ratio is infinite
	ZeroByZero            // numerator and error line are both 0
	NegativeError         // the difference of error lines is 0 or negative
	NotFinite             // mean squares too far apart for a double
)

// Row is a line of the fitted table. SS, MS and everything that they enter are in the unit of the Sums they came from;
// F, df and p have none.
type Row struct {
	Set         engine.Set
	Line        int // in the model's lines; -1 for a negligible term that pools with none
	DF          int64
	SS          float64 // with those of the terms pooled into the line
	MS          float64 // NaN where df is 0
	Test        ems.Test
	Numerator   []ems.Weight // of F, in the plan's form; nil where there is no test
	Denominator []ems.Weight
	F           float64 // NaN where there is none
	DFNumerator float64
	DFError     float64
	P           float64
	Trouble     Trouble
	// Subtracted is, in the difference form, the part of the error combination that is subtracted over the part that is
	// added; NaN where nothing is subtracted.
	Subtracted float64
}

// Table is the fitted analysis of one response.
type Table struct {
	Sums       *Sums
	Rows       []Row // lines and, among them, negligible terms that stay apart, in the contract's order
	Components []Component
}

// Analyse fits response i of the kernel's grid and tests every line of the plan.
//
// Every line's SS is the sum over its own term and those pooled into it; MS = SS/df; F is the ratio of the mean squares,
// or combinations of them, that the plan's tests name, with Satterthwaite df for combinations.
func (p *Plan) Analyse(ctx context.Context, kernel *Kernel, response int) (*Table, error) {
	sums, err := kernel.Sums(ctx, response)
	if err != nil {
		return nil, err
	}
	t := &Table{Sums: sums, Rows: make([]Row, 0, len(p.Model.Lines)+len(p.Model.Apart))}
	ms := p.meanSquares(sums, t)
	for i := range t.Rows {
		if r := &t.Rows[i]; r.Line >= 0 && r.Test.Testable() {
			p.test(r, ms)
		}
	}
	t.Components = p.components(ms)
	return t, nil
}

// meanSquares fills the rows and returns the mean square of each line.
func (p *Plan) meanSquares(sums *Sums, t *Table) []float64 {
	m := p.Model
	ms := make([]float64, len(m.Lines))
	apart := m.Apart
	for i, l := range m.Lines {
		for len(apart) > 0 && m.Design.Index(apart[0]) < m.Design.Index(l.Set) {
			t.Rows = append(t.Rows, newRow(apart[0], -1, m.Design.DF(apart[0]), sums.Term(apart[0])))
			apart = apart[1:]
		}
		ss := sums.Term(l.Set)
		for _, s := range l.Pooled {
			ss += sums.Term(s)
		}
		row := newRow(l.Set, i, l.DF, ss)
		row.Test = p.tests[i]
		ms[i] = row.MS
		t.Rows = append(t.Rows, row)
	}
	return ms
}

func newRow(s engine.Set, line int, df int64, ss float64) Row {
	nan := math.NaN()
	r := Row{Set: s, Line: line, DF: df, SS: ss, MS: nan, F: nan, DFNumerator: nan, DFError: nan, P: nan, Subtracted: nan}
	if df > 0 {
		r.MS = ss / float64(df)
	}
	return r
}

// test computes F, its df and p for one row.
func (p *Plan) test(r *Row, ms []float64) {
	m := p.Model
	r.Numerator, r.Denominator = r.Test.Numerator(p.Difference), r.Test.Denominator(p.Difference)
	numerator, denominator := p.side(r.Numerator, ms), p.side(r.Denominator, ms)
	r.DFNumerator, r.DFError = numerator.df, denominator.df
	if r.Test.Exact() {
		// Whole numbers, not Satterthwaite's formula for one line.
		r.DFNumerator, r.DFError = float64(r.DF), float64(m.Lines[m.Line(r.Test.Solution[0].Set)].DF)
	}
	if denominator.subtracted > 0 {
		r.Subtracted = denominator.subtracted / denominator.added
	}
	switch {
	case denominator.value > 0:
		r.F = numerator.value / denominator.value
	case denominator.subtracted > 0:
		r.Trouble = NegativeError
		return
	case numerator.value > 0:
		r.Trouble = ZeroError
		return
	default:
		r.Trouble = ZeroByZero
		return
	}
	if math.IsInf(r.F, 0) || math.IsNaN(r.F) {
		r.F, r.Trouble = math.NaN(), NotFinite
		return
	}
	r.P = prob.FUpperTail(r.F, r.DFNumerator, r.DFError)
}

// combination is a weighted sum of mean squares.
type combination struct {
	value, added, subtracted float64
	df                       float64
}

func (p *Plan) side(weights []ems.Weight, ms []float64) combination {
	var c combination
	var room [3][8]float64 // on the stack; nearly every combination fits
	w, x, df := room[0][:0], room[1][:0], room[2][:0]
	for _, weight := range weights {
		l := p.Model.Line(weight.Set)
		part := weight.Weight.Float64()
		w, x, df = append(w, part), append(x, ms[l]), append(df, float64(p.Model.Lines[l].DF))
		if part *= ms[l]; part < 0 {
			c.subtracted -= part
		} else {
			c.added += part
		}
	}
	c.value = c.added - c.subtracted
	c.df = ems.Satterthwaite(w, x, df)
	return c
}
