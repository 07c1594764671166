package ems_test

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// The published tables are in testdata/cases, each with a SOURCE beside it.
const cases = "../../testdata/cases"

func readCase(t *testing.T, name string, into any) {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(cases, name, "case.json"))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, into); err != nil {
		t.Fatalf("%s: %v", name, err)
	}
}

type publishedFactor struct {
	Name        string   `json:"name"`
	Effect      string   `json:"effect"`
	Within      []string `json:"within"`
	Levels      []any    `json:"levels"`
	LevelSymbol string   `json:"levels_symbol"`
}

type publishedTerm struct {
	Label   string   `json:"label"`
	Crossed []string `json:"crossed"`
}

// termNamed returns the term that a table calls by label: the factors before the bracket, and what they are nested in.
func termNamed(t *testing.T, d *engine.Design, label string) engine.Set {
	t.Helper()
	if label == "residual" {
		return d.Residual()
	}
	crossed, _, _ := strings.Cut(label, "(")
	s, fault := d.Resolve(api.TermRef{Factors: strings.Split(crossed, " × ")})
	if fault != nil {
		t.Fatalf("%s: %v", label, fault)
	}
	return s
}

// withoutOthers declares null every term that the published model leaves out.
func withoutOthers(t *testing.T, declared *api.Design, terms []publishedTerm) *engine.Design {
	t.Helper()
	d, faults := engine.Check(declared)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	kept := []engine.Set{d.Residual()}
	for _, term := range terms {
		if len(term.Crossed) > 0 {
			kept = append(kept, termNamed(t, d, term.Label))
		}
	}
	var others []engine.Set
	for _, s := range d.Terms() {
		if !slices.Contains(kept, s) {
			others = append(others, s)
		}
	}
	return d.WithNegligible(others...)
}

// TestSymbolicTables holds formulas and coefficients to the symbolic tables of a textbook, with a different prime for
// every level count.
func TestSymbolicTables(t *testing.T) {
	var published struct {
		Layouts []struct {
			ID         string                       `json:"id"`
			Convention string                       `json:"convention"`
			Factors    []publishedFactor            `json:"factors"`
			Replicate  string                       `json:"replicate_symbol"`
			Terms      []publishedTerm              `json:"terms"`
			EMS        map[string]map[string]string `json:"ems"`
		} `json:"layouts"`
	}
	readCase(t, "ems_symbolic_tables", &published)
	if len(published.Layouts) != 15 {
		t.Errorf("%d layouts, the collection has 15", len(published.Layouts))
	}
	primes := []int64{3, 5, 7, 11}
	for _, layout := range published.Layouts {
		constraints := []string{layout.Convention}
		if layout.Convention == "both" {
			constraints = []string{api.Restricted, api.Unrestricted}
		}
		for _, constraint := range constraints {
			t.Run(layout.ID+" "+constraint, func(t *testing.T) {
				levels := map[rune]int64{'n': 13}
				replicates := api.Integer(13)
				if layout.Replicate == "1" {
					replicates = 1
				}
				declared := &api.Design{Constraint: constraint, Replicates: &replicates}
				for i, f := range layout.Factors {
					levels[rune(f.LevelSymbol[0])] = primes[i]
					declared.Factors = append(declared.Factors, api.Factor{Name: f.Name, Symbol: strings.ToUpper(f.LevelSymbol), Levels: api.Levels{Count: primes[i]}, Effect: f.Effect, Within: f.Within})
				}
				m := ems.New(withoutOthers(t, declared, layout.Terms))
				for label, row := range layout.EMS {
					compareSymbolic(t, m, label, row, levels)
				}
			})
		}
	}
}

func compareSymbolic(t *testing.T, m *ems.Model, label string, row map[string]string, levels map[rune]int64) {
	t.Helper()
	s := termNamed(t, m.Design, label)
	components := m.Expectation(s)
	if len(components) != len(row) {
		t.Errorf("%s: %d components, in print %v", label, len(components), row)
	}
	for component, multiplier := range row {
		c := termNamed(t, m.Design, component)
		letters, fixed := strings.CutSuffix(multiplier, " κ²")
		if fixed == m.Design.IsRandom(c) {
			t.Errorf("%s: %s is in print as %s", label, component, multiplier)
		}
		want := int64(1)
		for _, letter := range strings.Trim(letters, "1") {
			want *= levels[letter]
		}
		if got := m.Coefficient(s, c).String(); got != strconv.FormatInt(want, 10) {
			t.Errorf("%s: coefficient of %s is %s, in print %s = %d", label, component, got, letters, want)
		}
		// At one replicate the engine writes n, which is 1.
		got := m.Formula(s, c)
		if m.Design.Replicates() == 1 && got != "1" {
			got = strings.Trim(got, "n")
			letters = strings.Trim(letters, "1")
		}
		if sorted(got) != sorted(letters) {
			t.Errorf("%s: the formula for %s is %s, in print %s", label, component, got, letters)
		}
	}
}

