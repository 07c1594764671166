package service

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"net/http"
	"strconv"
	"strings"
	"testing"
	"time"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/answer"
	"guardrow/engine/data"

	"go.uber.org/zap"
)

// TestBodyLimit sends bodies at the limit and past it, of announced and of unknown length.
func TestBodyLimit(t *testing.T) {
	body := `{"design": ` + rackDesign("") + `}`
	s := start(t, func(o *Options) { o.MaxBody = int64(len(body)) })
	for _, chunked := range []bool{false, true} {
		for _, c := range []struct {
			body   string
			status int
		}{{body, 200}, {body + " ", 413}, {body + strings.Repeat(" ", 3*mebibyte), 413}} {
			var source io.Reader = strings.NewReader(c.body)
			if chunked {
				source = io.MultiReader(source) // hides the length
			}
			r, err := http.NewRequestWithContext(context.Background(), http.MethodPost, s.URL+"/v1/terms", source)
			if err != nil {
				t.Fatal(err)
			}
			r.Header.Set("Content-Type", jsonType)
			if answer := s.send(t, r); answer.status != c.status {
				t.Errorf("%d bytes, chunked %v: %d", len(c.body), chunked, answer.status)
			}
		}
	}
	form := formOf("design", rackDesign(""), "data", rackCSV)
	s = start(t, func(o *Options) { o.MaxBody = int64(len(form) - 1) })
	if places := s.request(t, http.MethodPost, "/v1/anova", form, "Content-Type", cutForm).places(t); len(places) != 1 || places[api.BodyTooLarge] != "" {
		t.Errorf("a large form: %v", places)
	}
}

// TestEnvelopeLimit holds the limit to what is not readings.
func TestEnvelopeLimit(t *testing.T) {
	s := start(t, func(o *Options) { o.MaxEnvelope = 200 })
	rows := strings.Repeat("1, 2, ", 500) + "1, 2"
	// Too many readings for the design, but not too large.
	if answer := s.post(t, "/v1/anova", `{"design": `+rackDesign("")+`, "data": {"rack": [`+rows+`], "y": [`+rows+`]}}`); answer.status != http.StatusUnprocessableEntity {
		t.Errorf("large readings: %d %s", answer.status, answer.body)
	}
	if answer := s.request(t, http.MethodPost, "/v1/anova", formOf("design", rackDesign(""), "data", "rack,y\n"+strings.Repeat("1,2\n", 500)), "Content-Type", cutForm); answer.status != http.StatusUnprocessableEntity {
		t.Errorf("a large file: %d %s", answer.status, answer.body)
	}
	if answer := s.request(t, http.MethodPost, "/v1/anova", formOf("design", rackDesign(strings.Repeat(" ", 200)), "data", rackCSV), "Content-Type", cutForm); answer.places(t)[api.EnvelopeTooLarge] != "" || answer.status != http.StatusRequestEntityTooLarge {
		t.Errorf("a large part: %d", answer.status)
	}
}

// TestBufferIsGivenBack sends more bytes, one request after another, than may be held at once, rightly and wrongly.
func TestBufferIsGivenBack(t *testing.T) {
	s := start(t, func(o *Options) { o.MaxBody, o.MaxBuffered = 2000, 5000 })
	for range 20 {
		s.post(t, "/v1/terms", `{"design": `+rackDesign("")+`}`)
		s.post(t, "/v1/terms", `{"design": `)
		s.post(t, "/v1/terms", strings.Repeat(" ", 1999))
		s.post(t, "/v1/terms", strings.Repeat(" ", 2001))
		s.request(t, http.MethodPost, "/v1/anova", strings.Repeat("x", 1000), "Content-Type", cutForm)
	}
	if held := s.service.buffer.held.Load(); held != 0 {
		t.Errorf("%d bytes are still held", held)
	}
	s.service.buffer.held.Store(4999)
	if answer := s.post(t, "/v1/terms", `{}`); answer.places(t)[api.Overloaded] != "" || answer.status != http.StatusServiceUnavailable {
		t.Errorf("a full buffer: %d", answer.status)
	}
	s.service.buffer.held.Store(0)
}

