package data

import (
	"fmt"
	"maps"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"

	"pgregory.net/rapid"
)

// table is a data set as a person has it: labels by row and factor.
type table struct {
	design *engine.Design
	labels [][]string // by row, then factor
}

func (tb *table) columns() *Columns {
	c := &Columns{Rows: len(tb.labels), place: "data", pointers: true}
	for f, factor := range tb.design.Factors() {
		d := newDictionary()
		codes := make([]uint32, len(tb.labels))
		for row := range tb.labels {
			codes[row] = entryNumber(d.entry([]byte(tb.labels[row][f])))
		}
		narrow := makeCodes(len(codes), int64(len(d.words)))
		for row, code := range codes {
			switch {
			case narrow.U8 != nil:
				narrow.U8[row] = uint8(code)
			case narrow.U16 != nil:
				narrow.U16[row] = uint16(code)
			default:
				narrow.U32[row] = code
			}
		}
		c.Factors = append(c.Factors, LabelColumn{Name: factor.Name, Codes: narrow, Labels: d.labels()})
	}
	offsets := make([]float64, len(tb.labels))
	for row := range offsets {
		offsets[row] = float64(row)
	}
	c.Responses = []Response{{Name: "y", Offsets: offsets}}
	return c
}

// makeCodes returns n codes, all 0, of the narrowest width for this many levels.
func makeCodes(n int, levels int64) Codes {
	switch {
	case levels <= math.MaxUint8+1:
		return Codes{U8: make([]uint8, n)}
	case levels <= math.MaxUint16+1:
		return Codes{U16: make([]uint16, n)}
	}
	return Codes{U32: make([]uint32, n)}
}

// path returns the labels of a row at the factors in s: what tells one level of a nested factor from another.
func (tb *table) path(row int, s engine.Set) string {
	var path strings.Builder
	for _, f := range s.Members() {
		fmt.Fprintf(&path, "%d:%q ", f, tb.labels[row][f])
	}
	return path.String()
}

// expected are the codes that a plain reading of the rules finds, with maps of label paths only, and what the sentence has
// to say.
func (tb *table) expected() map[api.Code]string {
	codes := make(map[api.Code]string)
	factors := tb.design.Factors()
	astray := make([]bool, len(tb.labels))
	strays := false
	for f, factor := range factors {
		for row := range tb.labels {
			if factor.Labels != nil && !slices.Contains(factor.Labels, tb.labels[row][f]) {
				codes[api.UnknownLabel] = ""
				astray[row], strays = true, true
			}
		}
	}
	unclear, done := engine.Set(0), engine.Set(0)
	for range factors { // enough rounds for every order of declaration
		for f, factor := range factors {
			if done.Has(f) || factor.Above&^done != 0 {
				continue
			}
			done |= engine.SetOf(f)
			if factor.Labels != nil {
				continue
			}
			if factor.Above&unclear != 0 {
				unclear |= engine.SetOf(f)
				continue
			}
			within := make(map[string]map[string]bool)
			for row := range tb.labels {
				known := true
				for _, p := range factor.Above.Members() {
					known = known && (factors[p].Labels == nil || slices.Contains(factors[p].Labels, tb.labels[row][p]))
				}
				if !known {
					continue
				}
				parent := tb.path(row, factor.Above)
				if within[parent] == nil {
					within[parent] = make(map[string]bool)
				}
				within[parent][tb.labels[row][f]] = true
			}
			for _, levels := range within {
				if int64(len(levels)) > factor.Levels {
					codes[api.TooManyLevels] = ""
					unclear |= engine.SetOf(f)
				}
				if int64(len(levels)) < factor.Levels {
					unclear |= engine.SetOf(f)
					if factor.Above == 0 || !strays {
						codes[api.TooFewLevels] = ""
					}
				}
			}
		}
	}
	if unclear != 0 {
		if n := int64(len(tb.labels)); n < tb.design.Observations() {
			codes[api.MissingReadings] = fmt.Sprintf("the data have %d.", n)
		} else if n > tb.design.Observations() {
			codes[api.SurplusReadings] = fmt.Sprintf("the data have %d.", n)
		}
		return codes
	}
	cells := make(map[string]int64)
	for row := range tb.labels {
		if !astray[row] {
			cells[tb.path(row, tb.design.All())]++
		}
	}
	missing, surplus := tally{tb.design.Cells(), tb.design.Observations()}, tally{}
	for _, n := range cells {
		missing.readings -= min(n, tb.design.Replicates())
		if n >= tb.design.Replicates() {
			missing.cells--
		}
		if n > tb.design.Replicates() {
			surplus.cells++
			surplus.readings += n - tb.design.Replicates()
		}
	}
	if surplus.cells > 0 {
		codes[api.SurplusReadings] = have(surplus.cells, surplus.readings)
	}
	if missing.readings > 0 {
		codes[api.MissingReadings] = are(missing.readings) + " missing in " + cellCount(missing.cells)
	}
	return codes
}

// tally counts cells that do not match, and readings in them.
type tally struct{ cells, readings int64 }