func sorted(letters string) string {
	r := []rune(letters)
	slices.Sort(r)
	return string(r)
}

// TestFinitePopulations holds coefficients to means over all samples of a population of cell means, enumerated one by
// one (Cornfield and Tukey 1956; the enumeration is printed to 17 digits).
func TestFinitePopulations(t *testing.T) {
	type enumeration struct {
		Population map[string]int64  `json:"population"`
		Sample     map[string]int64  `json:"sample"`
		Error      string            `json:"error_variance"`
		Components map[string]string `json:"components"`
		Enumerated map[string]string `json:"enumerated"`
	}
	var published struct {
		TwoWay   []enumeration `json:"two_way_crossed"`
		Nested   []enumeration `json:"two_way_nested"`
		ThreeWay []enumeration `json:"three_way_crossed"`
	}
	readCase(t, "ems_finite_populations", &published)
	compared := 0
	for _, kind := range []struct {
		cases   []enumeration
		factors []string
	}{{published.TwoWay, []string{"A", "B"}}, {published.Nested, []string{"A", "B_in_A"}}, {published.ThreeWay, []string{"A", "B", "C"}}} {
		for _, c := range kind.cases {
			replicates := api.Integer(c.Sample["n"])
			declared := &api.Design{Constraint: api.Restricted, Replicates: &replicates}
			for _, name := range kind.factors {
				population := api.Integer(c.Population[name])
				f := api.Factor{Name: name[:1], Effect: api.Random, Population: &population, Levels: api.Levels{Count: c.Sample[strings.ToLower(name[:1])]}}
				if name == "B_in_A" {
					f.Within = []string{"A"}
				}
				declared.Factors = append(declared.Factors, f)
			}
			d, faults := engine.Check(declared)
			if len(faults) > 0 {
				t.Fatal(faults)
			}
			m := ems.New(d)
			variance := map[engine.Set]float64{d.Residual(): number(t, c.Error)}
			for label, value := range c.Components {
				if label != "error" {
					variance[enumeratedTerm(t, d, label)] = number(t, value)
				}
			}
			for label, value := range c.Enumerated {
				want, got := number(t, value), 0.0
				for _, component := range m.Expectation(enumeratedTerm(t, d, label)) {
					got += component.Coefficient.Float64() * variance[component.Set]
				}
				// Seventeen printed digits, and a rounding for each of up to eight components.
				if math.Abs(got-want) > 1e-14*want {
					t.Errorf("population %v, sample %v: E[MS] of %s is %v, over all samples %v", c.Population, c.Sample, label, got, want)
				}
				compared++
			}
		}
	}
	if compared != 37 {
		t.Errorf("%d expectations compared, the collection has 37", compared)
	}
}