// waiting makes an operation wait until its context ends, or until it is released.
func waiting(s *Service, entered chan<- struct{}, release <-chan struct{}) {
	s.operations[0].run = func(ctx context.Context, r *request, head api.Envelope) (any, answer.Stats, []engine.Fault, error) {
		entered <- struct{}{}
		select {
		case <-ctx.Done():
			return nil, answer.Stats{}, nil, ctx.Err()
		case <-release:
			return terms(ctx, r, head)
		}
	}
}

// TestQueue fills the room to work: one more waits and gets its turn, and one that waits too long is refused.
func TestQueue(t *testing.T) {
	s := start(t, func(o *Options) { o.MaxWorkers, o.QueueTime = 1, 10*time.Second })
	entered, release := make(chan struct{}, 2), make(chan struct{})
	waiting(s.service, entered, release)
	answers := make(chan *reply, 2)
	for range 2 {
		go func() { answers <- s.post(t, "/v1/terms", `{"design": `+rackDesign("")+`}`) }()
	}
	<-entered
	select {
	case <-entered:
		t.Fatal("two work at once where there is room for one")
	case <-time.After(20 * time.Millisecond):
	}
	release <- struct{}{}
	<-entered
	release <- struct{}{}
	for range 2 {
		if answer := <-answers; answer.status != http.StatusOK {
			t.Errorf("a request that waited: %d", answer.status)
		}
	}
}

// TestStop stops the service while it works: what is in flight gets a 503 and says why; so does what comes later.
func TestStop(t *testing.T) {
	s := start(t, nil)
	entered := make(chan struct{}, 1)
	waiting(s.service, entered, nil)
	answers := make(chan *reply, 1)
	go func() { answers <- s.post(t, "/v1/terms", `{"design": `+rackDesign("")+`}`) }()
	<-entered
	if answer := s.get(t, "/readyz"); answer.status != http.StatusOK {
		t.Errorf("not ready: %d", answer.status)
	}
	s.service.Drain()
	if answer := s.get(t, "/readyz"); answer.places(t)[api.ShuttingDown] != "" || answer.status != http.StatusServiceUnavailable {
		t.Errorf("ready while draining: %d", answer.status)
	}
	if answer := s.post(t, "/v1/tests", `{"design": `+rackDesign("")+`}`); answer.status != http.StatusOK {
		t.Errorf("refused while draining: %d", answer.status)
	}
	s.service.Stop()
	answer := <-answers
	if _, ok := answer.places(t)[api.ShuttingDown]; !ok || answer.status != http.StatusServiceUnavailable {
		t.Errorf("stopped in flight: %d %s", answer.status, answer.body)
	}
	if answer := s.post(t, "/v1/tests", `{"design": `+rackDesign("")+`}`); answer.status != http.StatusServiceUnavailable {
		t.Errorf("answered after the stop: %d", answer.status)
	}
	if answer := s.get(t, "/healthz"); answer.status != http.StatusOK {
		t.Errorf("dead while stopping: %d", answer.status)
	}
}

