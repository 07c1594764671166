package fit

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
	"guardrow/engine/data"
)

// casesDir holds published examples, a folder each with its SOURCE.
const casesDir = "../../testdata/cases"

// published is what these tests use of a case. Figures are texts, as printed or as recomputed exactly.
type published struct {
	ID      string
	Factors []struct {
		Name   string
		Levels []string
		Effect string
		Within []string
	}
	Response   string
	ModelTerms []struct {
		Label      string
		AllFactors []string `json:"all_factors"`
	} `json:"model_terms"`
	Data struct {
		Columns []string
		Rows    [][]string
	}
	Published struct {
		Values struct{ SS map[string]string }
	}
	Recomputed struct {
		SS        map[string]string
		DF        map[string]int64
		GrandMean string `json:"grand_mean"`
	}
	Differing []string
}

// readCases returns all cases that have data and a model.
func readCases(t *testing.T) []published {
	t.Helper()
	files, err := filepath.Glob(filepath.Join(casesDir, "*", "case.json"))
	if err != nil {
		t.Fatal(err)
	}
	var cases []published
	for _, name := range files {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		var c published
		if err := json.Unmarshal(text, &c); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if len(c.Data.Rows) > 0 && len(c.ModelTerms) > 0 {
			cases = append(cases, c)
		}
	}
	return cases
}

// lay lays the case's data onto the design of the named factors.
func (c *published) lay(t *testing.T, factors []string) *data.Grid {
	t.Helper()
	cells := 1
	declared := &api.Design{}
	var codes []map[string]uint32
	for _, f := range c.Factors {
		if !slices.Contains(factors, f.Name) {
			continue
		}
		declared.Factors = append(declared.Factors, api.Factor{
			Name: f.Name, Effect: f.Effect, Within: f.Within,
			Levels: api.Levels{Count: int64(len(f.Levels)), Labels: f.Levels},
		})
		cells *= len(f.Levels)
		index := map[string]uint32{}
		for i, label := range f.Levels {
			index[label] = uint32(i)
		}
		codes = append(codes, index)
	}
	replicates := api.Integer(len(c.Data.Rows) / cells)
	declared.Replicates = &replicates
	d, faults := engine.Check(declared)
	if len(faults) > 0 {
		t.Fatal(faults)
	}
	g := emptyGrid(d)
	if g.Rows != len(c.Data.Rows) {
		t.Fatalf("%s: %d rows for %v", c.ID, len(c.Data.Rows), factors)
	}
	for a, f := range d.Factors() {
		column := slices.Index(c.Data.Columns, f.Name)
		axis := make([]uint32, g.Rows)
		for i, row := range c.Data.Rows {
			level, known := codes[a][row[column]]
			if !known {
				t.Fatalf("%s: %s is no level of %s", c.ID, row[column], f.Name)
			}
			axis[i] = level
		}
		g.Axes[a] = narrow(axis, int(f.Levels))
	}
	counts := make([]int, cells)
	for i := range g.Rows {
		counts[group(g, d.All(), i)]++
	}
	if slices.Min(counts) != slices.Max(counts) {
		t.Fatalf("%s: cells of %d to %d readings for %v", c.ID, slices.Min(counts), slices.Max(counts), factors)
	}
	column := slices.Index(c.Data.Columns, c.Response)
	var readings []string
	for _, row := range c.Data.Rows {
		readings = append(readings, row[column])
	}
	shift, offsets := exactOffsets(t, readings)
	g.Responses = []data.Response{{Shift: shift, Offsets: offsets}}
	return g
}

