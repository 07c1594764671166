package service

import (
	"bytes"
	"encoding/json"
	"net/http"
	"regexp"
	"strings"
	"testing"

	"guardrow/api"

	"go.yaml.in/yaml/v4"
)

func decodeInto(t testing.TB, text []byte, into any) {
	t.Helper()
	if err := json.Unmarshal(text, into); err != nil {
		t.Fatalf("%v: %s", err, text)
	}
}

func TestMediaTypes(t *testing.T) {
	s := start(t, nil)
	body := `{"design": ` + rackDesign("") + `}`
	for _, c := range []struct {
		path, media, accept, encoding string
		status                        int
	}{
		{"/v1/terms", "application/json", "", "", 200},
		{"/v1/terms", "Application/JSON; charset=UTF-8", "", "identity", 200},
		{"/v1/terms", "application/json; charset=latin1", "", "", 415},
		{"/v1/terms", "", "", "", 415},
		{"/v1/terms", "text/plain", "", "", 415},
		{"/v1/terms", "application/json, text/plain", "", "", 415},
		{"/v1/terms", "application/x-www-form-urlencoded", "", "", 415},
		{"/v1/terms", cutForm, "", "", 415},
		{"/v1/terms", "application/json", "", "gzip", 415},
		{"/v1/terms", "application/json", "", "br", 415},
		{"/v1/terms", "application/json", "*/*", "", 200},
		{"/v1/terms", "application/json", "text/html, application/*;q=0.1", "", 200},
		{"/v1/terms", "application/json", "APPLICATION/JSON ; Q=1", "", 200},
		{"/v1/terms", "application/json", "text/html, */*;q=0", "", 406},
		{"/v1/terms", "application/json", "application/json;q=0, */*", "", 406},
		{"/v1/terms", "application/json", "text/csv", "", 406},
		{"/v1/terms", "application/json", "application/problem+json", "", 406},
	} {
		header := []string{}
		for name, value := range map[string]string{"Content-Type": c.media, "Accept": c.accept, "Content-Encoding": c.encoding} {
			if value != "" {
				header = append(header, name, value)
			}
		}
		if answer := s.request(t, http.MethodPost, c.path, body, header...); answer.status != c.status {
			t.Errorf("%+v: %d %s", c, answer.status, answer.body)
		}
	}
}

func TestPathsAndMethods(t *testing.T) {
	s := start(t, nil)
	for _, c := range []struct {
		method, path string
		status       int
		allow        string
	}{
		{"GET", "/", 404, ""},
		{"POST", "/v1/terms/", 404, ""},
		{"POST", "/v1//terms", 404, ""},
		{"POST", "/V1/terms", 404, ""},
		{"GET", "/v1/problems/nothing", 404, ""},
		{"GET", "/v1/problems/a%2Fb", 404, ""},
		{"GET", "/docs/../healthz", 404, ""},
		{"GET", "/docs/swagger-ui.js", 404, ""},
		{"GET", "/docs/", 404, ""},
		{"GET", "/%00", 404, ""},
		{"GET", "/" + strings.Repeat("x", 5000), 404, ""},
		{"GET", "/v1/terms", 405, "OPTIONS, POST"},
		{"DELETE", "/v1/anova", 405, "OPTIONS, POST"},
		{"POST", "/healthz", 405, "OPTIONS, GET, HEAD"},
		{"PUT", "/docs", 405, "OPTIONS, GET, HEAD"},
		{"BREW", "/v1/tests", 405, "OPTIONS, POST"},
		{"OPTIONS", "/v1/tests", 204, "OPTIONS, POST"},
		{"OPTIONS", "/nothing", 404, ""},
		{"HEAD", "/healthz", 200, ""},
		{"HEAD", "/v1/openapi.yaml", 200, ""},
		{"HEAD", "/v1/problems/malformed", 200, ""},
		{"HEAD", "/v1/terms", 405, "OPTIONS, POST"},
	} {
		answer := s.request(t, c.method, c.path, "")
		if answer.status != c.status || answer.header.Get("Allow") != c.allow {
			t.Errorf("%s %.50s: %d, Allow %q", c.method, c.path, answer.status, answer.header.Get("Allow"))
		}
		if len(answer.body) > 2000 {
			t.Errorf("%s %.50s: the answer has %d bytes", c.method, c.path, len(answer.body))
		}
		if c.method == http.MethodHead && len(answer.body) > 0 {
			t.Errorf("HEAD %s has a body", c.path)
		}
	}
	if head, get := s.request(t, http.MethodHead, "/healthz", ""), s.get(t, "/healthz"); head.header.Get("Content-Length") != get.header.Get("Content-Length") {
		t.Error("HEAD announces another length than GET")
	}
}

