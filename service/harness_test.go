package service

import (
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"strings"
	"sync"
	"testing"

	"guardrow/api"

	"github.com/getkin/kin-openapi/openapi3"
	"github.com/getkin/kin-openapi/openapi3filter"
	"github.com/getkin/kin-openapi/routers"
	"github.com/getkin/kin-openapi/routers/legacy"
	"go.uber.org/goleak"
	"go.uber.org/zap"
)

var update = flag.Bool("update", false, "write the answers among the contract's examples")

func TestMain(m *testing.M) {
	if address := os.Getenv(clientVariable); address != "" {
		if err := beClient(address); err != nil {
			fmt.Fprintln(os.Stderr, err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	flag.Parse()
	goleak.VerifyTestMain(m)
}

// testVersion is what the services of the tests call themselves.
const testVersion = "test"

// server is a service behind a real listener.
type server struct {
	*httptest.Server
	service *Service
}

// start starts a service; change may change its options.
func start(t testing.TB, change func(*Options)) *server {
	t.Helper()
	s := httptest.NewServer(nil)
	t.Cleanup(s.Close)
	service := build(t, change)
	s.Config.Handler = service
	return &server{s, service}
}

func build(t testing.TB, change func(*Options)) *Service {
	t.Helper()
	options := Options{Logger: zap.NewNop(), Version: testVersion}
	if change != nil {
		change(&options)
	}
	service, err := New(options)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(service.Stop)
	return service
}

// reply is an answer, read to its end.
type reply struct {
	status int
	header http.Header
	body   []byte
}

// problem returns the answer as a problem.
func (r *reply) problem(t testing.TB) *api.Problem {
	t.Helper()
	var p api.Problem
	if err := json.Unmarshal(r.body, &p); err != nil || r.header.Get("Content-Type") != problemType {
		t.Fatalf("no problem: %d %s", r.status, r.body)
	}
	return &p
}

// codes returns the codes of a problem, each once, with the first place of each.
func (r *reply) places(t testing.TB) map[api.Code]string {
	t.Helper()
	codes := make(map[api.Code]string)
	for _, e := range r.problem(t).Errors {
		if _, seen := codes[e.Code]; !seen {
			codes[e.Code] = e.Pointer
		}
	}
	return codes
}

// send sends a request, and holds the answer to the contract.
func (s *server) send(t testing.TB, r *http.Request) *reply {
	t.Helper()
	response, err := s.Client().Do(r)
	if err != nil {
		t.Fatal(err)
	}
	return read(t, r, response)
}

func read(t testing.TB, r *http.Request, response *http.Response) *reply {
	t.Helper()
	body, err := io.ReadAll(response.Body)
	if err != nil {
		t.Fatal(err)
	}
	if err := response.Body.Close(); err != nil {
		t.Fatal(err)
	}
	answer := &reply{response.StatusCode, response.Header, body}
	answer.hold(t, r)
	return answer
}

// post posts JSON.
func (s *server) post(t testing.TB, path, body string) *reply {
	t.Helper()
	return s.request(t, http.MethodPost, path, body, "Content-Type", jsonType)
}

func (s *server) get(t testing.TB, path string) *reply {
	t.Helper()
	return s.request(t, http.MethodGet, path, "")
}

// request sends a request with the given header.
func (s *server) request(t testing.TB, method, path, body string, header ...string) *reply {
	t.Helper()
	r, err := http.NewRequestWithContext(context.Background(), method, s.URL+path, strings.NewReader(body))
	if err != nil {
		t.Fatal(err)
	}
	for i := 0; i < len(header); i += 2 {
		r.Header.Set(header[i], header[i+1])
	}
	return s.send(t, r)
}

// theContract is the contract as a third party reads it, loaded once.
var theContract = sync.OnceValues(func() (*openapi3.T, error) {
	for _, media := range []string{"text/html", "text/css", "application/javascript", "application/yaml", "image/png"} {
		openapi3filter.RegisterBodyDecoder(media, func(body io.Reader, _ http.Header, _ *openapi3.SchemaRef, _ openapi3filter.EncodingFn) (any, error) {
			text, err := io.ReadAll(body)
			return string(text), err
		})
	}
	doc, err := openapi3.NewLoader().LoadFromData(api.OpenAPI)
	if err == nil {
		doc.Servers = nil // the tests' listeners have addresses of their own
	}
	return doc, err
})

var theRoutes = sync.OnceValues(func() (routers.Router, error) {
	doc, err := theContract()
	if err != nil {
		return nil, err
	}
	return legacy.NewRouter(doc)
})

// hold holds an answer to the contract. An answer of 404 or 405 that no operation has is held to the shape of a problem.
func (r *reply) hold(t testing.TB, request *http.Request) {
	t.Helper()
	if *update {
		return // the examples that the contract refers to may not be there yet
	}
	doc, err := theContract()
	if err != nil {
		t.Fatal(err)
	}
	router, err := theRoutes()
	if err != nil {
		t.Fatal(err)
	}
	if id := r.header.Get(requestIDHeader); requestID(id) != id {
		t.Errorf("%s %s: the answer has the name %q", request.Method, request.URL.Path, id)
	}
	if request.Method == http.MethodHead || request.Method == http.MethodOptions {
		return // no bodies
	}
	routed := &http.Request{Method: request.Method, URL: request.URL, Header: request.Header}
	route, parameters, err := router.FindRoute(routed)
	if err != nil || strings.HasSuffix(request.URL.Path, "/") { // that router overlooks a last slash
		r.holdToProblem(t, doc)
		return
	}
	input := &openapi3filter.ResponseValidationInput{
		RequestValidationInput: &openapi3filter.RequestValidationInput{Request: routed, PathParams: parameters, Route: route},
		Status:                 r.status, Header: r.header, Body: io.NopCloser(bytes.NewReader(r.body)),
		Options: &openapi3filter.Options{IncludeResponseStatus: true, MultiError: true},
	}
	if err := openapi3filter.ValidateResponse(context.Background(), input); err != nil {
		t.Errorf("%s %s: the answer is not of the contract: %v\n%d %.2000s", request.Method, request.URL.Path, err, r.status, r.body)
	}
}

func (r *reply) holdToProblem(t testing.TB, doc *openapi3.T) {
	t.Helper()
	var value any
	if err := json.Unmarshal(r.body, &value); err != nil {
		t.Errorf("an answer that is not JSON: %d %.200s", r.status, r.body)
		return
	}
	if r.status != http.StatusNotFound && r.status != http.StatusMethodNotAllowed || r.header.Get("Content-Type") != problemType {
		t.Errorf("an answer that no operation has: %d %.200s", r.status, r.body)
	}
	if err := doc.Components.Schemas["Problem"].Value.VisitJSON(value); err != nil {
		t.Errorf("not a problem: %v", err)
	}
}