// drawDesign draws a small design.
func drawDesign(t *rapid.T) *engine.Design {
	n := rapid.IntRange(1, 4).Draw(t, "factors")
	declared := &api.Design{Replicates: new(api.Integer(rapid.IntRange(1, 3).Draw(t, "replicates")))}
	for f := range n {
		levels := rapid.IntRange(1, 3).Draw(t, "levels")
		factor := api.Factor{Name: fmt.Sprintf("f%d", f), Effect: api.Random, Levels: api.Levels{Count: int64(levels)}}
		if rapid.IntRange(0, 3).Draw(t, "listed") == 0 {
			for l := range levels {
				factor.Levels.Labels = append(factor.Levels.Labels, fmt.Sprintf("L%d", l))
			}
		}
		for p := range f {
			if rapid.IntRange(0, 2).Draw(t, "within") == 0 {
				factor.Within = append(factor.Within, fmt.Sprintf("f%d", p))
			}
		}
		declared.Factors = append(declared.Factors, factor)
	}
	if rapid.Bool().Draw(t, "inner first") {
		slices.Reverse(declared.Factors)
	}
	design, faults := engine.Check(declared)
	if faults != nil {
		t.Fatal(faults)
	}
	return design
}

// drawTable draws a complete table of a design, rows in any order, a nested factor's labels reused or not.
func drawTable(t *rapid.T, design *engine.Design) *table {
	factors := design.Factors()
	styles := make([]int, len(factors))
	for f := range styles {
		styles[f] = rapid.IntRange(0, 2).Draw(t, "labels: reused, unique, mixed")
	}
	tb := &table{design: design}
	for cell := range design.Cells() {
		levels := make([]int64, len(factors))
		for f, rest := len(factors)-1, cell; f >= 0; f-- {
			levels[f], rest = rest%factors[f].Levels, rest/factors[f].Levels
		}
		labels := make([]string, len(factors))
		for f, factor := range factors {
			parent := int64(0)
			for _, p := range factor.Above.Members() {
				parent = parent*factors[p].Levels + levels[p]
			}
			switch {
			case factor.Labels != nil:
				labels[f] = factor.Labels[levels[f]]
			case styles[f] == 0 || styles[f] == 2 && parent%2 == 0:
				labels[f] = fmt.Sprintf("l%d", levels[f])
			default:
				labels[f] = fmt.Sprintf("l%d-%d", levels[f], parent)
			}
		}
		for range design.Replicates() {
			tb.labels = append(tb.labels, labels)
		}
	}
	rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "shuffle"), 0))
	rng.Shuffle(len(tb.labels), func(i, j int) { tb.labels[i], tb.labels[j] = tb.labels[j], tb.labels[i] })
	return tb
}

// corrupt changes a few rows, or none.
func corrupt(t *rapid.T, tb *table) {
	for range rapid.IntRange(0, 3).Draw(t, "changes") {
		if len(tb.labels) < 2 {
			return
		}
		row := rapid.IntRange(0, len(tb.labels)-1).Draw(t, "row")
		other := rapid.IntRange(0, len(tb.labels)-1).Draw(t, "other row")
		f := rapid.IntRange(0, len(tb.design.Factors())-1).Draw(t, "factor")
		switch rapid.IntRange(0, 4).Draw(t, "change") {
		case 0:
			tb.labels = slices.Delete(tb.labels, row, row+1)
		case 1:
			tb.labels = append(tb.labels, tb.labels[row])
		case 2:
			tb.labels[row] = slices.Clone(tb.labels[row])
			tb.labels[row][f] = tb.labels[other][f]
		case 3:
			tb.labels[row] = slices.Clone(tb.labels[row])
			tb.labels[row][f] = rapid.SampledFrom([]string{"new", "l0", "L0", "L0 "}).Draw(t, "label")
		case 4:
			tb.labels[row] = tb.labels[other]
		}
	}
}

// layProperty: a table is laid if and only if the plain reading finds nothing, and the faults are of the kinds it finds.
func layProperty(t *rapid.T) {
	tb := drawTable(t, drawDesign(t))
	corrupt(t, tb)
	if len(tb.labels) == 0 {
		return
	}
	want := tb.expected()
	grid, faults := Lay(tb.design, tb.columns())
	got := make(map[api.Code]string)
	for _, fault := range faults {
		got[fault.Code] = fault.Detail
		if strings.Contains(fault.Detail, want[fault.Code]) {
			got[fault.Code] = want[fault.Code]
		}
		if fault.Detail == "" || !strings.HasPrefix(fault.Place, "data") {
			t.Fatalf("fault without a sentence or a place: %+v", fault)
		}
	}
	if !maps.Equal(got, want) {
		t.Fatalf("%d rows %q: got %v, want %v", len(tb.labels), tb.labels, faults, want)
	}
	if len(want) == 0 {
		checkGrid(t, tb, grid)
	}
}