func enumeratedTerm(t *testing.T, d *engine.Design, label string) engine.Set {
	t.Helper()
	switch label {
	case "AB":
		label = "A × B"
	case "B_in_A":
		label = "B"
	}
	return termNamed(t, d, label)
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// publishedTest is what a case says of one term's test.
type publishedTest struct {
	Kind          string            `json:"kind"`
	Denominator   map[string]string `json:"denominator"`
	DFDenominator string            `json:"df_denominator"`
	Sum           *struct {
		Numerator     map[string]string `json:"numerator"`
		Denominator   map[string]string `json:"denominator"`
		DFNumerator   string            `json:"df_numerator"`
		DFDenominator string            `json:"df_denominator"`
	} `json:"sum_form"`
}

// publishedCase is a balanced study with its expectations and error lines.
type publishedCase struct {
	Observations int64             `json:"n_obs"`
	Factors      []publishedFactor `json:"factors"`
	Terms        []publishedTerm   `json:"model_terms"`
	Recomputed   struct {
		DF                map[string]int64             `json:"df"`
		MS                map[string]string            `json:"MS"`
		EMSUnrestricted   map[string]map[string]string `json:"EMS_unrestricted"`
		EMSRestricted     map[string]map[string]string `json:"EMS_restricted"`
		TestsUnrestricted map[string]publishedTest     `json:"tests_unrestricted"`
		TestsRestricted   map[string]publishedTest     `json:"tests_restricted"`
	} `json:"recomputed"`
}

// Squares are orthogonal but not complete: no declared design describes them.
var squares = []string{"go_latin_square", "helm_latin_catalysts", "mont_43_latin_square", "mont_44_graeco_latin"}

// TestPublishedStudies holds expectations, df, error lines and approximate df to those of the published studies.
func TestPublishedStudies(t *testing.T) {
	folders, err := os.ReadDir(cases)
	if err != nil {
		t.Fatal(err)
	}
	tables, approximate := 0, 0
	for _, folder := range folders {
		var keys struct {
			Recomputed map[string]json.RawMessage `json:"recomputed"`
		}
		readCase(t, folder.Name(), &keys)
		if keys.Recomputed["EMS_unrestricted"] == nil {
			continue
		}
		var c publishedCase
		readCase(t, folder.Name(), &c)
		cells := int64(1)
		for _, f := range c.Factors {
			cells *= int64(len(f.Levels))
		}
		if slices.Contains(squares, folder.Name()) {
			if c.Observations%cells == 0 {
				t.Errorf("%s is complete and was left out as a square", folder.Name())
			}
			continue
		}
		for _, constraint := range []string{api.Unrestricted, api.Restricted} {
			expectations, tests := c.Recomputed.EMSUnrestricted, c.Recomputed.TestsUnrestricted
			if constraint == api.Restricted {
				expectations, tests = c.Recomputed.EMSRestricted, c.Recomputed.TestsRestricted
			}
			if expectations == nil {
				continue
			}
			tables++
			t.Run(folder.Name()+" "+constraint, func(t *testing.T) {
				replicates := api.Integer(c.Observations / cells)
				declared := &api.Design{Constraint: constraint, Replicates: &replicates}
				for _, f := range c.Factors {
					declared.Factors = append(declared.Factors, api.Factor{Name: f.Name, Levels: api.Levels{Count: int64(len(f.Levels))}, Effect: f.Effect, Within: f.Within})
				}
				m := ems.New(withoutOthers(t, declared, c.Terms))
				if m.Design.Observations() != c.Observations || len(m.Apart) > 0 {
					t.Fatalf("%d observations of %d, apart %v", m.Design.Observations(), c.Observations, m.Apart)
				}
				c.compareExpectations(t, m, expectations)
				for label, want := range tests {
					if want.Kind == "approximate" {
						approximate++
					}
					c.compareTest(t, m, label, want)
				}
			})
		}
	}
	if tables < 60 || approximate < 2 {
		t.Errorf("only %d tables, %d approximate tests", tables, approximate)
	}
}

func (c *publishedCase) compareExpectations(t *testing.T, m *ems.Model, table map[string]map[string]string) {
	t.Helper()
	for label, row := range table {
		s := termNamed(t, m.Design, label)
		if got, want := m.Lines[m.Line(s)].DF, c.Recomputed.DF[label]; got != want {
			t.Errorf("%s has %d df, published %d", label, got, want)
		}
		if got := m.Expectation(s); len(got) != len(row) {
			t.Errorf("%s: components %v, published %v", label, got, row)
		}
		for component, multiplier := range row {
			of := termNamed(t, m.Design, component)
			coefficient, fixed := strings.CutSuffix(multiplier, " κ²")
			if got := m.Coefficient(s, of).String(); got != coefficient || fixed == m.Design.IsRandom(of) {
				t.Errorf("%s: coefficient of %s is %s, published %s", label, component, got, multiplier)
			}
		}
	}
	// Residual alone may be missing from a table.
	if missing := len(m.Lines) - len(table); missing < 0 || missing > 1 {
		t.Errorf("%d lines, published %d", len(m.Lines), len(table))
	}
}

func (c *publishedCase) compareTest(t *testing.T, m *ems.Model, label string, want publishedTest) {
	t.Helper()
	test := m.NewSolver().Test(termNamed(t, m.Design, label))
	if test.Exact() != (want.Kind == "exact") {
		t.Errorf("%s: %+v, published %s", label, test, want.Kind)
	}
	c.compareCombination(t, m, label, test.Denominator(true), want.Denominator, want.DFDenominator)
	if want.Sum != nil {
		c.compareCombination(t, m, label, test.Denominator(false), want.Sum.Denominator, want.Sum.DFDenominator)
		c.compareCombination(t, m, label, test.Numerator(false), want.Sum.Numerator, want.Sum.DFNumerator)
	}
}

// compareCombination compares weights exactly, and Satterthwaite's df at the published mean squares, which have 17 digits.
func (c *publishedCase) compareCombination(t *testing.T, m *ems.Model, label string, got []ems.Weight, want map[string]string, wantDF string) {
	t.Helper()
	if len(got) != len(want) {
		t.Errorf("%s: lines %v, published %v", label, got, want)
		return
	}
	var weights, squares, df []float64
	for name, weight := range want {
		s := termNamed(t, m.Design, name)
		i := slices.IndexFunc(got, func(w ems.Weight) bool { return w.Set == s })
		if i < 0 || got[i].Weight.String() != weight {
			t.Errorf("%s: lines %v, published %v", label, got, want)
			return
		}
		weights = append(weights, got[i].Weight.Float64())
		squares = append(squares, number(t, c.Recomputed.MS[name]))
		df = append(df, float64(m.Lines[m.Line(s)].DF))
	}
	if nu := ems.Satterthwaite(weights, squares, df); math.Abs(nu-number(t, wantDF)) > 1e-13*nu {
		t.Errorf("%s: %v df, published %s", label, nu, wantDF)
	}
}
