package data

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"math/big"
	"math/bits"
	"math/rand/v2"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"

	"pgregory.net/rapid"
)

func twoColumns() Plan {
	return Plan{Factors: []string{"reader"}, Responses: []string{"density"}, Missing: []string{"NA"}}
}

// withNumber returns the same plan with a number that stands for a lost reading: then no reading goes the quick ways.
func withNumber() Plan {
	plan := twoColumns()
	plan.Missing = append(plan.Missing, "-999")
	return plan
}

// onlyReadings reports whether nothing but readings is wrong: then the columns are there, beside the faults.
func onlyReadings(faults []engine.Fault) bool {
	return !slices.ContainsFunc(faults, func(f engine.Fault) bool {
		return f.Code != api.LostReading && f.Code != api.NonNumericReading && f.Code != api.ReadingOutOfRange
	})
}

func faultsOf(t *testing.T, text string, plan Plan) []engine.Fault {
	t.Helper()
	columns, faults, err := ScanJSON([]byte(text), plan)
	if err != nil {
		t.Fatalf("%s: %v", text, err)
	}
	if (columns != nil) != onlyReadings(faults) {
		t.Fatalf("%s: columns %v beside faults %v", text, columns, faults)
	}
	return faults
}

// Every kind of fault of the JSON columns, with its place and what its sentence has to say.
func TestFaultsOfJSON(t *testing.T) {
	cases := []struct {
		text, code, place string
		says              []string
	}{
		{`{"reader": ["a", "b"], "density": [1, null]}`, "lost_reading", "data/density/1", []string{"Row 2", "“density”", "is null"}},
		{`{"reader": ["a", "b"], "density": [1, "NA"]}`, "lost_reading", "data/density/1", []string{"“NA”"}},
		{`{"reader": ["a", "b"], "density": [1, "\u004eA"]}`, "lost_reading", "data/density/1", []string{"“NA”"}},
		{`{"reader": ["a", "b"], "density": [1, -999]}`, "lost_reading", "data/density/1", []string{"“-999”"}},
		{`{"reader": ["a", "b"], "density": [1, -9.990E2]}`, "lost_reading", "data/density/1", nil},
		{`{"reader": ["a", "b"], "density": [1, "NaN"]}`, "non_numeric_reading", "data/density/1", []string{"“NaN”"}},
		{`{"reader": ["a", "b"], "density": [1, ""]}`, "non_numeric_reading", "data/density/1", []string{"“”"}},
		{`{"reader": ["a", "b"], "density": ["4,1", 1]}`, "non_numeric_reading", "data/density/0", []string{"a point, not a comma"}},
		{`{"reader": ["a", "b"], "density": ["4.1", 1]}`, "non_numeric_reading", "data/density/0", []string{"without the quotation marks"}},
		{`{"reader": ["a", "b"], "density": [true, 1]}`, "non_numeric_reading", "data/density/0", []string{"holds true"}},
		{`{"reader": ["a", "b"], "density": [[1], 1]}`, "non_numeric_reading", "data/density/0", []string{"an array"}},
		{`{"reader": ["a", "b"], "density": [{"x": [1, {}]}, 1]}`, "non_numeric_reading", "data/density/0", []string{"an object"}},
		{`{"reader": ["a", "b"], "density": [1, 1e400]}`, "reading_out_of_range", "data/density/1", []string{"“1e400”"}},
		{`{"reader": ["a", "b"], "density": [1, -1e309]}`, "reading_out_of_range", "data/density/1", nil},
		{`{"reader": ["a", "b"], "density": [1e-400, 1]}`, "reading_out_of_range", "data/density/0", nil},
		{`{"reader": ["a", null], "density": [1, 2]}`, "missing_label", "data/reader/1", []string{"Row 2", "“reader”"}},
		{`{"reader": ["a", ""], "density": [1, 2]}`, "missing_label", "data/reader/1", nil},
		{`{"reader": ["a", "", "b"], "density": [1, 2, 3], "other": "so that the text goes on"}`, "missing_label", "data/reader/1", nil},
		{`{"reader": ["a", true], "density": [1, 2]}`, "unusable_label", "data/reader/1", []string{"true"}},
		{`{"reader": ["a", {}], "density": [1, 2]}`, "unusable_label", "data/reader/1", []string{"an object"}},
		{`{"reader": ["a", 1e999], "density": [1, 2]}`, "unusable_label", "data/reader/1", nil},
		{`{"reader": ["a", "b"], "density": [1, 2, 3]}`, "unequal_columns", "data", []string{"2 values in “reader”", "3 values in “density”"}},
		{`{"reader": ["a", "b"], "density": []}`, "unequal_columns", "data", []string{"0 values"}},
		{`{"reader": ["a", "b"], "densty": [1, 2]}`, "missing_column", "data", []string{"“density”", "Did you mean “densty”?"}},
		{`{"Reader ": ["a", "b"], "density": [1, 2]}`, "missing_column", "data", []string{"Did you mean “Reader ”? Case and blanks count."}},
		{`{"reader": [], "density": []}`, "no_rows", "data", nil},
		{`{"reader": ["a"], "density": [1], "density": [2]}`, "duplicate_column", "data/density", nil},
		{`{"reader": ["a"], "density": [1], "d\u0065nsity": [2]}`, "duplicate_column", "data/density", nil},
		{`{"reader": "a", "density": [1]}`, "not_a_column", "data/reader", nil},
	}
	for i, c := range append(slices.Clone(cases), cases...) {
		plan := withNumber()
		if i < len(cases) && !strings.Contains(c.text, "-9") {
			plan = twoColumns()
		}
		faults := faultsOf(t, c.text, plan)
		if len(faults) != 1 || string(faults[0].Code) != c.code || faults[0].Place != c.place {
			t.Errorf("%s: got %+v, want %s at %s", c.text, faults, c.code, c.place)
			continue
		}
		for _, part := range c.says {
			if !strings.Contains(faults[0].Detail, part) {
				t.Errorf("%s: %q does not say %q", c.text, faults[0].Detail, part)
			}
		}
	}
}

