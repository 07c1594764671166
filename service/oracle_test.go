package service

import (
	"bytes"
	"encoding/json"
	"errors"
	"math/rand/v2"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"

	"guardrow/api"

	"github.com/santhosh-tekuri/jsonschema/v6"
	"pgregory.net/rapid"
)

// oracle compiles a schema of the contract with an independent validator of JSON Schema (santhosh-tekuri/jsonschema, draft 4,
// on which OpenAPI 3.0 rests). Without bounds, only the shape is left of it. Patterns are left out: the engine
// checks those, in words.
func oracle(t testing.TB, name string, bounds bool) *jsonschema.Schema {
	t.Helper()
	doc, _, err := loadDocument(api.OpenAPI)
	if err != nil {
		t.Fatal(err)
	}
	dropped := []string{"pattern"}
	if !bounds {
		dropped = append(dropped, "minLength", "maxLength", "minItems", "maxItems", "minimum", "maximum", "exclusiveMinimum", "exclusiveMaximum")
	}
	var strip func(value any)
	strip = func(value any) {
		switch value := value.(type) {
		case map[string]any:
			for _, word := range dropped {
				delete(value, word)
			}
			for _, v := range value {
				strip(v)
			}
		case []any:
			for _, v := range value {
				strip(v)
			}
		}
	}
	strip(map[string]any(doc))
	compiler := jsonschema.NewCompiler()
	compiler.DefaultDraft(jsonschema.Draft4)
	if err := compiler.AddResource("urn:contract", map[string]any(doc)); err != nil {
		t.Fatal(err)
	}
	schema, err := compiler.Compile("urn:contract#/components/schemas/" + name)
	if err != nil {
		t.Fatal(err)
	}
	return schema
}

// scrawler writes requests, mostly of a shape, with mistakes here and there.
type scrawler struct {
	random *rand.Rand
	text   bytes.Buffer
	wrong  float64 // how often a value is of another kind, or a field missing or unknown
}

func (s *scrawler) mistake() bool { return s.random.Float64() < s.wrong }

func (s *scrawler) value(shape *shape) {
	if s.mistake() {
		s.text.WriteString([]string{"null", "true", "1.5", "-7", `"x"`, "[]", "{}", `[[1]]`, `{"a": null}`, "1e300"}[s.random.IntN(10)])
		return
	}
	var possible []jsonKind
	for kind, r := range shape {
		if r != nil {
			possible = append(possible, jsonKind(kind))
		}
	}
	kind := possible[s.random.IntN(len(possible))]
	r := shape[kind]
	switch kind {
	case textKind:
		s.texts(r)
	case numberKind:
		s.text.WriteString([]string{"1", "2", "0", "-1", "2.0", "3e0", "0.5", "1.5", "9007199254740991", "9007199254740992", "-9007199254740992", "12e-1", "0.95", "-0.0"}[s.random.IntN(14)])
	case boolKind:
		s.text.WriteString(strconv.FormatBool(s.random.IntN(2) == 0))
	case listKind:
		s.text.WriteByte('[')
		for i := range []int{0, 1, 2, 3, 17}[s.random.IntN(5)] {
			if i > 0 {
				s.text.WriteByte(',')
			}
			s.value(r.items)
		}
		s.text.WriteByte(']')
	case objectKind:
		s.object(r)
	case nullKind, kinds:
		s.text.WriteString("null")
	}
}

func (s *scrawler) texts(r *rule) {
	if r.words != nil && !s.mistake() {
		s.text.WriteString(strconv.Quote(r.words[s.random.IntN(len(r.words))]))
		return
	}
	s.text.WriteString([]string{`"rack"`, `"box × tube"`, `""`, `"N"`, `"\u00e9"`, `"` + strings.Repeat("é", 200) + `"`, `"` + strings.Repeat("x", 201) + `"`, `"` + strings.Repeat(`\u00e9`, 201) + `"`, `"` + strings.Repeat("x", 1001) + `"`}[s.random.IntN(9)])
}

func (s *scrawler) object(r *rule) {
	s.text.WriteByte('{')
	first := true
	member := func(name string, shape *shape) {
		if !first {
			s.text.WriteByte(',')
		}
		first = false
		s.text.WriteString(strconv.Quote(name) + ":")
		s.value(shape)
	}
	for _, i := range s.random.Perm(len(r.fields)) {
		f := r.fields[i]
		// The readings are cut out of requests before.
		if slices.Contains(bulkNames, f.name) || s.mistake() || !f.required && s.random.IntN(3) == 0 {
			continue
		}
		member(f.name, f.shape)
	}
	if s.mistake() {
		member("unknown", &shape{numberKind: {most: -1}})
	}
	s.text.WriteByte('}')
}