// checkGrid checks that levels are numbered as promised, within each parent, and that a cell is a path of labels.
func checkGrid(t rapid.TB, tb *table, grid *Grid) {
	factors := tb.design.Factors()
	for f, factor := range factors {
		next := make(map[string]uint32) // by parent
		level := make(map[string]uint32)
		for row := range tb.labels {
			label := tb.labels[row][f]
			got := grid.Axes[f].At(row)
			if factor.Labels != nil {
				if factor.Labels[got] != label {
					t.Fatalf("row %d: level %d of %s is not %q", row, got, factor.Name, label)
				}
				continue
			}
			parent := tb.path(row, factor.Above)
			path := parent + "/" + label
			if _, seen := level[path]; !seen {
				level[path] = next[parent]
				next[parent]++
			}
			if got != level[path] || int64(got) >= factor.Levels {
				t.Fatalf("row %d: level %d of %s, want %d", row, got, factor.Name, level[path])
			}
		}
	}
	cells := make([]uint32, grid.Rows)
	grid.Cells(cells, 0)
	counts := make([]int64, tb.design.Cells())
	for row, cell := range cells {
		counts[cell]++
		want := uint32(0)
		for f := range factors {
			want = want*uint32(factors[f].Levels) + grid.Axes[f].At(row)
		}
		if cell != want || grid.Responses[0].Offsets[row] != float64(row) {
			t.Fatalf("row %d: cell %d, want %d", row, cell, want)
		}
	}
	for cell, n := range counts {
		if n != tb.design.Replicates() {
			t.Fatalf("cell %d has %d readings", cell, n)
		}
	}
}

func TestLay(t *testing.T) {
	for range 50 { // a hundred tables each: some faults come up in few
		rapid.Check(t, layProperty)
	}
}

func FuzzLay(f *testing.F) { f.Fuzz(rapid.MakeFuzz(layProperty)) }

// Studies with more levels than one or two bytes can tell apart, and nested labels that are reused here and unique there.
func TestLayManyLevels(t *testing.T) {
	for _, c := range []struct{ outer, inner, replicates int }{{300, 40, 1}, {66_000, 1, 1}, {1, 66_000, 1}, {20, 300, 2}, {7, 5, 300}} {
		design, faults := engine.Check(&api.Design{Factors: []api.Factor{
			{Name: "inner", Levels: api.Levels{Count: int64(c.inner)}, Effect: api.Random, Within: []string{"outer"}},
			{Name: "outer", Levels: api.Levels{Count: int64(c.outer)}, Effect: api.Random},
		}, Replicates: new(api.Integer(c.replicates))})
		if faults != nil {
			t.Fatal(faults)
		}
		for style := range 3 {
			if style == 2 && c.outer*c.inner > 60_000 {
				continue // as slow as the others, and no other way through
			}
			tb := &table{design: design}
			for i := range c.outer * c.inner * c.replicates {
				outer, inner := i%c.outer, i/c.outer%c.inner
				label := fmt.Sprintf("i%d", inner)
				if style == 1 || style == 2 && outer%2 == 1 {
					label = fmt.Sprintf("i%d of %d", inner, outer)
				}
				tb.labels = append(tb.labels, []string{label, fmt.Sprintf("o%d", outer)})
			}
			rng := rand.New(rand.NewPCG(3, uint64(style)))
			rng.Shuffle(len(tb.labels), func(i, j int) { tb.labels[i], tb.labels[j] = tb.labels[j], tb.labels[i] })
			grid, faults := Lay(design, throughText(t, tb, style))
			if faults != nil {
				t.Fatalf("%v, style %d: %+v", c, style, faults)
			}
			checkGrid(t, tb, grid)
			other := slices.IndexFunc(tb.labels, func(labels []string) bool { return !slices.Equal(labels, tb.labels[0]) })
			tb.labels[0] = tb.labels[other]
			if _, faults = Lay(design, throughText(t, tb, style)); faults == nil {
				t.Fatalf("%v, style %d: a row in the cell of another was taken", c, style)
			}
		}
	}
}

// throughText writes a table as JSON columns or as CSV and scans it.
func throughText(t *testing.T, tb *table, style int) *Columns {
	t.Helper()
	c := content{names: []string{"inner", "outer", "y"}, labels: make([][]string, 2), values: make([][]string, 1)}
	for row, labels := range tb.labels {
		c.labels[0] = append(c.labels[0], labels[0])
		c.labels[1] = append(c.labels[1], labels[1])
		c.values[0] = append(c.values[0], fmt.Sprint(row))
	}
	if style == 0 {
		columns, faults := ScanCSV(c.csv(false, "\n"), c.plan())
		if faults != nil {
			t.Fatal(faults)
		}
		return columns
	}
	columns, faults, err := ScanJSON(c.json(""), c.plan())
	if faults != nil || err != nil {
		t.Fatal(faults, err)
	}
	return columns
}

// What a label may have been meant as.
func TestHints(t *testing.T) {
	known := []string{"gel", "plain", "1", "-80"}
	for label, hint := range map[string]string{"Gel": "“gel”? Case and blanks count", "gel ": "“gel”", "plan": "“plain”?", "1.0": "“1”? A label is a text", "-80.00": "“-80”", "heparin": "", "": ""} {
		if got := nearest(label, known); hint == "" && got != "" || !strings.Contains(got, hint) {
			t.Errorf("%q: %q, want %q", label, got, hint)
		}
	}
}
