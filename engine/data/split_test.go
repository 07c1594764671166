package data

import (
	"encoding/json"
	"errors"
	"fmt"
	"reflect"
	"strings"
	"testing"
	"unicode/utf8"

	"pgregory.net/rapid"
)

func TestSplit(t *testing.T) {
	cases := []struct{ body, envelope, data, csv string }{
		{`{"design": {"a": [1]}, "data": {"x": [1, 2]}, "id": 7}`, `{"design": {"a": [1]},  "id": 7}`, `{"x": [1, 2]}`, ""},
		{`{"design": {"a": [1]}, "data": {"x": [1, 2]}}`, `{"design": {"a": [1]}}`, `{"x": [1, 2]}`, ""},
		{`{"data": {"x": ["]", "}"]}, "design": 1}`, `{ "design": 1}`, `{"x": ["]", "}"]}`, ""},
		{` { "data" : {} } `, ` { } `, `{}`, ""},
		{`{"data": {"x": [["a"], "\"]"]}, "csv": "a,b\n"}`, `{}`, `{"x": [["a"], "\"]"]}`, `"a,b\n"`},
		{`{"a": 1, "csv": "", "data": {}}`, `{"a": 1}`, `{}`, `""`},
		{`{"csv": "", "a": 1, "data": [1]}`, `{ "a": 1}`, `[1]`, `""`},
		{`{"a": {"data": {"x": 1}}}`, `{"a": {"data": {"x": 1}}}`, "", ""},
		{`{"d\u0061ta": {"x": [1]}, "a": 1}`, `{ "a": 1}`, `{"x": [1]}`, ""},
		{`{}`, `{}`, "", ""},
	}
	for _, c := range cases {
		parts, err := Split([]byte(c.body), "data", "csv")
		if err != nil {
			t.Errorf("%s: %v", c.body, err)
			continue
		}
		if string(parts.Envelope) != c.envelope || string(parts.Bulk[0].Text) != c.data || string(parts.Bulk[1].Text) != c.csv || parts.Duplicates != nil {
			t.Errorf("%s: got %q, %q, %q, %v", c.body, parts.Envelope, parts.Bulk[0].Text, parts.Bulk[1].Text, parts.Duplicates)
		}
		for _, bulk := range parts.Bulk {
			if !strings.HasPrefix(c.body[bulk.Offset:], string(bulk.Text)) {
				t.Errorf("%s: %q is not at %d", c.body, bulk.Text, bulk.Offset)
			}
		}
		for i, b := range parts.Envelope {
			if at := parts.BodyOffset(i); c.body[at] != b {
				t.Errorf("%s: byte %d of the envelope is not byte %d of the body", c.body, i, at)
			}
		}
	}
}

// Arrays are skipped a block at a time: where a block ends must not matter.
func TestSplitLongArrays(t *testing.T) {
	for _, label := range []string{`"a"`, `"]"`, `"[,\"]"`, `[1]`, `"a", "]"`} {
		for n := skipBlock - 12; n < skipBlock+4; n++ {
			array := `[` + strings.Repeat(" ", n) + label + `,"b` + strings.Repeat("c", skipBlock) + `"]`
			body := `{"data": {"x": ` + array + `, "y": ` + array + `}, "a": 1}`
			parts, err := Split([]byte(body), "data")
			if err != nil || string(parts.Envelope) != `{ "a": 1}` {
				t.Fatalf("%s after %d blanks: %v, %v", label, n, parts, err)
			}
		}
	}
}

func TestSplitReportsDuplicates(t *testing.T) {
	parts, err := Split([]byte(`{"a": 1, "data": {"x": [1]}, "\u0061": 2, "data": {}, "a": 3}`), "data")
	want := []Member{{"a", 29}, {"data", 42}, {"a", 54}}
	if err != nil || !reflect.DeepEqual(parts.Duplicates, want) || string(parts.Bulk[0].Text) != `{"x": [1]}` {
		t.Errorf("got %+v, %v", parts, err)
	}
}

