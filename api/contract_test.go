package api_test

import (
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"os"
	"reflect"
	"slices"
	"strings"
	"testing"

	"guardrow/api"

	"github.com/getkin/kin-openapi/openapi3"
	"go.yaml.in/yaml/v4"
)

var update = flag.Bool("update", false, "write the list of codes into the contract")

// load loads the contract, and holds it to OpenAPI 3.0.3 as kin-openapi has it.
func load(t *testing.T) *openapi3.T {
	t.Helper()
	loader := openapi3.NewLoader()
	doc, err := loader.LoadFromData(api.OpenAPI)
	if err != nil {
		t.Fatal(err)
	}
	// Examples of forms and of problems are held to the contract by running them, in package service.
	if err := doc.Validate(context.Background(), openapi3.EnableExamplesValidation()); err != nil {
		t.Fatal(err)
	}
	return doc
}

func TestContractIsValid(t *testing.T) { load(t) }

// wire maps the contract's schemas to the Go types that read and write them. Every schema is here or in notStructs.
var wire = map[string]any{
	"TermsRequest": api.TermsRequest{}, "ExpectedMeanSquaresRequest": api.ExpectedMeanSquaresRequest{}, "TestsRequest": api.TestsRequest{},
	"AnovaRequest": api.AnovaRequest{}, "AnovaForm": api.AnovaRequest{}, "Design": api.Design{}, "Factor": api.Factor{}, "ComponentVariance": api.ComponentVariance{},
	"Envelope": api.Envelope{}, "Term": api.Term{}, "DeclaredFactor": api.DeclaredFactor{}, "AboveOrder": api.AboveOrder{}, "Share": api.Share{}, "Weight": api.Weight{},
	"TermsAnswer": api.TermsAnswer{}, "TermLine": api.TermLine{}, "Impossible": api.Impossible{},
	"ExpectedMeanSquaresAnswer": api.ExpectedMeanSquaresAnswer{}, "ExpectedMeanSquare": api.ExpectedMeanSquare{}, "Component": api.Component{},
	"TestsAnswer": api.TestsAnswer{}, "Test": api.Test{}, "Remedy": api.Remedy{}, "Change": api.Change{}, "RemedyEffect": api.RemedyEffect{},
	"AnovaAnswer": api.AnovaAnswer{}, "Analysis": api.Analysis{}, "Row": api.Row{}, "Total": api.Total{}, "ComponentEstimate": api.ComponentEstimate{}, "Finding": api.Finding{},
	"Problem": api.Problem{}, "ProblemError": api.ProblemError{}, "ProblemCatalogue": api.ProblemCatalogue{}, "ProblemType": api.ProblemType{}, "ProblemRule": api.ProblemRule{},
	"Health": api.Health{},
}

// notStructs are schemas that no struct stands for: texts, numbers, lists, unions, and the bulk columns, which never become
// a Go value of their shape. The value says which type or field reads them.
var notStructs = map[string]string{
	"ID": "json.RawMessage", "Only": "[]TermRef", "ApproximateForm": "string", "Responses": "[]string", "Missing": "[]string", "Confidence": "*float64",
	"DataFingerprint": "bool", "Levels": "Levels", "Label": "Label", "TermRef": "TermRef", "TermParts": "TermRef", "Columns": "engine/data", "CSV": "engine/data",
	"Effect": "string", "Constraint": "string", "Status": "string", "Pooled": "Pooled", "Code": "Code",
}

// bulk are the properties that engine/data reads and no Go type has.
var bulk = map[string][]string{"AnovaRequest": {"data", "csv"}, "AnovaForm": {"data"}}

func TestEverySchemaHasAType(t *testing.T) {
	doc := load(t)
	for name := range doc.Components.Schemas {
		if _, isStruct := wire[name]; isStruct == (notStructs[name] != "") {
			t.Errorf("schema %s must be in exactly one of wire and notStructs", name)
		}
	}
	for name := range wire {
		if doc.Components.Schemas[name] == nil {
			t.Errorf("the contract has no schema %s", name)
		}
	}
	for name := range notStructs {
		if doc.Components.Schemas[name] == nil {
			t.Errorf("the contract has no schema %s", name)
		}
	}
}

// property is a field as Go has it, or a property as the contract has it.
type property struct {
	required bool
	nullable bool
	kind     string // the JSON type; empty where a type writes itself
}