func TestFaultsOfPlan(t *testing.T) {
	text := `{"reader": ["a"], "density": [1], "odd/name~": ["x"]}`
	cases := []struct {
		responses   []string
		code, place string
	}{
		{[]string{"density", "density"}, "repeated_response", "responses/1"},
		{[]string{"density", "reader"}, "response_is_factor", "responses/1"},
		{[]string{}, "no_response", "responses"},
		{nil, "non_numeric_reading", "data/odd~1name~0/0"},
	}
	for _, c := range cases {
		faults := faultsOf(t, text, Plan{Factors: []string{"reader"}, Responses: c.responses})
		if len(faults) != 1 || string(faults[0].Code) != c.code || faults[0].Place != c.place {
			t.Errorf("%v: got %+v, want %s at %s", c.responses, faults, c.code, c.place)
		}
	}
	if faults := faultsOf(t, `{"reader": ["a"]}`, Plan{Factors: []string{"reader"}}); len(faults) != 1 || faults[0].Code != api.NoResponse {
		t.Errorf("no response: got %+v", faults)
	}
}

// All faults come at once, five examples of a kind and then the count.
func TestFaultsAreCapped(t *testing.T) {
	readings := strings.Repeat(`null,`, 7) + `"x",1e999,1`
	faults := faultsOf(t, `{"reader": [null, 1,1,1,1,1,1,1,1], "density": [`+readings+`]}`, twoColumns())
	counts := make(map[api.Code]int)
	for _, f := range faults {
		counts[f.Code]++
	}
	want := map[api.Code]int{api.LostReading: 6, api.NonNumericReading: 1, api.ReadingOutOfRange: 1, api.MissingLabel: 1, api.UnequalColumns: 1}
	if !reflect.DeepEqual(counts, want) {
		t.Fatalf("got %v, want %v", counts, want)
	}
	for _, f := range faults {
		if f.Place == "data" && f.Code == api.LostReading && !strings.Contains(f.Detail, "In all, 7 readings are lost") {
			t.Errorf("no count in %q", f.Detail)
		}
	}
}

