package main

import (
	"bytes"
	"fmt"
	"strings"

	"guardrow/api"
	"guardrow/testdata/demo"
)

// print tells the study from the layout to the fitted table.
func (s *study) print(w *bytes.Buffer) {
	s.symbols = symbolsOf(s.terms.Factors)
	title(w, s.terms.Title)
	paragraph(w, fmt.Sprintf("A biobank asks whether storage temperature changes the potassium measured in stored serum, and whether the type of tube does. Each temperature has three freezers, each freezer four boxes, and every box holds all three types of tube; two aliquots of each were measured, %d readings in all. The study and its readings are invented (seed %d).", s.terms.Observations, demo.Seed))
	s.printFactors(w)
	s.printTerms(w)
	s.printExpectations(w)
	s.printTests(w)
	s.printFitted(w)
	s.printComponents(w)
	s.printMoral(w)
}

func (s *study) printFactors(w *bytes.Buffer) {
	heading(w, "The layout")
	t := table{head: []string{"Symbol", "Factor", "Levels", "Effect", "Nested in"}, right: []int{2}}
	for _, f := range s.terms.Factors {
		t.add(f.Symbol, f.Name, fmt.Sprint(f.Levels), f.Effect, strings.Join(f.Within, ", "))
	}
	t.print(w)
}

func (s *study) printTerms(w *bytes.Buffer) {
	heading(w, "The terms of its model")
	t := table{head: []string{"Term", "In symbols", "Effect", "df", "as a formula"}, right: []int{3}}
	for _, line := range s.terms.Terms {
		t.add(line.Term.Term, s.symbol(line.Term), line.Effect, fmt.Sprint(line.DF), line.DFFormula)
	}
	t.print(w)
	for _, i := range s.terms.Impossible {
		paragraph(w, i.Detail)
	}
}

func (s *study) printExpectations(w *bytes.Buffer) {
	heading(w, "What each mean square expects")
	t := table{head: []string{"Source", "EMS"}}
	for _, e := range s.expectations.ExpectedMeanSquares {
		t.add(s.symbol(e.Term), s.sum(e.Components))
	}
	t.print(w)
	paragraph(w, "σ² of a term is the variance of its random effects, κ² the mean square of its fixed ones; σ² alone is that of the single readings.")
}

// sum writes an expectation in the factors' symbols.
func (s *study) sum(components []api.Component) string {
	parts := make([]string, len(components))
	for i, c := range components {
		greek := "σ²"
		if c.Effect == api.Fixed {
			greek = "κ²"
		}
		if c.Term.Term != api.Residual {
			greek += "(" + s.symbol(c.Term) + ")"
		}
		if c.Exact != "1" {
			greek = c.Exact + " " + greek
		}
		parts[i] = greek
	}
	return strings.Join(parts, " + ")
}

func (s *study) printTests(w *bytes.Buffer) {
	heading(w, "So what tests what")
	for _, t := range s.tests.Tests {
		bullet(w, t.Explanation)
	}
}

func (s *study) printFitted(w *bytes.Buffer) {
	analysis := s.fitted.Analyses[0]
	heading(w, "The fitted analysis of "+analysis.Response+", in mmol/L")
	t := table{head: []string{"Source", "df", "SS", "MS", "Error line", "F", "p"}, right: []int{1, 2, 3, 5, 6}}
	for _, r := range analysis.Rows {
		t.add(r.Term.Term, fmt.Sprint(r.DF), fixed(r.SS), fixed(r.MS), s.errorLine(r), decimals(r.F, 2), probability(r.P))
	}
	t.add("total", fmt.Sprint(analysis.Total.DF), fixed(analysis.Total.SS), "", "", "", "")
	t.print(w)
	for _, r := range analysis.Rows {
		if r.Status == api.Approximate {
			n, _ := r.DFNumerator.Value()
			d, _ := r.DFDenominator.Value()
			paragraph(w, fmt.Sprintf("The test of %s is approximate: its F has %.1f and %.1f degrees of freedom.", r.Term.Term, n, d))
		}
	}
}

// errorLine writes the combination of lines that tests a term, in symbols; a weight is shown where it is not 1 or −1.
func (s *study) errorLine(r api.Row) string {
	parts := make([]string, len(r.Solution))
	for i, share := range r.Solution {
		name := s.symbol(share.Term)
		if size := strings.TrimPrefix(share.Exact, "-"); size != "1" {
			name = size + " " + name
		}
		switch {
		case share.Weight < 0:
			name = "− " + name
		case i > 0:
			name = "+ " + name
		}
		parts[i] = name
	}
	return strings.Join(parts, " ")
}

func (s *study) printComponents(w *bytes.Buffer) {
	analysis := s.fitted.Analyses[0]
	heading(w, "How large each kind of variation is")
	t := table{head: []string{"Component", "Estimate", fmt.Sprintf("%.0f%% interval", 100*s.fitted.Confidence), "Method"}, right: []int{1}}
	for _, c := range analysis.Components {
		t.add(c.Text, fixed(c.Estimate), fixed(c.Lower)+" to "+fixed(c.Upper), c.Method)
	}
	t.print(w)
	for _, f := range analysis.Findings {
		paragraph(w, f.Message)
	}
}

func (s *study) printMoral(w *bytes.Buffer) {
	heading(w, "Had the tubes been counted instead of the freezers")
	right, wrong := row(&s.fitted, "temperature"), row(&s.tubesCounted, "temperature")
	rightF, _ := right.F.Value()
	wrongF, _ := wrong.F.Value()
	paragraph(w, fmt.Sprintf("Temperature was given to freezers, so freezers test it: F = %.2f with %s and %s degrees of freedom, p = %s. Had every reading been taken for an independent one, the same readings would have given F = %.2f with %s and %s degrees of freedom, p = %s.",
		rightF, decimals(right.DFNumerator, 0), decimals(right.DFDenominator, 0), probability(right.P),
		wrongF, decimals(wrong.DFNumerator, 0), decimals(wrong.DFDenominator, 0), probability(wrong.P)))
	p, _ := right.P.Value()
	q, _ := wrong.P.Value()
	if q < 0.05 && p >= 0.05 {
		paragraph(w, "The second analysis would have announced an effect of temperature. What it saw is that freezers differ.")
	}
	paragraph(w, "Where results may bear on anyone's health or safety, local rules and qualified people decide; this program only does the arithmetic.")
}
