package service

import (
	"bufio"
	"context"
	"fmt"
	"net"
	"net/http"
	"strings"
	"testing"
	"time"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/answer"
)

func entryOf(t testing.TB, code api.Code) api.Entry {
	t.Helper()
	for _, entry := range api.Catalogue() {
		if entry.Code == code {
			return entry
		}
	}
	t.Fatalf("the catalogue has no code %s", code)
	return api.Entry{}
}

// TestCatalogue posts the example of every rule of the catalogue and demands the very code and status.
func TestCatalogue(t *testing.T) {
	for _, entry := range api.Catalogue() {
		t.Run(string(entry.Code), func(t *testing.T) {
			got := runEntry(t, entry)
			p := got.problem(t)
			if got.status != entry.Status || p.Status != entry.Status {
				t.Errorf("answered with %d, the catalogue says %d: %s", got.status, entry.Status, got.body)
			}
			// Readings that break one rule often break another by it: a label too many is a cell too few.
			_, found := got.places(t)[entry.Code]
			if !found || len(p.Errors) != 1 && entry.Example.Path != "/v1/anova" {
				t.Errorf("the example breaks other rules than %s: %s", entry.Code, got.body)
			}
			retry := entry.Status == http.StatusServiceUnavailable || entry.Status == http.StatusTooManyRequests
			if (got.header.Get("Retry-After") != "") != retry {
				t.Errorf("Retry-After: %q with a status of %d", got.header.Get("Retry-After"), got.status)
			}
		})
	}
}

// runEntry sends a rule's example to a service in the setting that the example needs.
func runEntry(t *testing.T, entry api.Entry) *reply {
	t.Helper()
	e := entry.Example
	limits := map[api.Setting]func(*Options){
		api.BodyLimit:     func(o *Options) { o.MaxBody = api.BodyLimitOfExample },
		api.EnvelopeLimit: func(o *Options) { o.MaxEnvelope = api.EnvelopeLimitOfExample },
		api.RateLimit:     func(o *Options) { o.Rate, o.Burst = 0.001, 1 },
		api.Busy:          func(o *Options) { o.MaxWorkers, o.QueueTime = 1, time.Millisecond },
		api.NoTime:        func(o *Options) { o.WorkTime = time.Millisecond },
		api.StalledBody:   func(o *Options) { o.BodyTime = 20 * time.Millisecond },
		api.CutShort:      nil, api.Defect: nil, api.Draining: nil, "": nil,
	}
	change, known := limits[e.Setting]
	if !known {
		t.Fatalf("an unknown setting: %s", e.Setting)
	}
	if entry.Code == api.TooManyRows {
		change = func(o *Options) { o.MaxRows = api.RowLimitOfExample }
	}
	s := start(t, change)
	method := e.Method
	if method == "" {
		method = http.MethodPost
	}
	media := e.MediaType
	if media == "" {
		media = jsonType
	}
	switch e.Setting {
	case api.RateLimit:
		s.get(t, "/v1/problems")
	case api.Defect:
		s.service.operations[0].run = func(context.Context, *request, api.Envelope) (any, answer.Stats, []engine.Fault, error) {
			panic("service: a defect made by a test")
		}
	case api.Busy:
		s.service.workers.room <- struct{}{}
	case api.Draining:
		s.service.Drain()
	case api.NoTime:
		s.service.operations[0].run = func(ctx context.Context, _ *request, _ api.Envelope) (any, answer.Stats, []engine.Fault, error) {
			<-ctx.Done()
			return nil, answer.Stats{}, nil, ctx.Err()
		}
	case api.CutShort, api.StalledBody:
		return s.half(t, e, e.Setting == api.CutShort)
	case api.BodyLimit, api.EnvelopeLimit, "":
	}
	header := []string{"Content-Type", media}
	if e.Accept != "" {
		header = append(header, "Accept", e.Accept)
	}
	if e.Encoding != "" {
		header = append(header, "Content-Encoding", e.Encoding)
	}
	return s.request(t, method, e.Path, e.Body, header...)
}

// half sends half of an example's body, and then ends the connection's sending side, or waits.
func (s *server) half(t *testing.T, e api.Example, end bool) *reply {
	t.Helper()
	dialer := net.Dialer{}
	connection, err := dialer.DialContext(context.Background(), "tcp", strings.TrimPrefix(s.URL, "http://"))
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = connection.Close() }()
	_, err = fmt.Fprintf(connection, "POST %s HTTP/1.1\r\nHost: test\r\nContent-Type: application/json\r\nContent-Length: %d\r\n\r\n%s", e.Path, len(e.Body), e.Body[:len(e.Body)/2])
	if err != nil {
		t.Fatal(err)
	}
	if tcp, ok := connection.(*net.TCPConn); ok && end {
		if err := tcp.CloseWrite(); err != nil {
			t.Fatal(err)
		}
	}
	r, err := http.NewRequestWithContext(context.Background(), http.MethodPost, s.URL+e.Path, nil)
	if err != nil {
		t.Fatal(err)
	}
	response, err := http.ReadResponse(bufio.NewReader(connection), r)
	if err != nil {
		t.Fatal(err)
	}
	return read(t, r, response)
}