func TestFaultsOfCSV(t *testing.T) {
	cases := []struct{ text, code, says string }{
		{"reader,density\na,1\nb,\n", "lost_reading", "Row 2 of “density” is empty"},
		{"reader,density\na,1\nb, \n", "lost_reading", "empty"},
		{"reader,density\na,1\nb,NA\n", "lost_reading", "“NA”"},
		{"reader,density\na,1\nb,-999.0\n", "lost_reading", "“-999.0”"},
		{"reader,density\na,1\nb,NaN\n", "non_numeric_reading", "“NaN”"},
		{"reader,density\na,1\nb,Inf\n", "non_numeric_reading", "“Inf”"},
		{"reader,density\na,1\nb,0x10\n", "non_numeric_reading", "“0x10”"},
		{"reader,density\na,1\nb,1_000\n", "non_numeric_reading", "“1_000”"},
		{"reader,density\na,1\nb,1e\n", "non_numeric_reading", "“1e”"},
		{"reader,density\na,1\nb,.\n", "non_numeric_reading", "“.”"},
		{"reader,density\na,1\nb,\"4,1\"\n", "non_numeric_reading", "a point, not a comma"},
		{"reader,density\na,1\nb,1e400\n", "reading_out_of_range", "row 2"},
		{"reader,density\na,1\n,2\n", "missing_label", "Row 2 of “reader” is empty"},
		{"reader,density\na,1\nb\n", "ragged_row", "Row 2 has 1 cell, but the header has 2"},
		{"reader,density\na,1\nb,4,1\n", "ragged_row", "decimal comma"},
		{"reader,density\n", "no_rows", ""},
		{"reader,density\na,1\n\"b,2\n", "invalid_csv", "not closed"},
		{"reader,density\na,1\n\"b\"x,2\n", "invalid_csv", "Row 2"},
		{"reader,density\na,1\nb\",2\n", "invalid_csv", "Row 2"},
		{"reader,density\ra,1\r", "invalid_csv", "carriage return"},
		{"reader,density\na,1\n\xff,2\n", "invalid_csv", "UTF-8"},
		{"", "invalid_csv", "empty"},
		{"\n\r\n", "invalid_csv", "empty"},
		{"reader,density,density\na,1,2\n", "duplicate_column", "“density”"},
		{"reader;density\na;1\n", "missing_column", "semicolons"},
		{"reader\tdensity\na\t1\n", "missing_column", "tabs"},
	}
	for i, c := range append(slices.Clone(cases), cases...) {
		plan := withNumber()
		if i < len(cases) && !strings.Contains(c.text, "-999") {
			plan = twoColumns()
		}
		columns, faults := ScanCSV([]byte(c.text), plan)
		if (columns != nil) != onlyReadings(faults) || len(faults) == 0 || string(faults[0].Code) != c.code || !strings.Contains(faults[0].Detail, c.says) || faults[0].Place != "csv" {
			t.Errorf("%q: got %+v, want %s saying %q", c.text, faults, c.code, c.says)
		}
		quoted, err := json.Marshal(c.text)
		if err != nil {
			t.Fatal(err)
		}
		if strings.Contains(c.text, "\xff") {
			continue
		}
		_, again, err := ScanCSVString(quoted, plan)
		if err != nil || !reflect.DeepEqual(again, faults) {
			t.Errorf("%q in a JSON string: got %+v (%v), want %+v", c.text, again, err, faults)
		}
	}
}

func TestTooManyRows(t *testing.T) {
	plan := twoColumns()
	plan.MaxRows = 3
	for n := range 6 {
		labels, readings := strings.Repeat(`"a",`, n)+`"a"`, strings.Repeat(`1,`, n)+`1`
		faults := faultsOf(t, `{"reader": [`+labels+`], "density": [`+readings+`]}`, plan)
		_, fromCSV := ScanCSV([]byte("reader,density\n"+strings.Repeat("a,1\n", n+1)), plan)
		for _, f := range [][]engine.Fault{faults, fromCSV} {
			if over := n+1 > 3; over != (len(f) == 1 && f[0].Code == api.TooManyRows && strings.Contains(f[0].Detail, strconv.Itoa(n+1)+" rows")) || !over && f != nil {
				t.Errorf("%d rows of 3: %+v", n+1, f)
			}
		}
	}
}

