package service

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"mime/multipart"
	"net/http"
	"net/textproto"
	"os"
	"regexp"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"guardrow/api"

	"github.com/go-json-experiment/json/jsontext"
	"go.yaml.in/yaml/v4"
)

// operationOfContract is an operation as far as its examples need it, straight from the YAML.
type operationOfContract struct {
	RequestBody struct {
		Content map[string]mediaOfContract `yaml:"content"`
	} `yaml:"requestBody"`
	Responses map[string]responseOfContract `yaml:"responses"`
}

type responseOfContract struct {
	Content map[string]mediaOfContract `yaml:"content"`
}

type mediaOfContract struct {
	Examples map[string]struct {
		Ref string `yaml:"$ref"`
	} `yaml:"examples"`
}

type documentOfContract struct {
	Paths      map[string]map[string]operationOfContract `yaml:"paths"`
	Components struct {
		Examples  map[string]struct{ Value any } `yaml:"examples"`
		Responses map[string]responseOfContract  `yaml:"responses"`
	} `yaml:"components"`
}

func examplesOfContract(t testing.TB) *documentOfContract {
	t.Helper()
	var doc documentOfContract
	if err := yaml.Unmarshal(api.OpenAPI, &doc); err != nil {
		t.Fatal(err)
	}
	return &doc
}

func refName(ref string) string { return strings.TrimPrefix(ref, "#/components/examples/") }

// TestExamples runs every example of the contract: each request is sent, and the answer must be, to the byte, the one that
// the contract shows, the white space and the version apart. With -update the answers are written into the contract.
func TestExamples(t *testing.T) {
	doc := examplesOfContract(t)
	s := start(t, nil)
	answers := make(map[string][]byte)
	for path, methods := range doc.Paths {
		for method, o := range methods {
			shown := make(map[string]string) // by the example's name
			for _, media := range o.Responses["200"].Content {
				for name, example := range media.Examples {
					shown[name] = refName(example.Ref)
				}
			}
			for name := range o.examples(t, doc) {
				if shown[name] == "" {
					t.Errorf("%s: the request %s has no answer", path, name)
				}
			}
			for name, answer := range shown {
				answers[answer] = runExample(t, s, doc, strings.ToUpper(method), path, name, o).body
			}
		}
	}
	for name, response := range doc.Components.Responses {
		for code, example := range response.Content[problemType].Examples {
			if refName(example.Ref) != "Problem_"+code {
				t.Errorf("%s: the example %s is another's", name, code)
			}
			answers[refName(example.Ref)] = runEntry(t, entryOf(t, api.Code(code))).body
		}
	}
	compareExamples(t, answers)
}

// examples returns the names of the operation's requests, and the media type of each.
func (o *operationOfContract) examples(t testing.TB, doc *documentOfContract) map[string]string {
	t.Helper()
	names := make(map[string]string)
	for media, content := range o.RequestBody.Content {
		for name, example := range content.Examples {
			if _, ok := doc.Components.Examples[refName(example.Ref)]; !ok {
				t.Errorf("there is no example %s", example.Ref)
			}
			names[name] = media
		}
	}
	return names
}

func runExample(t *testing.T, s *server, doc *documentOfContract, method, path, name string, o operationOfContract) *reply {
	t.Helper()
	var answer *reply
	if method == http.MethodGet {
		answer = s.get(t, strings.ReplaceAll(path, "{kind}", strings.ReplaceAll(name, "_", "-")))
	} else {
		media, ok := o.examples(t, doc)[name]
		if !ok {
			t.Fatalf("%s: the answer %s has no request", path, name)
		}
		value := doc.Components.Examples[refName(o.RequestBody.Content[media].Examples[name].Ref)].Value
		body, contentType := toJSON(t, value), jsonType
		if media == formType {
			body, contentType = toForm(t, value)
		}
		answer = s.request(t, method, path, body, "Content-Type", contentType)
	}
	if answer.status != http.StatusOK {
		t.Fatalf("%s: the example %s got %d %s", path, name, answer.status, answer.body)
	}
	return answer
}