// fieldsOf returns the JSON fields of a struct, those of embedded structs among them.
func fieldsOf(t *testing.T, typ reflect.Type) map[string]property {
	t.Helper()
	fields := make(map[string]property)
	for i := range typ.NumField() {
		f := typ.Field(i)
		tag, options, _ := strings.Cut(f.Tag.Get("json"), ",")
		if f.Anonymous && tag == "" {
			for name, p := range fieldsOf(t, f.Type) {
				fields[name] = p
			}
			continue
		}
		if tag == "" {
			t.Errorf("%s.%s has no name in JSON", typ, f.Name)
		}
		optional := slices.ContainsFunc(strings.Split(options, ","), func(o string) bool { return o == "omitempty" || o == "omitzero" })
		fields[tag] = property{!optional, f.Type == reflect.TypeFor[api.Number](), kindOf(f.Type)}
	}
	return fields
}

func kindOf(typ reflect.Type) string {
	if typ.Kind() == reflect.Pointer {
		typ = typ.Elem()
	}
	switch typ {
	case reflect.TypeFor[api.Number]():
		return "number"
	case reflect.TypeFor[json.RawMessage](), reflect.TypeFor[api.Levels](), reflect.TypeFor[api.TermRef](), reflect.TypeFor[api.Pooled]():
		return ""
	}
	switch typ.Kind() {
	case reflect.String:
		return "string"
	case reflect.Bool:
		return "boolean"
	case reflect.Int, reflect.Int64:
		return "integer"
	case reflect.Float64:
		return "number"
	case reflect.Slice:
		return "array"
	case reflect.Struct, reflect.Map:
		return "object"
	}
	return "unknown"
}

// propertiesOf returns a schema's properties, those of the schemas that it is made of among them.
func propertiesOf(s *openapi3.Schema) map[string]property {
	all := make(map[string]property)
	for _, part := range s.AllOf {
		for name, p := range propertiesOf(part.Value) {
			all[name] = p
		}
	}
	for name, p := range s.Properties {
		all[name] = property{slices.Contains(s.Required, name), p.Value.Nullable, jsonType(p.Value)}
	}
	return all
}

func jsonType(s *openapi3.Schema) string {
	switch {
	case len(s.OneOf) > 0:
		return ""
	case len(s.AllOf) > 0:
		return "object"
	}
	return (*s.Type)[0]
}

func TestGoTypesAndContractAgree(t *testing.T) {
	doc := load(t)
	for name, value := range wire {
		fields := fieldsOf(t, reflect.TypeOf(value))
		properties := propertiesOf(doc.Components.Schemas[name].Value)
		for _, p := range bulk[name] {
			if _, ok := properties[p]; !ok {
				t.Errorf("%s has no property %s", name, p)
			}
			delete(properties, p)
		}
		for field, want := range fields {
			if got, ok := properties[field]; !ok {
				t.Errorf("%s: the Go type has the field %s, the contract has not", name, field)
			} else if got != want {
				t.Errorf("%s.%s: the Go type says %+v, the contract %+v", name, field, want, got)
			}
		}
		for p := range properties {
			if _, ok := fields[p]; !ok {
				t.Errorf("%s: the contract has the property %s, the Go type has not", name, p)
			}
		}
	}
}

// TestSchemasKeepHouse holds the contract to its own conventions.
func TestSchemasKeepHouse(t *testing.T) {
	doc := load(t)
	var visit func(place string, ref *openapi3.SchemaRef, described bool)
	visit = func(place string, ref *openapi3.SchemaRef, described bool) {
		s := ref.Value
		if ref.Ref != "" {
			return // visited under its own name
		}
		if s.Type.Is("number") && s.Format != "double" {
			t.Errorf("%s: a number without format double", place)
		}
		if described && s.Description == "" {
			t.Errorf("%s has no description", place)
		}
		for name, p := range s.Properties {
			visit(place+"."+name, p, true)
		}
		for _, part := range slices.Concat(s.AllOf, s.OneOf) {
			visit(place, part, false)
		}
		if s.Items != nil {
			visit(place+"[]", s.Items, false)
		}
	}
	for name, ref := range doc.Components.Schemas {
		visit(name, ref, !strings.HasSuffix(name, "Answer") && !strings.HasSuffix(name, "Request"))
		s := ref.Value
		request := strings.HasSuffix(name, "Request") || strings.HasSuffix(name, "Form") && name != "ApproximateForm" || slices.Contains([]string{"Design", "Factor", "TermParts", "ComponentVariance"}, name)
		if closed := s.AdditionalProperties.Has != nil && !*s.AdditionalProperties.Has; closed != request {
			t.Errorf("%s: additionalProperties: false is %v, must be %v: requests are strict, answers may grow", name, closed, request)
		}
	}
}