func TestTooManyColumns(t *testing.T) {
	for _, n := range []int{MaxColumns, MaxColumns + 1} {
		var columns, header strings.Builder
		columns.WriteString(`{"reader":[1]`)
		header.WriteString("reader")
		for i := range n - 1 {
			fmt.Fprintf(&columns, `,"y%d":[1]`, i)
			fmt.Fprintf(&header, ",y%d", i)
		}
		_, faults, err := ScanJSON([]byte(columns.String()+"}"), Plan{Factors: []string{"reader"}})
		if over := n > MaxColumns; over != (err != nil) || faults != nil {
			t.Errorf("%d columns: %v, %v", n, faults, err)
		}
		_, faults = ScanCSV([]byte(header.String()+"\n"+strings.Repeat("1,", n-1)+"1"), Plan{Factors: []string{"reader"}})
		if over := n > MaxColumns; over != (len(faults) == 1 && faults[0].Code == api.InvalidCSV) || !over && faults != nil {
			t.Errorf("%d columns: %+v", n, faults)
		}
	}
}

// Texts that are not JSON stop the reading, with the byte.
func TestSyntaxOfColumns(t *testing.T) {
	cases := []struct {
		text   string
		offset int
	}{
		{`[1]`, 0},
		{`{"reader": ["a" "b"]}`, 16},
		{`{"reader": ["a",]}`, 16},
		{`{"reader": ["a"`, 15},
		{`{"reader": ["a`, 12},
		{`{"reader": [gel]}`, 12},
		{`{"density": [01]}`, 13},
		{`{"density": [1.]}`, 15},
		{`{"density": [NaN]}`, 13},
		{`{"density": [1e]}`, 15},
		{`{"density": [+1]}`, 13},
		{`{"density": [.5]}`, 13},
		{`{"density": [1,2}`, 16},
		{`{"other": [nul]}`, 11},
		{`{"reader": ["a"]} x`, 18},
		{`{"reader": ["a"],}`, 17},
		{"{\"reader\": [\"a\tb\"]}", 14},
		{"{\"reader\": [\"\xff\"]}", 13},
		{`{"reader": ["\ud800"]}`, 13},
		{`{"reader": ["\x"]}`, 13},
		{`{"other": ` + strings.Repeat("[", MaxDepth+1), 10 + MaxDepth},
	}
	for _, c := range cases {
		// Behind the fault much else stands or nothing, so that both the quick ways and those near the end meet it.
		for _, pad := range []string{"", strings.Repeat(" ", 40)} {
			columns, faults, err := ScanJSON([]byte(c.text+pad), twoColumns())
			if _, _, again := ScanJSON([]byte(c.text+pad), withNumber()); again == nil || again.Error() != err.Error() {
				t.Errorf("%q: %v, but by the slow way %v", c.text, err, again)
			}
			var syntax *SyntaxError
			if columns != nil || faults != nil || !errors.As(err, &syntax) {
				t.Errorf("%q: got %v, %v, %v", c.text, columns, faults, err)
				continue
			}
			ends := c.offset == len(c.text)
			if syntax.Offset != c.offset && (!ends || syntax.Offset != len(c.text+pad)) {
				t.Errorf("%q: %v, want byte %d", c.text, err, c.offset)
			}
		}
	}
}

// A known label never lets through a text that is not its JSON: quick ways compare bytes.
func TestKnownLabelsDoNotExcuseBadJSON(t *testing.T) {
	pad := strings.Repeat(" ", 40)
	for _, bad := range []string{`["gel", gel]`, "[\"a\\tb\", \"a\tb\"]", `["true", true1]`, `["1.", 1.]`, `["01", 01]`, `["-", -]`, `["gel", gel, 1]`, `["1.", 1., 1]`, `["01", 01, 1]`, `["a long label, 1", a long label, 1]`} {
		text := `{"reader": ` + bad + `, "density": [1, 2, 3]}` + pad
		if _, _, err := ScanJSON([]byte(text), twoColumns()); err == nil {
			t.Errorf("%s was taken", text)
		}
	}
	for _, bad := range []string{"01.5", "00.5", "-01.5", "1.5.5", "1.", "-", "-.5", "1.5-", "12345678901.", "012345678901.5"} {
		text := `{"reader": [1, 1, 1], "density": [1.5, ` + bad + `, 2.5]}` + pad
		if _, _, err := ScanJSON([]byte(text), twoColumns()); err == nil {
			t.Errorf("%s was taken", text)
		}
	}
	// The text a\nb of four characters, and the text of three with a line feed, are two labels.
	columns, faults, err := ScanJSON([]byte(`{"reader": ["a\\nb", "a\nb", "a\\nb", "a\u000ab"], "density": [1, 2, 3, 4]}`+pad), twoColumns())
	if faults != nil || err != nil {
		t.Fatal(faults, err)
	}
	if got, want := columns.Factors[0].Labels, []string{`a\nb`, "a\nb"}; !slices.Equal(got, want) || !slices.Equal(columns.Factors[0].Codes.U8, []uint8{0, 1, 0, 1}) {
		t.Errorf("got %q %v, want %q", got, columns.Factors[0].Codes, want)
	}
}

