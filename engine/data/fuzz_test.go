package data

import (
	"encoding/csv"
	"encoding/json"
	"reflect"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"guardrow/engine"
)

// whole returns columns where nothing is wrong with them.
func whole(columns *Columns, faults []engine.Fault) *Columns {
	if len(faults) > 0 {
		return nil
	}
	return columns
}

// FuzzScanJSON: what is taken is valid JSON, what is valid JSON is no syntax error, and what is taken reads as
// encoding/json reads it.
func FuzzScanJSON(f *testing.F) {
	pad := strings.Repeat(" ", 32)
	for _, text := range []string{
		`{"reader": ["a", "b"], "density": [1, 2.5]}`, `{"reader": [1, 1.0, "1", "\u0031"], "density": [1e3, -0.0, 1000000000000.4, 12345678901234567890.1]}`,
		`{"density": [0.1234567890123456, 1e300, 1e-300], "reader": ["x", "y", "z"], "other": [[], {}, null, "é"]}`,
		`{"reader": [null, true, {}, ""], "density": [null, "NA", "x", 1e400]}`, `{"reader": ["a long label of more than 15"], "density": []}`,
	} {
		f.Add([]byte(text + pad))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		columns, faults, err := ScanJSON(text, twoColumns())
		slow, faultsToo, errToo := ScanJSON(text, withNumber())
		columns, slow = whole(columns, faults), whole(slow, faultsToo)
		if (err == nil) != (errToo == nil) || columns != nil && slow != nil && !reflect.DeepEqual(columns, slow) || slow != nil && columns == nil || faultsToo == nil && faults != nil {
			t.Fatalf("quick %v, %v, %v; slow %v, %v, %v", columns, faults, err, slow, faultsToo, errToo)
		}
		ok := valid(text) && strings.HasPrefix(strings.TrimLeft(string(text), " \t\r\n"), "{")
		if (err == nil) != ok {
			t.Fatalf("error %v, valid %v", err, ok)
		}
		if columns == nil {
			if err == nil && len(faults) == 0 {
				t.Fatal("neither columns nor faults")
			}
			return
		}
		var want struct {
			Reader  []any
			Density []json.Number
		}
		members := make(map[string]json.RawMessage)
		if err := json.Unmarshal(text, &members); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(members["reader"], &want.Reader); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(members["density"], &want.Density); err != nil {
			t.Fatal(err)
		}
		c, r := columns.Factors[0], columns.Responses[0]
		if columns.Rows != len(want.Reader) || c.Codes.Len() != columns.Rows || len(r.Offsets) != columns.Rows || len(want.Density) != columns.Rows {
			t.Fatalf("%d rows", columns.Rows)
		}
		for row, label := range want.Reader {
			if text, isText := label.(string); isText && c.Labels[c.Codes.At(row)] != text {
				t.Fatalf("row %d: %q, want %q", row, c.Labels[c.Codes.At(row)], text)
			}
			first := string(want.Density[0])
			if r.exact == "0" {
				first = "0"
			}
			if x := string(want.Density[row]); len(x) < 30 && len(first) < 30 && r.Offsets[row] != exactOffset(x, first) {
				t.Fatalf("row %d: offset %v of %s from %s", row, r.Offsets[row], x, first)
			}
		}
	})
}

// FuzzScanCSV: records and cells are those of encoding/csv, which turns CRLF inside cells into LF.
func FuzzScanCSV(f *testing.F) {
	for _, text := range []string{"reader,density\na,1\nb,2\n", "\uFEFFdensity,reader\r\n+1.50,\"a \"\"x\"\", b\"\r\n 2 ,c\r\n", "reader,x,density\na,\"\n\",1", "reader,density\n\n\"b\",.5\r", "reader,density\na,\n,1\nb,NA,3\n", "a;b\n1;2"} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		columns, faults := ScanCSV(text, twoColumns())
		if (columns != nil) != onlyReadings(faults) {
			t.Fatal("columns and faults, or neither")
		}
		slow, faultsToo := ScanCSV(text, withNumber())
		columns, slow = whole(columns, faults), whole(slow, faultsToo)
		if slow != nil && !reflect.DeepEqual(columns, slow) {
			t.Fatalf("quick %v, slow %v", columns, slow)
		}
		r := csv.NewReader(strings.NewReader(strings.TrimPrefix(string(text), "\uFEFF")))
		records, err := r.ReadAll()
		if columns == nil {
			// Texts that encoding/csv reads as well-formed tables of our two columns are refused only for their values.
			return
		}
		if err != nil {
			t.Fatalf("taken, but encoding/csv says %v", err)
		}
		at, of := slices.Index(records[0], "reader"), slices.Index(records[0], "density")
		if at < 0 || of < 0 || len(records)-1 != columns.Rows {
			t.Fatalf("%d rows, want %d", columns.Rows, len(records)-1)
		}
		c := columns.Factors[0]
		for row, record := range records[1:] {
			if got := strings.ReplaceAll(c.Labels[c.Codes.At(row)], "\r\n", "\n"); got != record[at] {
				t.Fatalf("row %d: label %q, want %q", row, got, record[at])
			}
			reading := strings.Trim(record[of], " \t")
			x, ok := parseDecimal([]byte(reading))
			if !ok {
				t.Fatalf("row %d: %q was taken as a reading", row, reading)
			}
			var s shifter
			if columns.Responses[0].exact == "0" {
				s.plain = true
			} else {
				first, _ := parseDecimal([]byte(strings.Trim(records[1][of], " \t")))
				s.start(first)
			}
			if want, _ := s.offset(x); columns.Responses[0].Offsets[row] != want {
				t.Fatalf("row %d: offset %v, want %v", row, columns.Responses[0].Offsets[row], want)
			}
		}
		// In a JSON string it is the same table.
		if utf8.Valid(text) {
			quoted, _ := json.Marshal(string(text))
			again, faults, err := ScanCSVString(quoted, twoColumns())
			if err != nil || faults != nil || !reflect.DeepEqual(again, columns) {
				t.Fatalf("in a JSON string: %v, %v, %v", again, faults, err)
			}
		}
	})
}