func TestSplitRefuses(t *testing.T) {
	cases := []struct {
		body   string
		offset int
	}{
		{``, 0},
		{`  `, 2},
		{`[]`, 0},
		{`"a"`, 0},
		{`{`, 1},
		{`{"a"`, 4},
		{`{"a":`, 5},
		{`{"a": 1`, 7},
		{`{"a": 1,}`, 8},
		{`{"a": 1} x`, 9},
		{`{"a": 1}{}`, 8},
		{`{"a": 01}`, 6},
		{`{a: 1}`, 1},
		{`{"a": "x`, 6},
		{`{"a": tru}`, 6},
		{"{\"a\": \"\xc3\x28\"}", 7},
		{"{\"\xff\": 1}", 2},
		{`{"a": "\udc00"}`, 7},
		{`{"a": "\ud800\u0041"}`, 7},
		{`{"a": [1}`, 8},
		{`{"data": {"x": [1`, 17},
		{`{"data": {"x": [1]`, 18},
		{`{"data": {"x": [1]}`, 19},
		{`{"data": {"x" [1]}}`, 14},
		{`{"data": {"x": "a}}`, 15},
		{`{"a": ` + strings.Repeat("[", 1<<20), 6 + MaxDepth},
		{`{"data": ` + strings.Repeat(`{"x":`, 1<<20), 9 + 5 + 5*MaxDepth},
		{`{"a": ` + strings.Repeat(`[{"x":`, 1<<20), 6 + 6*MaxDepth/2},
	}
	for _, c := range cases {
		parts, err := Split([]byte(c.body), "data", "csv")
		var syntax *SyntaxError
		if parts != nil || !errors.As(err, &syntax) || syntax.Offset != c.offset || syntax.Message == "" {
			t.Errorf("%.60q: got %v, %v, want byte %d", c.body, parts, err, c.offset)
		}
	}
}

// drawJSON draws any JSON value as text.
func drawJSON(t *rapid.T, depth int) string {
	kinds := 5
	if depth > 3 {
		kinds = 3
	}
	blank := rapid.SampledFrom([]string{"", " ", "\n"}).Draw(t, "blank")
	switch rapid.IntRange(0, kinds).Draw(t, "kind") {
	case 0:
		return rapid.SampledFrom([]string{"null", "true", "false"}).Draw(t, "word")
	case 1:
		return rapid.StringMatching(`-?(0|[1-9][0-9]{0,3})(\.[0-9]{1,3})?([eE][+-]?[0-9])?`).Draw(t, "number")
	case 2, 3:
		quoted, _ := json.Marshal(rapid.String().Draw(t, "text"))
		return string(quoted)
	case 4:
		items := make([]string, rapid.IntRange(0, 4).Draw(t, "n"))
		for i := range items {
			items[i] = drawJSON(t, depth+1)
		}
		return "[" + blank + strings.Join(items, blank+","+blank) + blank + "]"
	}
	return drawObject(t, depth, rapid.SliceOfNDistinct(rapid.StringN(0, 5, -1), 0, 4, rapid.ID).Draw(t, "names"))
}

func drawObject(t *rapid.T, depth int, names []string) string {
	blank := rapid.SampledFrom([]string{"", " ", "\n"}).Draw(t, "blank")
	members := make([]string, len(names))
	for i, name := range names {
		quoted, _ := json.Marshal(name)
		members[i] = string(quoted) + blank + ":" + blank + drawJSON(t, depth+1)
	}
	return "{" + blank + strings.Join(members, blank+","+blank) + blank + "}"
}

// What Split leaves and what it takes out are together what encoding/json reads.
func TestSplitLosesNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		names := rapid.Permutation([]string{"data", "csv", "design", "", "é\"", "id"}).Draw(t, "names")
		body := drawObject(t, 0, names[:rapid.IntRange(0, len(names)).Draw(t, "n")])
		parts, err := Split([]byte(body), "data", "csv")
		if err != nil {
			t.Fatalf("%s: %v", body, err)
		}
		var whole, envelope map[string]json.RawMessage
		if err := json.Unmarshal([]byte(body), &whole); err != nil {
			t.Fatal(err)
		}
		if err := json.Unmarshal(parts.Envelope, &envelope); err != nil {
			t.Fatalf("%s: envelope %s: %v", body, parts.Envelope, err)
		}
		for i, name := range []string{"data", "csv"} {
			if string(parts.Bulk[i].Text) != string(whole[name]) {
				t.Fatalf("%s: %s is %s", body, name, parts.Bulk[i].Text)
			}
			delete(whole, name)
		}
		if !reflect.DeepEqual(whole, envelope) {
			t.Fatalf("%s: envelope %s", body, parts.Envelope)
		}
	})
}