// A label is what api.NumberLabel makes of a number, and equal texts are one label.
func TestNumberLabels(t *testing.T) {
	written := []string{"1", "1.0", `"1"`, "1e0", "10E-1", "-0", "0", "0.0", "1e21", "1000000000000000000000", "123456789012345678", "0.000001", "0.0000001", "1e-7", "-80", "-80.50", "0.1", "100", "9007199254740993", "0.00000100"}
	text := `{"reader": [` + strings.Join(written, ",") + `], "density": [` + strings.TrimSuffix(strings.Repeat("1,", len(written)), ",") + `]}`
	columns, faults, err := ScanJSON([]byte(text+strings.Repeat(" ", 40)), twoColumns())
	if faults != nil || err != nil {
		t.Fatal(faults, err)
	}
	f := columns.Factors[0]
	for row, w := range written {
		var want api.Label
		if err := json.Unmarshal([]byte(w), &want); err != nil {
			t.Fatal(err)
		}
		if got := f.Labels[f.Codes.At(row)]; got != string(want) {
			t.Errorf("%s: label %q, want %q", w, got, want)
		}
	}
	for i, label := range f.Labels {
		if slices.Index(f.Labels, label) != i {
			t.Errorf("the label %q occurs twice", label)
		}
	}
}

// isShortestNumber claims only what api.NumberLabel does.
func TestShortestNumbers(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.StringMatching(`-?(0|[1-9][0-9]{0,16})(\.[0-9]{1,9})?`).Draw(t, "number")
		x, err := strconv.ParseFloat(text, 64)
		if err != nil {
			t.Fatal(err)
		}
		if isShortestNumber([]byte(text)) && api.NumberLabel(x) != text {
			t.Fatalf("%s is written %s", text, api.NumberLabel(x))
		}
	})
	for _, not := range []string{"", "-", ".", "-.5", "5.", "1.0", "00", "01", "-0", "1e5", "+1", "0.0000005", "1a", "--1", "1.2.3"} {
		if isShortestNumber([]byte(not)) {
			t.Errorf("%q passes for a number in shortest form", not)
		}
	}
}

// exactOffset is the double nearest to x − first, by rationals.
func exactOffset(x, first string) float64 {
	a, _ := new(big.Rat).SetString(x)
	b, _ := new(big.Rat).SetString(first)
	f, _ := a.Sub(a, b).Float64()
	return f
}

// Every offset is the exact difference, rounded once; or, plain, the reading rounded once, and then never further off than
// 2^-53 of the range.
func TestOffsetsAreExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		readings := drawReadings(t)
		for _, read := range []func() (*Columns, []engine.Fault, error){
			func() (*Columns, []engine.Fault, error) {
				labels := strings.TrimSuffix(strings.Repeat("1,", len(readings)), ",")
				return ScanJSON([]byte(`{"density":[`+strings.Join(readings, ",")+`],"reader":[`+labels+`]}`), Plan{Factors: []string{"reader"}})
			},
			func() (*Columns, []engine.Fault, error) {
				c, f := ScanCSV([]byte("density,reader\n"+strings.Join(readings, ",1\n")+",1"), Plan{Factors: []string{"reader"}})
				return c, f, nil
			},
		} {
			columns, faults, err := read()
			if faults != nil || err != nil {
				t.Fatal(readings, faults, err)
			}
			checkOffsets(t, &columns.Responses[0], readings)
		}
	})
}