// fitted returns the sums of squares and df of the case's model by label, and the mean. A term that the model leaves out
// joins the smallest line that contains it: nearly always the residual, in a split-split-plot the error of the sub-plots.
func (c *published) fitted(t *testing.T) (ss map[string]float64, df map[string]int64, mean float64) {
	t.Helper()
	cells := 1
	var all []string
	for _, f := range c.Factors {
		cells *= len(f.Levels)
		all = append(all, f.Name)
	}
	ss, df = map[string]float64{}, map[string]int64{}
	// Every two factors of a Latin or Graeco-Latin square are crossed with one reading per cell: the main effects are those
	// of any pair.
	designs := [][]string{all}
	if cells > len(c.Data.Rows) {
		designs = nil
		for i, f := range all {
			designs = append(designs, []string{f, all[(i+1)%len(all)]})
		}
	}
	for _, factors := range designs {
		g := c.lay(t, factors)
		s, err := NewKernel(g).Sums(t.Context(), 0)
		if err != nil {
			t.Fatal(err)
		}
		mean = s.Mean
		ss["Total"], df["Total"] = s.Total, g.Design.Observations()-1
		for label, of := range c.lines(g.Design) {
			var sum float64
			var dfs int64
			for _, term := range of {
				sum += s.Term(term)
				dfs += g.Design.DF(term)
			}
			if before, twice := ss[label]; twice && math.Abs(before-sum) > 1e-13*s.Total {
				t.Errorf("%s: SS of %s is %v with one factor beside it, %v with another", c.ID, label, before, sum)
			}
			ss[label], df[label] = sum, dfs
		}
	}
	rest, restDF := ss["Total"], df["Total"]
	for _, m := range c.ModelTerms {
		rest -= ss[m.Label]
		restDF -= df[m.Label]
	}
	ss[api.Residual], df[api.Residual] = rest, restDF
	return ss, df, mean
}

// lines returns, for every line of the model that the design has, the design's terms in it; the residual apart.
func (c *published) lines(d *engine.Design) map[string][]engine.Set {
	lines := map[string][]engine.Set{}
	for _, term := range d.Terms() {
		label, size := "", engine.MaxFactors+1
		for _, m := range c.ModelTerms {
			var line engine.Set
			for i, f := range d.Factors() {
				if slices.Contains(m.AllFactors, f.Name) {
					line |= engine.SetOf(i)
				}
			}
			if line.Len() == len(m.AllFactors) && line.Len() < size && line.Holds(term) {
				label, size = m.Label, line.Len()
			}
		}
		if label != "" {
			lines[label] = append(lines[label], term)
		}
	}
	return lines
}

// TestPublishedCases compares every term of every balanced case with the exact recomputation, to 1e-12 of the total, and
// with the figure in print, to half a unit in its last place, unless the case says that the two differ.
func TestPublishedCases(t *testing.T) {
	cases := readCases(t)
	if len(cases) < 35 {
		t.Fatalf("only %d cases", len(cases))
	}
	compared := 0
	for _, c := range cases {
		ss, df, mean := c.fitted(t)
		total := number(t, c.Recomputed.SS["Total"])
		for label, text := range c.Recomputed.SS {
			got, known := ss[label]
			if !known {
				t.Errorf("%s: no term %s", c.ID, label)
			}
			if math.Abs(got-number(t, text)) > 1e-12*total {
				t.Errorf("%s: SS of %s is %v, exactly %s", c.ID, label, got, text)
			}
			if df[label] != c.Recomputed.DF[label] {
				t.Errorf("%s: df of %s is %d, not %d", c.ID, label, df[label], c.Recomputed.DF[label])
			}
		}
		if want := number(t, c.Recomputed.GrandMean); math.Abs(mean-want) > 1e-14*math.Abs(want) {
			t.Errorf("%s: the mean is %v, exactly %v", c.ID, mean, want)
		}
		for label, text := range c.Published.Values.SS {
			if slices.Contains(c.Differing, "SS/"+label) {
				continue
			}
			compared++
			// The exact value may lie on the boundary of rounding; the last digits of a double must not decide.
			if got := ss[label]; math.Abs(got-number(t, text)) > 0.5*lastPlace(text)+1e-12*total {
				t.Errorf("%s: SS of %s is %v, in print %s", c.ID, label, got, text)
			}
		}
	}
	if compared < 100 {
		t.Errorf("only %d figures in print compared", compared)
	}
	t.Logf("%d cases, %d figures in print", len(cases), compared)
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// lastPlace returns the unit in the last place of a printed number.
func lastPlace(text string) float64 {
	mantissa, exponent, _ := strings.Cut(strings.ToLower(text), "e")
	power := 0
	if exponent != "" {
		power, _ = strconv.Atoi(exponent) // a number, as strconv.ParseFloat saw
	}
	if _, fraction, found := strings.Cut(mantissa, "."); found {
		power -= len(fraction)
	}
	return math.Pow(10, float64(power))
}