// valid is Valid by the standard library, with the stricter rules added by hand.
func valid(text []byte) bool {
	if !json.Valid(text) || !utf8.Valid(text) {
		return false
	}
	depth, inside := 0, false
	for i := 0; i < len(text); i++ {
		switch c := text[i]; {
		case inside && c == '\\':
			i++
		case c == '"':
			inside = !inside
		case !inside && (c == '[' || c == '{'):
			if depth++; depth > MaxDepth {
				return false
			}
		case !inside && (c == ']' || c == '}'):
			depth--
		}
	}
	return !loneSurrogate(text)
}

// loneSurrogate reports whether a valid JSON text has half of a surrogate pair: decoding makes it U+FFFD, which encoding
// the text's other characters does not.
func loneSurrogate(text []byte) bool {
	escaped := strings.Count(strings.ToLower(string(text)), `\ufffd`) + strings.Count(string(text), "\uFFFD")
	count := 0
	var walk func(v any)
	walk = func(v any) {
		switch v := v.(type) {
		case string:
			count += strings.Count(v, "\uFFFD")
		case []any:
			for _, x := range v {
				walk(x)
			}
		}
	}
	// Every string of the text, member names too, by reading the text as a stream.
	d := json.NewDecoder(strings.NewReader(string(text)))
	d.UseNumber()
	for {
		token, err := d.Token()
		if err != nil {
			break
		}
		walk(token)
	}
	return count != escaped-strings.Count(strings.ToLower(string(text)), `\\ufffd`)
}

func FuzzSplit(f *testing.F) {
	for _, body := range []string{`{"design": {"a": [1]}, "data": {"x": ["a]", 2], "y": [1.5e3]}, "id": "\u00e9"}`, `{"csv": "a,b\n1,2"}`, `{"data": {"x": [[]]}, "data": 1}`, `{"a": "\ud83d\ude00"} `, `{"data": {"x": ["]}`, `{"":{}}`} {
		f.Add([]byte(body))
	}
	f.Fuzz(func(t *testing.T, body []byte) {
		parts, err := Split(body, "data", "csv")
		ok := valid(body)
		if err != nil {
			if ok && strings.HasPrefix(strings.TrimLeft(string(body), " \t\r\n"), "{") {
				t.Fatalf("refused: %v", err)
			}
			return
		}
		// Split ok and the bulk ok is the whole ok, and the other way round.
		inner := Valid(parts.Envelope) == nil
		for _, bulk := range parts.Bulk {
			inner = inner && (bulk.Text == nil || Valid(bulk.Text) == nil)
		}
		if len(parts.Duplicates) == 0 && inner != ok {
			t.Fatalf("parts valid: %v, whole valid: %v", inner, ok)
		}
	})
}

func TestValid(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		text := []byte(drawJSON(t, 0))
		if err := Valid(text); err != nil {
			t.Fatalf("%s: %v", text, err)
		}
		if n := rapid.IntRange(0, len(text)-1).Draw(t, "at"); rapid.Bool().Draw(t, "cut") {
			text = text[:n]
		} else {
			text[n] = rapid.SampledFrom([]byte("\"\\[]{},:0e.-\x00\x80 ")).Draw(t, "byte")
		}
		if got, want := Valid(text) == nil, valid(text); got != want {
			t.Fatalf("%q: %v, want %v", text, got, want)
		}
	})
}

func TestUnescape(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := rapid.String().Draw(t, "text")
		raw, _ := json.Marshal(want)
		if rapid.Bool().Draw(t, "all escaped") {
			raw = []byte{'"'}
			for _, r := range want {
				if r >= 0x10000 {
					raw = fmt.Appendf(raw, `\u%04X\u%04x`, 0xD800+(r-0x10000)>>10, 0xDC00+(r-0x10000)&0x3FF)
				} else {
					raw = fmt.Appendf(raw, `\u%04x`, r)
				}
			}
			raw = append(raw, '"')
		}
		text := raw[1 : len(raw)-1]
		if got := unescape(text[:0], text); string(got) != want {
			t.Fatalf("got %q, want %q", got, want)
		}
	})
}