func drawReadings(t *rapid.T) []string {
	style := rapid.SampledFrom([]string{
		`-?(0|[1-9][0-9]{0,6})(\.[0-9]{1,4})?`,
		`1000000000000\.[0-9]{1,3}`,
		`-?[1-9]\.[0-9]{15,17}`,
		`-?(0|[1-9][0-9]{0,20})(\.[0-9]{1,25})?`,
		`[1-9][0-9]{30,50}(\.[0-9]{1,25})?`,
		`-?[1-9](\.[0-9]{1,6})?[eE][+-]?[0-9]{1,2}`,
		`-?[1-9](\.[0-9]{1,6})?e-?[12]?[0-9]{1,2}`,
		`-?1\.[0-7]e308`,
		`[1-9]e-3[012][0-2]`,
		`0|-0|0\.000|-0e5|[1-9]e-?[0-9]{1,2}`,
	}).Draw(t, "style")
	return rapid.SliceOfN(rapid.StringMatching(style), 1, 12).Draw(t, "readings")
}

func checkOffsets(t *rapid.T, r *Response, readings []string) {
	first := readings[0]
	least, most := math.Inf(1), math.Inf(-1)
	for _, x := range readings {
		f, err := strconv.ParseFloat(x, 64)
		if err != nil {
			t.Fatal(err)
		}
		least, most = min(least, f), max(most, f)
	}
	plain := r.Shift == 0
	if f, _ := strconv.ParseFloat(first, 64); !plain && r.Shift != f {
		t.Fatalf("%q: shift %v", readings, r.Shift)
	}
	if plain {
		first = "0"
	}
	if exact, ok := new(big.Rat).SetString(r.exact); !ok || exact.Cmp(rat(first)) != 0 {
		t.Fatalf("%q: exact shift %q", readings, r.exact)
	}
	for row, x := range readings {
		want := exactOffset(x, first)
		if got := r.Offsets[row]; got != want || math.Signbit(got) && got == 0 {
			t.Fatalf("%q: offset %d is %v, want %v", readings, row, got, want)
		}
		// Plain readings are within the promise too: 2^-53 of the range, and a part in 2^62. Half the smallest double is
		// what rounding near 0 may cost besides.
		if bound := (most/2 - least/2) * 0x1p-52 * (1 + 0x1p-50); plain && len(readings) > 1 && math.Abs(x64(readings[0])) > 0 {
			wrong := new(big.Rat).Sub(rat(x), new(big.Rat).SetFloat64(want))
			if e, _ := wrong.Abs(wrong).Float64(); e > bound+0x1p-1074 {
				t.Fatalf("%q: plain offset %d errs by %v, more than %v", readings, row, e, bound)
			}
		}
	}
}

func x64(text string) float64 { f, _ := strconv.ParseFloat(text, 64); return f }

func rat(text string) *big.Rat { r, _ := new(big.Rat).SetString(text); return r }

// Digits common to all readings cost nothing (NIST StRD, analysis of variance: data such as 1000000000000.4).
func TestLargeOffsetsKeepTheirDigits(t *testing.T) {
	columns, _, err := ScanJSON([]byte(`{"reader": [1, 2, 1, 2], "density": [1000000000000.4, 1000000000000.3, 1000000000000.5, 1000000000000.2]}`), twoColumns())
	if err != nil {
		t.Fatal(err)
	}
	if got, want := columns.Responses[0].Offsets, []float64{0, -0.1, 0.1, -0.2}; !slices.Equal(got, want) {
		t.Errorf("got %v, want %v", got, want)
	}
}

// content is a data set in no format yet.
type content struct {
	names  []string
	labels [][]string // by factor, then row
	values [][]string // by response, then row
}

func drawContent(t *rapid.T) content {
	rows := rapid.IntRange(1, 30).Draw(t, "rows")
	c := content{}
	label := rapid.OneOf(rapid.StringMatching(`[a-z]{1,3}`), rapid.StringMatching(`[0-9a-f]{6,18}`), rapid.StringN(1, 6, -1), rapid.SampledFrom([]string{"\"", ",", "a\nb", "\r\n", " a ", "\\", "é", "\u2028", "1.0", "<", "\x00", "a\x00"}))
	for f := range rapid.IntRange(1, 3).Draw(t, "factors") {
		c.names = append(c.names, fmt.Sprintf("f%d", f))
		c.labels = append(c.labels, rapid.SliceOfN(label, rows, rows).Draw(t, "labels"))
	}
	for r := range rapid.IntRange(1, 2).Draw(t, "responses") {
		c.names = append(c.names, fmt.Sprintf("y%d", r))
		value := rapid.StringMatching(rapid.SampledFrom([]string{`-?[0-9]\.[0-9]{1,3}`, `-?(0|[1-9][0-9]{1,19})(\.[0-9]{1,18})?`, `[1-9]e-?[0-9]{1,2}`}).Draw(t, "style"))
		c.values = append(c.values, rapid.SliceOfN(value, rows, rows).Draw(t, "values"))
	}
	return c
}

