package service

import (
	"bytes"
	"context"
	"encoding/json"
	"math"
	"net/http"
	"net/http/httptest"
	"strings"
	"sync"
	"syscall"
	"testing"
	"time"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/answer"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
	"go.uber.org/zap/zaptest/observer"
)

// TestLog holds the log to one line a request, with what it must hold and nothing of what callers sent.
func TestLog(t *testing.T) {
	core, lines := observer.New(zapcore.DebugLevel)
	var mu sync.Mutex
	var seen []*Observation
	s := start(t, func(o *Options) {
		o.Logger = zap.New(core)
		o.Observe = func(o *Observation) {
			mu.Lock()
			defer mu.Unlock()
			seen = append(seen, o)
		}
	})
	const secret = "hushhush"
	design := `{"title": "` + secret + `", "factors": [{"name": "` + secret + `", "levels": ["` + secret + `1", "` + secret + `2"], "effect": "fixed"}], "replicates": 2}`
	data := `{"` + secret + `": ["` + secret + `1", "` + secret + `2", "` + secret + `1", "` + secret + `2"], "y` + secret + `": [7654321, 2, 3, 4]}`
	for _, path := range []string{"/v1/terms", "/v1/expected-mean-squares", "/v1/tests"} {
		s.post(t, path+"?"+secret, `{"id": "`+secret+`", "design": `+design+`}`)
	}
	s.post(t, "/v1/anova", `{"design": `+design+`, "data": `+data+`}`)
	s.post(t, "/v1/anova", `{"design": `+design+`, "data": `+strings.Replace(data, "2,", `"`+secret+`",`, 1)+`}`)
	s.post(t, "/v1/terms", `{"`+secret+`": 1}`)
	s.post(t, "/v1/terms", secret)
	s.get(t, "/"+secret)
	s.request(t, secret, "/v1/terms", "")
	s.request(t, http.MethodPost, "/v1/anova", formOf(secret, secret), "Content-Type", cutForm+secret)
	entries := lines.All()
	if len(entries) != 10 || len(seen) != 10 {
		t.Fatalf("%d lines and %d observations for 10 requests", len(entries), len(seen))
	}
	for i, entry := range entries {
		fields := entry.ContextMap()
		for _, name := range []string{"request_id", "method", "route", "status", "duration", "bytes_in", "bytes_out"} {
			if _, ok := fields[name]; !ok {
				t.Errorf("line %d has no %s", i, name)
			}
		}
		delete(fields, "method")
		text, err := json.Marshal(fields)
		if err != nil {
			t.Fatal(err)
		}
		if bytes.Contains(text, []byte(secret)) || bytes.Contains(text, []byte("7654321")) {
			t.Errorf("line %d tells what was sent: %s", i, text)
		}
	}
	for i, want := range []struct {
		route        string
		status       int64
		terms        int64
		observations int64
	}{{"/v1/terms", 200, 2, 4}, {"/v1/expected-mean-squares", 200, 2, 4}, {"/v1/tests", 200, 1, 4}, {"/v1/anova", 200, 2, 4}, {"/v1/anova", 422, 0, 0}, {"/v1/terms", 400, 0, 0}, {"/v1/terms", 400, 0, 0}, {"", 404, 0, 0}} {
		fields := entries[i].ContextMap()
		terms, _ := fields["terms"].(int64)
		observations, _ := fields["observations"].(int64)
		if fields["route"] != want.route || fields["status"] != want.status || terms != want.terms || observations != want.observations {
			t.Errorf("line %d: %v, want %+v", i, fields, want)
		}
	}
}

// defective makes the terms of a service fail in a way.
func defective(s *Service, fail func() (any, error)) {
	s.operations[0].run = func(context.Context, *request, api.Envelope) (any, answer.Stats, []engine.Fault, error) {
		reply, err := fail()
		return reply, answer.Stats{}, nil, err
	}
}

