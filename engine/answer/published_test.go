package answer

import (
	"context"
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// publishedCase is a worked example; its source stands beside it in testdata/cases/<id>/SOURCE. The values under
// recomputed were computed there in exact rational arithmetic, with 40-digit quantiles.
type publishedCase struct {
	ID       string
	Response string
	Factors  []struct {
		Name   string
		Levels []string
		Effect string
		Within []string
	}
	ModelTerms []struct {
		Label      string
		AllFactors []string `json:"all_factors"`
	} `json:"model_terms"`
	Data struct {
		Columns []string
		Rows    [][]string
	}
	Recomputed map[string]json.RawMessage
}

type publishedTest struct {
	Kind          string
	Denominator   map[string]string
	DFDenominator figure `json:"df_denominator"`
	F, P          figure
	SumForm       *struct {
		DFDenominator figure `json:"df_denominator"`
		F, P          figure
	} `json:"sum_form"`
}

// figure is a number that a case gives as a text or as a number.
type figure string

func (f *figure) UnmarshalJSON(text []byte) error {
	*f = figure(strings.Trim(string(text), `"`))
	return nil
}

func publishedCases(t *testing.T) []publishedCase {
	t.Helper()
	files, err := filepath.Glob("../../testdata/cases/*/case.json")
	if err != nil || len(files) < 30 {
		t.Fatalf("found %d published cases (%v)", len(files), err)
	}
	var cases []publishedCase
	for _, file := range files {
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		var c publishedCase
		if err := json.Unmarshal(text, &c); err != nil {
			t.Fatalf("%s: %v", file, err)
		}
		if len(c.Data.Rows) > 0 && c.complete() {
			cases = append(cases, c)
		}
	}
	return cases
}

// complete reports whether every combination of levels has the same number of rows: Latin squares have not.
func (c publishedCase) complete() bool {
	cells := 1
	for _, f := range c.Factors {
		cells *= len(f.Levels)
	}
	return len(c.Data.Rows)%cells == 0
}

// request writes the case as a request. Terms that the published model leaves out are declared negligible.
// It also returns the published label of each of our terms.
func (c publishedCase) request(t *testing.T, constraint, form string) (*api.AnovaRequest, Readings, map[string]string) {
	t.Helper()
	cells := 1
	design := &api.Design{Constraint: constraint}
	for _, f := range c.Factors {
		cells *= len(f.Levels)
		design.Factors = append(design.Factors, api.Factor{Name: f.Name, Levels: api.Levels{Count: int64(len(f.Levels)), Labels: f.Levels}, Effect: f.Effect, Within: f.Within})
	}
	replicates := api.Integer(len(c.Data.Rows) / cells)
	design.Replicates = &replicates
	kept := map[string]bool{}
	for _, m := range c.ModelTerms {
		kept[c.ours(t, design, m.AllFactors)] = true
	}
	full, faults := Terms(&api.TermsRequest{Design: design})
	if faults != nil {
		t.Fatal(c.ID, faults)
	}
	for _, term := range full.Terms {
		if !kept[term.Term.Term] && term.Term.Term != api.Residual {
			design.Negligible = append(design.Negligible, api.TermRef{Text: term.Term.Term})
		}
	}
	columns := map[string][]any{}
	for j, name := range c.Data.Columns {
		for _, row := range c.Data.Rows {
			if name == c.Response {
				columns[name] = append(columns[name], json.Number(row[j]))
			} else {
				columns[name] = append(columns[name], row[j])
			}
		}
	}
	text, err := json.Marshal(columns)
	if err != nil {
		t.Fatal(err)
	}
	labels := map[string]string{}
	for _, m := range c.ModelTerms {
		labels[c.ours(t, design, m.AllFactors)] = m.Label
	}
	return &api.AnovaRequest{Design: design, ApproximateForm: form, Responses: []string{c.Response}}, Readings{JSON: text}, labels
}

// ours returns our name of the term of these factors; none for the residual.
func (c publishedCase) ours(t *testing.T, design *api.Design, factors []string) string {
	t.Helper()
	if factors == nil {
		return api.Residual
	}
	d, faults := engine.Check(design)
	if faults != nil {
		t.Fatal(c.ID, faults)
	}
	s, fault := d.Resolve(api.TermRef{Factors: factors})
	if fault != nil {
		t.Fatal(c.ID, fault)
	}
	return d.Name(s)
}

func number(t *testing.T, text figure) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(string(text), 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// near compares with 1e-9 relative, the recomputed figures being printed with 17 digits; values below 1e-9 of the scale
// are rounding.
func near(got, want, scale float64) bool {
	return math.Abs(got-want) <= 1e-9*math.Abs(want)+1e-12*scale
}

func value(n api.Number) float64 {
	x, ok := n.Value()
	if !ok {
		return math.NaN()
	}
	return x
}

func TestPublishedAnalyses(t *testing.T) {
	tests := 0
	for _, c := range publishedCases(t) {
		for _, constraint := range []string{api.Unrestricted, api.Restricted} {
			if _, ok := c.Recomputed["tests_"+constraint]; !ok {
				continue
			}
			tests++
			t.Run(c.ID+"/"+constraint, func(t *testing.T) { comparePublished(t, c, constraint) })
		}
	}
	if tests < 50 {
		t.Errorf("only %d published analyses were compared", tests)
	}
}

func comparePublished(t *testing.T, c publishedCase, constraint string) {
	var df map[string]int64
	var ss map[string]figure
	var tests map[string]*publishedTest
	var components map[string]figure
	for key, into := range map[string]any{"df": &df, "SS": &ss, "tests_" + constraint: &tests, "components_" + constraint: &components} {
		if text, ok := c.Recomputed[key]; ok {
			if err := json.Unmarshal(text, into); err != nil {
				t.Fatalf("%s: %v", key, err)
			}
		}
	}
	for _, form := range []string{api.SumForm, api.DifferenceForm} {
		request, readings, labels := c.request(t, constraint, form)
		answer, _, faults, err := Anova(context.Background(), request, readings)
		if err != nil || faults != nil {
			t.Fatal(err, faults)
		}
		analysis := answer.Analyses[0]
		total := value(analysis.Total.SS)
		for _, row := range analysis.Rows {
			name := labels[row.Term.Term]
			if row.DF != df[name] || !near(value(row.SS), number(t, ss[name]), total) {
				t.Errorf("%s: df %d, SS %v; published case has %d, %s", name, row.DF, value(row.SS), df[name], ss[name])
			}
			want := tests[name]
			if name == api.Residual || want == nil {
				continue
			}
			compareTest(t, row, want, form == api.SumForm, labels)
		}
		for _, component := range analysis.Components {
			if want := components[labels[component.Terms[0]]]; want != "" && want != "null" && len(component.Terms) == 1 {
				if got := value(component.Estimate); !near(got, number(t, want), total) {
					t.Errorf("component %s: %v, published case has %s", component.Text, got, want)
				}
			}
		}
	}
}

func compareTest(t *testing.T, row api.Row, want *publishedTest, sum bool, labels map[string]string) {
	name := row.Term.Term
	if row.Status != want.Kind {
		t.Errorf("%s: %s, published case has %s", name, row.Status, want.Kind)
		return
	}
	if want.Kind == api.None {
		return
	}
	weights := map[string]string{}
	for _, s := range row.Solution {
		weights[labels[s.Term.Term]] = s.Exact
	}
	if len(weights) != len(want.Denominator) {
		t.Errorf("%s: error lines %v, published case has %v", name, weights, want.Denominator)
	}
	for line, w := range want.Denominator {
		if weights[line] != w {
			t.Errorf("%s: weight of %s is %s, published case has %s", name, line, weights[line], w)
		}
	}
	f, p, dfd := want.F, want.P, want.DFDenominator
	if sum && want.SumForm != nil {
		f, p, dfd = want.SumForm.F, want.SumForm.P, want.SumForm.DFDenominator
	}
	for _, pair := range []struct {
		what string
		want figure
		got  float64
	}{{"F", f, value(row.F)}, {"p", p, value(row.P)}, {"df of the error", dfd, value(row.DFDenominator)}} {
		if pair.want != "" && !near(pair.got, number(t, pair.want), 0) {
			t.Errorf("%s: %s is %v, published case has %s", name, pair.what, pair.got, pair.want)
		}
	}
}
