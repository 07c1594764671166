package data

import (
	"fmt"
	"runtime"
	"strconv"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// crossed returns the JSON columns of two crossed factors, a and b levels, each cell measured n times, and their design.
func crossed(tb testing.TB, a, b, n int) (*engine.Design, []byte) {
	tb.Helper()
	design, faults := engine.Check(&api.Design{Factors: []api.Factor{
		{Name: "batch", Levels: api.Levels{Count: int64(a)}, Effect: api.Random},
		{Name: "tube", Levels: api.Levels{Count: int64(b)}, Effect: api.Fixed},
	}, Replicates: new(api.Integer(n))})
	if faults != nil {
		tb.Fatal(faults)
	}
	var batch, tube, y strings.Builder
	for i := range a * b * n {
		if i > 0 {
			batch.WriteByte(',')
			tube.WriteByte(',')
			y.WriteByte(',')
		}
		fmt.Fprintf(&batch, `"b%d"`, i%a)
		fmt.Fprintf(&tube, `"t%d"`, i/a%b)
		y.WriteString(strconv.FormatFloat(4+float64(i*7919%1000)/1000, 'f', 3, 64))
	}
	return design, []byte(`{"batch":[` + batch.String() + `],"tube":[` + tube.String() + `],"potassium":[` + y.String() + `]}`)
}

// spent returns the bytes and the allocations of scanning and laying.
func spent(tb testing.TB, design *engine.Design, text []byte) (size, allocations float64) {
	tb.Helper()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	columns, faults, err := ScanJSON(text, Plan{Factors: []string{"batch", "tube"}})
	if err != nil || faults != nil {
		tb.Fatal(err, faults)
	}
	grid, faults := Lay(design, columns)
	runtime.ReadMemStats(&after)
	if faults != nil {
		tb.Fatal(faults)
	}
	runtime.KeepAlive(grid)
	return float64(after.TotalAlloc - before.TotalAlloc), float64(after.Mallocs - before.Mallocs)
}

// Row 5 of the goals: for two factors at most 16 bytes a row are allocated over the text, the fit included, and at most 200
// allocations made whatever the number of rows. What is kept are 8 bytes of offset and 1 of each code, 10 in all; to that
// comes a bit or a byte for each cell while it is checked, and where there are more than 256 levels, codes of 2 bytes after those
// of 1. What does not grow with the rows is kept below 320 KiB.
func TestMemory(t *testing.T) {
	for _, c := range []struct {
		a, b, n int
		bytes   float64
	}{{200, 10, 100, 10.01}, {200, 100, 10, 10.1}, {250, 200, 4, 10.25}, {500, 400, 1, 14.125}} {
		design, text := crossed(t, c.a, c.b, c.n)
		size, allocations := spent(t, design, text)
		rows := float64(c.a * c.b * c.n)
		const apart = 320 << 10
		if perRow := (size - apart) / rows; perRow > c.bytes || size > 16*rows {
			t.Errorf("%d × %d × %d: %.2f bytes a row, more than %.2f", c.a, c.b, c.n, perRow, c.bytes)
		}
		if allocations > 100 {
			t.Errorf("%d × %d × %d: %.0f allocations", c.a, c.b, c.n, allocations)
		}
	}
	_, small := crossed(t, 20, 10, 5)
	design, _ := crossed(t, 20, 10, 5)
	_, few := spent(t, design, small)
	design, large := crossed(t, 20, 10, 1000)
	if _, many := spent(t, design, large); many > few+8 {
		t.Errorf("%.0f allocations for 1,000 rows, %.0f for 200,000", few, many)
	}
}

// A design far larger than its data is refused at the cost of the data.
func TestHugeDesign(t *testing.T) {
	declared := &api.Design{}
	for f := range 5 {
		declared.Factors = append(declared.Factors, api.Factor{Name: fmt.Sprintf("f%d", f), Levels: api.Levels{Count: 1 << 10}, Effect: api.Random})
	}
	design, faults := engine.Check(declared)
	if faults != nil {
		t.Fatal(faults)
	}
	tb := &table{design: design}
	for row := range 10 {
		label := strconv.Itoa(row)
		tb.labels = append(tb.labels, []string{label, label, label, label, label})
	}
	checkHuge(t, tb, api.TooFewLevels, api.MissingReadings)

	// With the labels listed, every cell is known, and all but ten are empty.
	for f := range declared.Factors {
		labels := make([]string, 1<<10)
		for i := range labels {
			labels[i] = strconv.Itoa(i)
		}
		declared.Factors[f].Levels.Labels = labels
	}
	if tb.design, faults = engine.Check(declared); faults != nil {
		t.Fatal(faults)
	}
	checkHuge(t, tb, api.MissingReadings)
}

func checkHuge(t *testing.T, tb *table, codes ...api.Code) {
	t.Helper()
	columns := tb.columns()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, faults := Lay(tb.design, columns)
	runtime.ReadMemStats(&after)
	if size := after.TotalAlloc - before.TotalAlloc; size > 1<<20 {
		t.Errorf("%d bytes were allocated", size)
	}
	for _, code := range codes {
		found := false
		for _, f := range faults {
			found = found || f.Code == code
		}
		if !found {
			t.Errorf("no %s in %+v", code, faults)
		}
	}
	if last := faults[len(faults)-1]; !strings.Contains(last.Detail, strconv.Itoa(1<<50)) && !strings.Contains(last.Detail, strconv.Itoa(1<<50-10)) {
		t.Errorf("no count in %q", last.Detail)
	}
}

// Whatever is sent, what is allocated is in proportion to it.
func TestHostileShapes(t *testing.T) {
	const size = 400_000
	fill := func(part string) string { return strings.Repeat(part, size/len(part)) }
	var keys strings.Builder
	for i := range size / 12 {
		fmt.Fprintf(&keys, `"k%d":[1],`, i)
	}
	json := map[string]string{
		"long column, then many short ones": `{"density":[` + fill("1,") + `1],` + keys.String() + `"reader":[]}`,
		"a label of commas":                 `{"reader":["` + fill(",") + `"],"density":[1]}`,
		"many labels":                       `{"reader":[` + fill("1,2,3,") + `4],"density":[]}`,
		"nulls":                             `{"reader":[` + fill("null,") + `null],"density":[` + fill("null,") + `null]}`,
		"texts":                             `{"reader":[` + fill("{},") + `{}],"density":[` + fill(`"x",`) + `"x"]}`,
		"digits":                            `{"reader":[1],"density":[` + fill("1234567890") + `]}`,
		"decimals":                          `{"reader":[1],"density":[0.` + fill("1234567890") + `]}`,
		"exponent":                          `{"reader":[1],"density":[1e` + fill("1234567890") + `]}`,
		"long numbers":                      `{"reader":[1],"density":[` + fill("1234567890123456789012345,") + `1]}`,
		"far apart":                         `{"reader":[1],"density":[` + fill("1e-300,1e300,") + `1]}`,
	}
	for name, text := range json {
		for _, plan := range []Plan{twoColumns(), {Factors: []string{"reader"}}} {
			checkHostile(t, name, len(text), func() {
				if _, _, err := ScanJSON([]byte(text), plan); err != nil {
					t.Errorf("%s: %v", name, err)
				}
			})
		}
	}
	var header strings.Builder
	for i := range 5000 {
		fmt.Fprintf(&header, "c%d,", i)
	}
	csv := map[string]string{
		"many columns, many empty lines": strings.Repeat("c,", 50_000) + "reader,density\n" + fill("\n"),
		"many columns, short lines":      strings.Repeat("c,", 50_000) + "reader,density\n" + fill("1\n"),
		"columns and empty lines":        header.String() + "reader,density\n" + fill("\n"),
		"quotes":                         "reader,density\n\"" + fill(`""`) + "\",1\n",
		"commas":                         "reader,density\n" + fill(",") + "\n",
	}
	for name, text := range csv {
		for _, plan := range []Plan{twoColumns(), {Factors: []string{"reader"}}} {
			checkHostile(t, name, len(text), func() { ScanCSV([]byte(text), plan) })
		}
	}
}

func checkHostile(t *testing.T, name string, size int, scan func()) {
	t.Helper()
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	scan()
	runtime.ReadMemStats(&after)
	if spent := after.TotalAlloc - before.TotalAlloc; spent > 100*uint64(size) {
		t.Errorf("%s: %d bytes allocated for a text of %d", name, spent, size)
	} else {
		t.Logf("%s: %.1f bytes a byte", name, float64(spent)/float64(size))
	}
}