// TestDefects holds every kind of defect to a problem that tells nothing, and to a line in the log that tells where.
func TestDefects(t *testing.T) {
	core, lines := observer.New(zapcore.ErrorLevel)
	s := start(t, func(o *Options) { o.Logger = zap.New(core) })
	const secret = "hushhush"
	var list []int
	for name, c := range map[string]struct {
		fail func() (any, error)
		log  string
	}{
		"a panic of the runtime": {func() (any, error) { return list[7], nil }, "index out of range"},
		"a panic of ours":        {func() (any, error) { panic("service: broken") }, "service: broken"},
		"a panic with a value":   {func() (any, error) { panic(&api.Problem{Detail: secret}) }, "*api.Problem"},
		"an answer with NaN":     {func() (any, error) { return math.NaN(), nil }, "not JSON"},
		"an answer that is none": {func() (any, error) { return func() {}, nil }, "not JSON"},
		"an error":               {func() (any, error) { return nil, context.DeadlineExceeded }, "deadline"},
	} {
		t.Run(name, func(t *testing.T) {
			defective(s.service, c.fail)
			answer := s.post(t, "/v1/terms", `{"id": "`+secret+`", "design": `+rackDesign("")+`}`)
			if answer.status != http.StatusInternalServerError || answer.places(t)[api.InternalError] != "" {
				t.Errorf("%d %s", answer.status, answer.body)
			}
			for _, leak := range []string{secret, "panic", "goroutine", ".go", "index", "NaN", "deadline"} {
				if bytes.Contains(answer.body, []byte(leak)) {
					t.Errorf("the problem tells %q: %s", leak, answer.body)
				}
			}
			entries := lines.TakeAll()
			if len(entries) != 1 {
				t.Fatalf("%d lines", len(entries))
			}
			fields := entries[0].ContextMap()
			text, _ := fields["error"].(string)
			if !strings.Contains(text, c.log) || strings.Contains(text, secret) || fields["request_id"] != answer.header.Get(requestIDHeader) {
				t.Errorf("the log says %v", fields)
			}
			if stack, _ := fields["stack"].(string); strings.Contains(name, "panic") && !strings.Contains(stack, "observe_test.go") {
				t.Errorf("the log does not say where: %s", stack)
			}
		})
	}
}

// TestClientGone lets a client go away during the work: that is no defect, and the service goes on.
func TestClientGone(t *testing.T) {
	seen := make(chan *Observation, 4)
	s := start(t, func(o *Options) { o.Observe = func(o *Observation) { seen <- o } })
	entered := make(chan struct{}, 1)
	waiting(s.service, entered, nil)
	ctx, leave := context.WithCancel(context.Background())
	r, err := http.NewRequestWithContext(ctx, http.MethodPost, s.URL+"/v1/terms", strings.NewReader(`{"design": `+rackDesign("")+`}`))
	if err != nil {
		t.Fatal(err)
	}
	r.Header.Set("Content-Type", jsonType)
	done := make(chan error, 1)
	go func() {
		response, err := s.Client().Do(r)
		if err == nil {
			err = response.Body.Close()
		}
		done <- err
	}()
	<-entered
	leave()
	if err := <-done; err == nil {
		t.Error("the client got an answer")
	}
	select {
	case o := <-seen:
		if o.Status != clientGone {
			t.Errorf("counted as %d", o.Status)
		}
	case <-time.After(10 * time.Second):
		t.Fatal("the request never ended")
	}
	if answer := s.get(t, "/healthz"); answer.status != http.StatusOK {
		t.Errorf("afterwards: %d", answer.status)
	}
	if len(s.service.workers.room) != 0 {
		t.Error("its room to work is still taken")
	}
}

// brokenPipe is a connection that ends as soon as something is written.
type brokenPipe struct{ sink }

func (b *brokenPipe) Write([]byte) (int, error) { return 0, syscall.EPIPE }

// TestHalfAnAnswer holds an answer that cannot be written to its end to an ended connection, and to no defect in the log.
func TestHalfAnAnswer(t *testing.T) {
	core, lines := observer.New(zapcore.DebugLevel)
	service := build(t, func(o *Options) { o.Logger = zap.New(core) })
	defer func() {
		if cause := recover(); cause != any(http.ErrAbortHandler) {
			t.Errorf("the connection goes on: %v", cause)
		}
		entries := lines.All()
		if len(entries) != 1 || entries[0].Level != zapcore.InfoLevel || entries[0].ContextMap()["status"] != int64(clientGone) {
			t.Errorf("the log says %v", entries)
		}
	}()
	r := httptest.NewRequestWithContext(context.Background(), http.MethodPost, "/v1/terms", strings.NewReader(oneKilobyte))
	r.Header.Set("Content-Type", jsonType)
	service.ServeHTTP(&brokenPipe{sink{header: make(http.Header)}}, r)
}