func TestHeaders(t *testing.T) {
	s := start(t, nil)
	for _, answer := range []*reply{s.get(t, "/healthz"), s.post(t, "/v1/terms", "{"), s.get(t, "/nothing"), s.get(t, "/docs"), s.post(t, "/v1/terms", `{"design": `+rackDesign("")+`}`)} {
		for name, want := range map[string]string{"X-Content-Type-Options": "nosniff", "Referrer-Policy": "no-referrer", "Content-Security-Policy": "default-src 'none'"} {
			if got := answer.header.Get(name); !strings.HasPrefix(got, want) {
				t.Errorf("%s: %q", name, got)
			}
		}
	}
	if got := s.post(t, "/v1/terms", `{"design": `+rackDesign("")+`}`).header.Get("Cache-Control"); got != "no-store" {
		t.Errorf("an answer may be stored: %q", got)
	}
}

func TestRequestID(t *testing.T) {
	s := start(t, nil)
	for given, kept := range map[string]bool{"lims-2f6c91": true, "A:b_c.9": true, strings.Repeat("x", 128): true, strings.Repeat("x", 129): false, "a b": false, "é": false, "<script>": false, "": false} {
		got := s.request(t, http.MethodGet, "/healthz", "", requestIDHeader, given).header.Get(requestIDHeader)
		if (got == given) != kept || got == "" {
			t.Errorf("%q became %q", given, got)
		}
	}
}

// TestContractIsServed holds what is served to the file, and both forms to each other.
func TestContractIsServed(t *testing.T) {
	s := start(t, nil)
	asYAML := s.get(t, "/v1/openapi.yaml")
	if string(asYAML.body) != string(api.OpenAPI) {
		t.Error("the contract that is served is not the one that was written")
	}
	asJSON := s.get(t, "/v1/openapi.json")
	want, again, err := loadDocument(api.OpenAPI)
	if err != nil {
		t.Fatal(err)
	}
	// Both, as an independent reader has them (yaml.Unmarshal into Go values, and back).
	var plain any
	if err := yaml.Unmarshal(api.OpenAPI, &plain); err != nil {
		t.Fatal(err)
	}
	if toJSON(t, plain) != toJSON(t, want) {
		t.Error("the contract in JSON differs from the one in YAML")
	}
	var got document
	decodeInto(t, asJSON.body, &got)
	if toJSON(t, got) != toJSON(t, want) {
		t.Error("the contract that is served as JSON is another one than is held to")
	}
	if first, second := bytes.Index(asJSON.body, []byte(`"/v1/terms"`)), bytes.Index(asJSON.body, []byte(`"/v1/anova"`)); first < 0 || second < first {
		t.Error("the contract in JSON is not in the order in which it was written")
	}
	if string(again)+"\n" != string(asJSON.body) {
		t.Error("the contract in JSON is another one each time it is made")
	}
	if cached := s.request(t, http.MethodGet, "/v1/openapi.yaml", "", "If-None-Match", asYAML.header.Get("ETag")); cached.status != http.StatusNotModified {
		t.Errorf("a known contract is sent again: %d", cached.status)
	}
}

// TestProblemPages holds the type of every problem to a page, and every code to one of them.
func TestProblemPages(t *testing.T) {
	s := start(t, nil)
	var all api.ProblemCatalogue
	decodeInto(t, s.get(t, api.ProblemRoot).body, &all)
	codes := 0
	for _, kind := range all.Problems {
		var page api.ProblemType
		decodeInto(t, s.get(t, kind.Type).body, &page)
		if page.Title != kind.Title || len(page.Codes) != len(kind.Codes) {
			t.Errorf("%s: another page", kind.Type)
		}
		codes += len(page.Codes)
	}
	if codes != len(api.Catalogue()) {
		t.Errorf("%d codes on the pages, %d in the catalogue", codes, len(api.Catalogue()))
	}
}

// TestPage fetches the page and everything it refers to, and holds it to need nothing else.
func TestPage(t *testing.T) {
	s := start(t, nil)
	page := s.get(t, "/docs")
	files := regexp.MustCompile(`(?:src|href)="([^"]*)"`).FindAllStringSubmatch(string(page.body), -1)
	if len(files) < 4 {
		t.Fatalf("the page refers to %d files:\n%s", len(files), page.body)
	}
	seen := make(map[string]bool)
	for _, file := range files {
		if !strings.HasPrefix(file[1], docsPath+"/") {
			t.Errorf("the page refers to %s", file[1])
			continue
		}
		seen[strings.TrimPrefix(file[1], docsPath+"/")] = true
		if answer := s.get(t, file[1]); answer.status != http.StatusOK || len(answer.body) < 100 {
			t.Errorf("%s: %d, %d bytes", file[1], answer.status, len(answer.body))
		}
	}
	for name := range pageFiles {
		if !seen[name] {
			t.Errorf("the page does not need %s", name)
		}
	}
	policy := page.header.Get("Content-Security-Policy")
	if strings.Contains(policy, "http") || !strings.Contains(policy, "script-src 'self' 'sha256-") || strings.Count(string(page.body), "<script") != strings.Count(string(page.body), "src=\"/docs/swagger-ui-")+strings.Count(policy, "sha256-") {
		t.Errorf("the page's policy does not fit its scripts: %s", policy)
	}
	if !strings.Contains(string(page.body), "/v1/openapi.json") {
		t.Error("the page does not show the contract")
	}
}