func toJSON(t testing.TB, value any) string {
	t.Helper()
	text, err := json.Marshal(value)
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// toForm writes an object as a form: each field as JSON, data as it is.
func toForm(t testing.TB, value any) (body, contentType string) {
	t.Helper()
	var text bytes.Buffer
	form := multipart.NewWriter(&text)
	fields, ok := value.(map[string]any)
	if !ok {
		t.Fatal("a form is an object")
	}
	for name, field := range fields {
		media, content := jsonType, toJSON(t, field)
		if name == "data" {
			media, content = "text/csv", field.(string)
		}
		part, err := form.CreatePart(textproto.MIMEHeader{"Content-Disposition": {fmt.Sprintf("form-data; name=%q", name)}, "Content-Type": {media}})
		if err == nil {
			_, err = part.Write([]byte(content))
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := form.Close(); err != nil {
		t.Fatal(err)
	}
	return text.String(), form.FormDataContentType()
}

const (
	madeAnswers = "    # made: answers\n"
	endAnswers  = "    # end\n"
)

// compareExamples compares answers with those that the contract shows, or writes them into it.
func compareExamples(t *testing.T, answers map[string][]byte) {
	t.Helper()
	names := make([]string, 0, len(answers))
	for name := range answers {
		names = append(names, name)
	}
	slices.Sort(names)
	var made strings.Builder
	for _, name := range names {
		text := bytes.ReplaceAll(answers[name], []byte(`"engine":"`+testVersion+`"`), []byte(`"engine":"1"`))
		fmt.Fprintf(&made, "    %s:\n      value:\n        %s\n", name, layOut(t, text, 8))
	}
	contract := string(api.OpenAPI)
	from := strings.Index(contract, madeAnswers) + len(madeAnswers)
	to := from + strings.Index(contract[from:], endAnswers)
	if contract[from:to] == made.String() || runtime.GOARCH != "amd64" && !*update && sameButRounding(contract[from:to], made.String()) {
		return
	}
	if !*update {
		t.Fatalf("the answers in the contract are not what the service answers; look at what go test ./service -run Examples -update changes.\n%s", firstDifference(contract[from:to], made.String()))
	}
	if err := os.WriteFile("../api/openapi.yaml", []byte(contract[:from]+made.String()+contract[to:]), 0o644); err != nil {
		t.Fatal(err)
	}
	t.Skip("written; run the test again")
}

var numeral = regexp.MustCompile(`-?[0-9]+(\.[0-9]+)?(e[-+]?[0-9]+)?`)

// sameButRounding reports whether two texts differ in the white space and in the last digits of numbers only: the answers in
// the contract were computed on amd64, and other processors fuse multiplications with additions.
func sameButRounding(a, b string) bool {
	blank := func(text string) string { return strings.Join(strings.Fields(numeral.ReplaceAllString(text, "0")), "") }
	x, y := numeral.FindAllString(a, -1), numeral.FindAllString(b, -1)
	if blank(a) != blank(b) || len(x) != len(y) {
		return false
	}
	for i := range x {
		p, errP := strconv.ParseFloat(x[i], 64)
		q, errQ := strconv.ParseFloat(y[i], 64)
		// 1e-9: a million times the error of the sums and tails of so small a study (goals, rows 12 and 17).
		if errP != nil || errQ != nil || math.Abs(p-q) > 1e-9*math.Abs(p) {
			return false
		}
	}
	return true
}

func TestSameButRounding(t *testing.T) {
	for _, c := range []struct {
		a, b string
		same bool
	}{
		{`{"p": 0.0614214466037}`, `{"p":  0.06142144660371}`, true},
		{`{"p": 0.0614214466037}`, `{"p": 0.0614214567}`, false},
		{`{"p": 1, "q": 2}`, `{"p": 1}`, false},
		{`"p": 1e-9`, `"p": 1e-8`, false},
	} {
		if sameButRounding(c.a, c.b) != c.same {
			t.Errorf("%s and %s: same is %v", c.a, c.b, !c.same)
		}
	}
}

func firstDifference(a, b string) string {
	x, y := strings.Split(a, "\n"), strings.Split(b, "\n")
	for i := range min(len(x), len(y)) {
		if x[i] != y[i] {
			return "contract: " + x[i] + "\nservice:  " + y[i]
		}
	}
	return fmt.Sprintf("%d lines in the contract, %d of the service", len(x), len(y))
}

const exampleWidth = 140

// layOut writes JSON as a person would: what fits on a line stands on one. Nothing but white space is changed.
func layOut(t testing.TB, text []byte, indent int) string {
	t.Helper()
	line := jsontext.Value(slices.Clone(bytes.TrimSpace(text)))
	if err := line.Format(jsontext.PreserveRawStrings(true), jsontext.SpaceAfterColon(true), jsontext.SpaceAfterComma(true)); err != nil {
		t.Fatal(err)
	}
	if indent+utf8.RuneCount(line) <= exampleWidth || line[0] != '{' && line[0] != '[' {
		return string(line)
	}
	parts := members(t, line, indent+2)
	pad := strings.Repeat(" ", indent+2)
	return string(line[:1]) + "\n" + pad + strings.Join(parts, ",\n"+pad) + "\n" + strings.Repeat(" ", indent) + string(line[len(line)-1:])
}

// members lays out the members of an object, or the items of a list.
func members(t testing.TB, text []byte, indent int) []string {
	t.Helper()
	decoder := jsontext.NewDecoder(bytes.NewBuffer(text))
	_, err := decoder.ReadToken()
	var parts []string
	for ; err == nil && decoder.PeekKind() != '}' && decoder.PeekKind() != ']'; err = errors.Join(err) {
		name := ""
		var value jsontext.Value
		if text[0] == '{' {
			if value, err = decoder.ReadValue(); err != nil {
				break
			}
			name = string(value) + ": "
		}
		if value, err = decoder.ReadValue(); err != nil {
			break
		}
		parts = append(parts, name+layOut(t, value, indent))
	}
	if err != nil {
		t.Fatal(err)
	}
	return parts
}