// TestCheckAgreesWithAnOracle holds the check to an independent validator: what is not of the shape, and what is outside the
// bounds, on random requests with mistakes.
func TestCheckAgreesWithAnOracle(t *testing.T) {
	service := build(t, nil)
	verdicts := make(map[string]int)
	for _, o := range service.operations {
		formal, whole := oracle(t, o.schema, false), oracle(t, o.schema, true)
		rapid.Check(t, func(t *rapid.T) {
			s := &scrawler{random: rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 0)), wrong: rapid.SampledFrom([]float64{0, 0.02, 0.1}).Draw(t, "wrong")}
			s.object(o.shape[objectKind])
			text := s.text.Bytes()
			value, err := jsonschema.UnmarshalJSON(bytes.NewReader(text))
			if err != nil {
				t.Fatal(err)
			}
			c, err := check(text, o.shape, nil, nil)
			var refused *refusal
			if err != nil && !errors.As(err, &refused) {
				t.Fatal(err)
			}
			if want := formal.Validate(value); (want == nil) != (err == nil) {
				t.Fatalf("%s\nthe check: %v\nthe oracle: %v", text, err, want)
			}
			if err != nil {
				verdicts["malformed"]++
				for _, e := range refused.errors {
					holdPointer(t, value, e)
				}
				return
			}
			verdicts["formed"]++
			if len(c.limits) > 0 {
				verdicts["out of bounds"]++
			}
			if want := whole.Validate(value); (want == nil) != (len(c.limits) == 0) {
				t.Fatalf("%s\nthe check: %v\nthe oracle: %v", text, c.limits, want)
			}
		})
	}
	for _, verdict := range []string{"malformed", "formed", "out of bounds"} {
		if verdicts[verdict] < 20 {
			t.Errorf("%d requests were %s: the test shows little", verdicts[verdict], verdict)
		}
	}
}

// holdPointer holds a place to be in the request; that of a missing field to be missing from an object that is there.
func holdPointer(t *rapid.T, value any, e api.ProblemError) {
	parts := strings.Split(e.Pointer, "/")[1:]
	for i, part := range parts {
		switch v := value.(type) {
		case map[string]any:
			next, ok := v[part]
			if missing := e.Code == api.MissingField && i == len(parts)-1; ok == missing {
				t.Fatalf("%s at %s: the field is there: %v", e.Code, e.Pointer, ok)
			}
			value = next
		case []any:
			n, err := strconv.Atoi(part)
			if err != nil || n >= len(v) {
				t.Fatalf("%s at %s: no such item", e.Code, e.Pointer)
			}
			value = v[n]
		default:
			t.Fatalf("%s at %s: there is nothing", e.Code, e.Pointer)
		}
	}
}

// TestHostileEnvelopes holds the memory that the check takes for what is wrong to a bound, whatever is wrong.
func TestHostileEnvelopes(t *testing.T) {
	service := build(t, nil)
	o := service.operations[2]
	fill := func(before, unit, after string) []byte {
		return []byte(before + strings.Repeat(unit, (mebibyte-1000)/len(unit)) + after)
	}
	for name, body := range map[string][]byte{
		"wrong labels":    fill(`{"design":{"factors":[{"name":"a","effect":"fixed","levels":[`, "[],", `1]}]}}`),
		"wrong factors":   fill(`{"design":{"factors":[`, "{},", `1]}}`),
		"unknown fields":  fill(`{"design":{"factors":[{`, `"b":1,`, `"levels":1}]}}`),
		"deep values":     fill(`{"design":{"factors":[`, strings.Repeat("[", 100)+strings.Repeat("]", 100)+",", `1]}}`),
		"large numbers":   fill(`{"design":{"factors":[{"name":"a","effect":"fixed","levels":[`, "1e999,", `true]}]}}`),
		"a long number":   fill(`{"design":{"factors":[{"name":"a","effect":"fixed","levels":[`, "9", `,true]}]}}`),
		"a long exponent": fill(`{"design":{"factors":[{"name":"a","effect":"fixed","levels":[1e`, "9", `,true]}]}}`),
		"long fields":     fill(`{"design":{"factors":[{"`, "b", `":1,"levels":1}]}}`),
		"empty texts":     fill(`{"design":{"factors":[{"name":"a","effect":"fixed","levels":[`, `"",`, `true]}]}}`),
	} {
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		_, err := o.split(body, 2*mebibyte)
		runtime.ReadMemStats(&after)
		var refused *refusal
		if !errors.As(err, &refused) {
			t.Errorf("%s: %v", name, err)
			continue
		}
		text, err := json.Marshal(refused.problem("/v1/tests"))
		if err != nil {
			t.Fatal(err)
		}
		if len(text) > 100_000 {
			t.Errorf("%s: a problem of %d bytes", name, len(text))
		}
		// All that is allocated, most of it gone at once: a long name is copied a few times while it is looked at, and each
		// of 180,000 numbers that no double holds makes an error of strconv. The independent validator of the test above
		// takes 500 MB for the wrong labels.
		if used := after.TotalAlloc - before.TotalAlloc; used > 32*mebibyte {
			t.Errorf("%s: %d KiB for a body of 1 MiB", name, used>>10)
		}
	}
}