func (c *content) plan() Plan {
	n := len(c.labels)
	return Plan{Factors: c.names[:n], Responses: c.names[n:]}
}

func (c *content) json(blank string) []byte {
	var text strings.Builder
	text.WriteString("{" + blank)
	for i, name := range c.names {
		if i > 0 {
			text.WriteString("," + blank)
		}
		fmt.Fprintf(&text, "%q:%s[%s", name, blank, blank)
		for row := range c.labels[0] {
			if row > 0 {
				text.WriteString("," + blank)
			}
			if i < len(c.labels) {
				quoted, _ := json.Marshal(c.labels[i][row])
				text.Write(quoted)
			} else {
				text.WriteString(c.values[i-len(c.labels)][row])
			}
		}
		text.WriteString(blank + "]")
	}
	return []byte(text.String() + blank + "}" + blank)
}

func (c *content) csv(quote bool, end string) []byte {
	cell := func(text string) string {
		if quote || strings.ContainsAny(text, "\",\r\n") {
			return `"` + strings.ReplaceAll(text, `"`, `""`) + `"`
		}
		return text
	}
	var text strings.Builder
	text.WriteString("\uFEFF" + strings.Join(c.names, ",") + end)
	for row := range c.labels[0] {
		cells := make([]string, 0, len(c.names))
		for _, column := range append(slices.Clone(c.labels), c.values...) {
			cells = append(cells, cell(column[row]))
		}
		text.WriteString(strings.Join(cells, ",") + end)
	}
	return []byte(text.String())
}

// The same content reads the same as JSON however it is spaced, as CSV however it is quoted, and as CSV in a JSON string.
func TestJSONAndCSVAgree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := drawContent(t)
		want, faults, err := ScanJSON(c.json(""), c.plan())
		if faults != nil || err != nil {
			t.Fatal(faults, err)
		}
		for f, column := range want.Factors {
			for row, label := range c.labels[f] {
				if got := column.Labels[column.Codes.At(row)]; got != label {
					t.Fatalf("row %d: label %q, want %q", row, got, label)
				}
			}
		}
		digest := Fingerprint(want)
		check := func(got *Columns, faults []engine.Fault, err error) {
			if faults != nil || err != nil {
				t.Fatal(faults, err)
			}
			if p := Fingerprint(got); p != digest {
				t.Fatalf("fingerprint %s, want %s", p, digest)
			}
			got.place, got.pointers = want.place, want.pointers
			if !reflect.DeepEqual(got, want) {
				t.Fatalf("got %+v, want %+v", got, want)
			}
		}
		check(ScanJSON(c.json(rapid.SampledFrom([]string{" ", "\n\t", "  "}).Draw(t, "blank")), c.plan()))
		table := c.csv(rapid.Bool().Draw(t, "quoted"), rapid.SampledFrom([]string{"\n", "\r\n", "\n\n"}).Draw(t, "line end"))
		got, faults := ScanCSV(table, c.plan())
		check(got, faults, nil)
		quoted, _ := json.Marshal(string(table))
		check(ScanCSVString(quoted, c.plan()))
	})
}

// Another order of the rows, or other labels, changes the grid by just that.
func TestRowsAndLabelsPermute(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := drawContent(t)
		one, _, _ := ScanJSON(c.json(""), c.plan())
		order := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "order"), 0)).Perm(len(c.labels[0]))
		moved := content{names: c.names}
		for _, column := range c.labels {
			moved.labels = append(moved.labels, nil)
			for _, row := range order {
				moved.labels[len(moved.labels)-1] = append(moved.labels[len(moved.labels)-1], "new "+column[row])
			}
		}
		for _, column := range c.values {
			moved.values = append(moved.values, nil)
			for _, row := range order {
				moved.values[len(moved.values)-1] = append(moved.values[len(moved.values)-1], column[row])
			}
		}
		two, _, _ := ScanJSON(moved.json(""), moved.plan())
		for f := range one.Factors {
			for to, from := range order {
				a, b := &one.Factors[f], &two.Factors[f]
				if "new "+a.Labels[a.Codes.At(from)] != b.Labels[b.Codes.At(to)] {
					t.Fatalf("factor %d: row %d did not become row %d", f, from, to)
				}
			}
		}
		for r := range one.Responses {
			for to, from := range order {
				if got, want := two.Responses[r].Offsets[to], exactOffset(c.values[r][from], moved.values[r][0]); two.Responses[r].Shift != 0 && got != want {
					t.Fatalf("response %d, row %d: %v, want %v", r, to, got, want)
				}
			}
		}
		if Fingerprint(one) == Fingerprint(two) {
			t.Fatal("other labels, the same fingerprint")
		}
	})
}