// TestWords holds the enumerations of the contract to the constants.
func TestWords(t *testing.T) {
	doc := load(t)
	words := func(schema, property string) []string {
		s := doc.Components.Schemas[schema].Value
		if property != "" {
			var found *openapi3.Schema
			for _, part := range append([]*openapi3.SchemaRef{{Value: s}}, s.AllOf...) {
				if p := part.Value.Properties[property]; p != nil {
					found = p.Value
				}
			}
			if found == nil {
				t.Fatalf("%s has no property %s", schema, property)
			}
			s = found
		}
		var list []string
		for _, w := range s.Enum {
			list = append(list, w.(string))
		}
		return list
	}
	for _, c := range []struct {
		schema, property string
		want             []string
	}{
		{"Factor", "effect", []string{api.Fixed, api.Random}},
		{"Effect", "", []string{api.Fixed, api.Random}},
		{"Design", "constraint", []string{api.Unrestricted, api.Restricted}},
		{"Constraint", "", []string{api.Unrestricted, api.Restricted}},
		{"Status", "", []string{api.Exact, api.Approximate, api.None}},
		{"ApproximateForm", "", []string{api.SumForm, api.DifferenceForm}},
		{"Test", "larger_sets", []string{api.LargerSetsExist, api.LargerSetsNone, api.LargerSetsUnknown}},
		{"Remedy", "action", []string{api.Replicate, api.AssumeZero}},
		{"Finding", "severity", []string{api.Stop, api.Caution, api.Note}},
		{"Finding", "code", []string{api.NegativeComponent, api.LargeSubtraction, api.NoErrorVariation}},
		{"Health", "status", []string{api.Alive, api.Ready}},
	} {
		if got := words(c.schema, c.property); !slices.Equal(got, c.want) {
			t.Errorf("%s.%s: the contract says %q, the constants %q", c.schema, c.property, got, c.want)
		}
	}
}

// TestCodes holds the contract's list of codes to the catalogue, and the catalogue to itself.
func TestCodes(t *testing.T) {
	seen := make(map[api.Code]bool)
	var made bytes.Buffer
	statuses := make(map[int]bool)
	for _, kind := range api.ProblemTypes() {
		statuses[kind.Status] = true
		if len(kind.Codes) == 0 {
			t.Errorf("%s has no codes", kind.Type)
		}
	}
	for _, entry := range api.Catalogue() {
		if seen[entry.Code] {
			t.Errorf("%s stands twice in the catalogue", entry.Code)
		}
		seen[entry.Code] = true
		if !statuses[entry.Status] {
			t.Errorf("%s: no kind of problem has the status %d", entry.Code, entry.Status)
		}
		if !strings.HasSuffix(entry.Rule, ".") || entry.Example.Path == "" {
			t.Errorf("%s: the rule is no sentence, or there is no example", entry.Code)
		}
		made.WriteString("        - " + string(entry.Code) + "\n")
	}
	const begin, end = "        # made: codes\n", "        # end\n"
	text := string(api.OpenAPI)
	from := strings.Index(text, begin) + len(begin)
	to := from + strings.Index(text[from:], end)
	if text[from:to] == made.String() {
		return
	}
	if !*update {
		t.Fatalf("the contract's codes are not those of the catalogue; run go test ./api -run Codes -update.\ncontract:\n%scatalogue:\n%s", text[from:to], made.String())
	}
	if err := os.WriteFile("openapi.yaml", []byte(text[:from]+made.String()+text[to:]), 0o644); err != nil {
		t.Fatal(err)
	}
	t.Skip("written; run the test again")
}

// TestNothingUnbuilt holds the list of paths: nothing is described that is not served.
func TestNothingUnbuilt(t *testing.T) {
	var doc struct {
		Paths map[string]any `yaml:"paths"`
	}
	if err := yaml.Unmarshal(api.OpenAPI, &doc); err != nil {
		t.Fatal(err)
	}
	var got []string
	for path := range doc.Paths {
		got = append(got, path)
	}
	slices.Sort(got)
	want := []string{"/docs", "/docs/{asset}", "/healthz", "/readyz", "/v1/anova", "/v1/expected-mean-squares", "/v1/openapi.json", "/v1/openapi.yaml", "/v1/problems", "/v1/problems/{kind}", "/v1/terms", "/v1/tests"}
	if !slices.Equal(got, want) {
		t.Errorf("paths: %q", got)
	}
}