// TestRates holds the bound on each client's requests with a clock of its own: the burst, then one an interval.
func TestRates(t *testing.T) {
	clock := time.Unix(0, 0)
	r := newRates(2, 3)
	r.now = func() time.Time { return clock }
	admitted := func(address string) bool { return r.admit(address) == nil }
	for i, want := range []bool{true, true, true, false, false} {
		if admitted("192.0.2.1") != want {
			t.Errorf("request %d of a burst: admitted is %v", i, !want)
		}
	}
	if !admitted("192.0.2.2") {
		t.Error("one client pays for another")
	}
	clock = clock.Add(499 * time.Millisecond)
	if admitted("192.0.2.1") {
		t.Error("admitted before its time")
	}
	clock = clock.Add(time.Millisecond)
	if !admitted("192.0.2.1") || admitted("192.0.2.1") {
		t.Error("not exactly one admitted after an interval")
	}
	for _, address := range []string{"2001:db8::1", "2001:db8::2", "2001:db8::ffff:1"} {
		if !admitted(address) {
			t.Error("a network's burst is refused")
		}
	}
	if admitted("2001:db8::3") || !admitted("2001:db8:0:1::1") {
		t.Error("a network of IPv6 is not one client")
	}
	clock = clock.Add(time.Hour)
	admitted("192.0.2.9")
	if len(r.next) != 1 {
		t.Errorf("%d clients are remembered whose requests are worked off", len(r.next)-1)
	}
	if err := newRates(0, 0).admit("192.0.2.1"); err != nil {
		t.Error("a limit where there is none")
	}
}

// TestRateIsOfThePeer sends forged headers: they make no other client.
func TestRateIsOfThePeer(t *testing.T) {
	s := start(t, func(o *Options) { o.Rate, o.Burst = 0.001, 1 })
	for i := range 3 {
		answer := s.request(t, http.MethodGet, "/v1/problems", "", "X-Forwarded-For", fmt.Sprintf("192.0.2.%d", i), "X-Real-Ip", fmt.Sprintf("192.0.2.%d", i))
		if want := []int{200, 429, 429}[i]; answer.status != want {
			t.Errorf("request %d: %d", i, answer.status)
		}
		if health := s.get(t, "/healthz"); health.status != http.StatusOK {
			t.Errorf("the limit is on /healthz too: %d", health.status)
		}
	}
}

// TestOptions holds Validate to name every fault, and the zero options to be the stated ones.
func TestOptions(t *testing.T) {
	_, err := New(Options{MaxEnvelope: -1, MaxRows: -2, Burst: 3, Rate: -1, WorkTime: -time.Second, MaxBuffered: 5})
	if err == nil {
		t.Fatal("no fault is found")
	}
	for _, word := range []string{"logger", "version", "MaxEnvelope", "MaxRows", "Rate", "WorkTime", "MaxBuffered"} {
		if !strings.Contains(err.Error(), word) {
			t.Errorf("%s is not named in: %v", word, err)
		}
	}
	d := (&Options{Logger: zap.NewNop(), Version: "x"}).withDefaults()
	if d.MaxBody != 64<<20 || d.MaxEnvelope != 1<<20 || d.MaxBuffered != 256<<20 || d.MaxRows != 2_000_000 || d.BodyTime != time.Minute || d.WorkTime != 30*time.Second || d.QueueTime != 10*time.Second || d.MaxWorkers < 2 {
		t.Errorf("the defaults are not those that the comments state: %+v", d)
	}
	thousands := func(n int) string {
		text := strconv.Itoa(n)
		for i := len(text) - 3; i > 0; i -= 3 {
			text = text[:i] + "," + text[i:]
		}
		return text
	}
	for _, stated := range []string{
		"64 MiB", "1 MiB", "2,000,000 rows", fmt.Sprintf("at most %d factors", engine.MaxFactors), fmt.Sprintf("at most %d characters", engine.MaxName),
		thousands(answer.MaxTerms) + " terms", thousands(answer.MaxComponents) + " components", thousands(answer.MaxAnalysed), fmt.Sprintf("more than %d terms", answer.MaxPooledList),
		fmt.Sprintf("at most %d deep", data.MaxDepth), fmt.Sprintf("at most %d errors", maxErrors),
	} {
		if !bytes.Contains(bytes.Join(bytes.Fields(api.OpenAPI), []byte(" ")), []byte(stated)) {
			t.Errorf("the contract does not state the bound of %s", stated)
		}
	}
}