// The room for rows is only estimated: brackets in labels make it too small, commas too large, and neither matters.
func TestEstimatesDoNotMatter(t *testing.T) {
	for _, label := range []string{"]", ",", "],[", "a,b,c,d,e,f,g,h"} {
		c := content{names: []string{"f", "y"}, labels: make([][]string, 1), values: make([][]string, 1)}
		for row := range 5000 {
			c.labels[0] = append(c.labels[0], label+strconv.Itoa(row%700))
			c.values[0] = append(c.values[0], strconv.Itoa(row))
		}
		one, faults, err := ScanJSON(c.json(""), c.plan())
		if err != nil || faults != nil {
			t.Fatal(err, faults)
		}
		two, faults := ScanCSV(c.csv(false, "\n"), c.plan())
		if faults != nil {
			t.Fatal(faults)
		}
		if one.Rows != 5000 || one.Factors[0].Codes.Len() != 5000 || Fingerprint(one) != Fingerprint(two) {
			t.Errorf("%q: %d rows", label, one.Rows)
		}
		for row, r := range one.Responses[0].Offsets {
			if r != float64(row) {
				t.Fatalf("%q: row %d is %v", label, row, r)
			}
		}
	}
}

// A quotient that misses the middle between two doubles by less than 64 bits can tell is rounded by what is left over.
func TestDivisionNearTies(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		middle := rapid.Uint64Range(1<<52, 1<<53-1).Draw(t, "double")<<1 | 1
		by := powers[rapid.IntRange(0, mantissaDigits).Draw(t, "decimals")]
		hi, lo := bits.Mul64(middle, by)
		n := new(big.Int).Add(new(big.Int).Lsh(new(big.Int).SetUint64(hi), 64), new(big.Int).SetUint64(lo))
		n.Add(n, big.NewInt(rapid.Int64Range(-2, 2).Draw(t, "aside")))
		want, _ := new(big.Rat).SetFrac(n, new(big.Int).SetUint64(by)).Float64()
		low := new(big.Int).And(n, new(big.Int).SetUint64(math.MaxUint64)).Uint64()
		if got := divide128(new(big.Int).Rsh(n, 64).Uint64(), low, by); got != want {
			t.Fatalf("%v / %d: %v, want %v", n, by, got, want)
		}
	})
}

// Readings too far apart to share a shift are kept plain, whichever comes first, and what is wrong is told once.
func TestFarApart(t *testing.T) {
	for _, readings := range []string{"1e-300, 1e300, 7", "1e300, 1e-300, 7", "5, 5, 1.5e308, -1.5e308", "1.5e308, -1.5e308", "1, 123456789012345678901234567890.5"} {
		n := strings.Count(readings, ",")
		columns, faults, err := ScanJSON([]byte(`{"density": [`+readings+`], "reader": [`+strings.Repeat("1,", n)+`1]}`), twoColumns())
		if faults != nil || err != nil {
			t.Fatal(faults, err)
		}
		for row, text := range strings.Split(readings, ", ") {
			if r := columns.Responses[0]; r.exact != "0" || r.Shift != 0 || r.Offsets[row] != x64(text) {
				t.Errorf("%s: got %+v", readings, r)
			}
		}
	}
	faults := faultsOf(t, `{"density": [1e-300, null, "x", 1e999, 1e300, null], "reader": [1, 1, 1, 1, 1, 1]}`, twoColumns())
	places := make([]string, 0, len(faults))
	for _, f := range faults {
		places = append(places, f.Place)
	}
	if want := []string{"data/density/1", "data/density/5", "data/density/2", "data/density/3"}; !slices.Equal(places, want) {
		t.Errorf("faults at %v, want %v", places, want)
	}
}
