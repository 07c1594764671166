package service

import (
	"bytes"
	"context"
	"net/http"
	"net/http/httptest"
	"testing"
	"time"

	"guardrow/api"
)

// FuzzRequest sends any bytes to any operation, as JSON and as a form: no answer is a 5xx or breaks the contract, and none
// takes the service down.
func FuzzRequest(f *testing.F) {
	service := build(f, func(o *Options) {
		o.MaxBody, o.MaxRows = 1<<18, 10_000
		o.WorkTime, o.QueueTime = time.Minute, time.Minute // so that a slow machine is no finding
	})
	for _, entry := range api.Catalogue() {
		if e := entry.Example; e.Method == "" && len(e.Body) < 5000 {
			for i, o := range service.operations {
				if o.path == e.Path {
					f.Add(uint8(i), e.MediaType != "", []byte(e.Body))
				}
			}
		}
	}
	f.Add(uint8(0), false, []byte(oneKilobyte))
	f.Add(uint8(3), true, []byte(formOf("design", rackDesign(""), "data", rackCSV)))
	f.Add(uint8(3), false, []byte(`{"design": `+rackDesign(`, "max_order": 1`)+`, "csv": "rack,y\n1,2\n2,3e5\n", "confidence": 0.5, "responses": ["y"]}`))
	f.Fuzz(func(t *testing.T, which uint8, form bool, body []byte) {
		o := service.operations[int(which)%len(service.operations)]
		r := httptest.NewRequestWithContext(context.Background(), http.MethodPost, o.path, bytes.NewReader(body))
		r.Header.Set("Content-Type", jsonType)
		if form {
			r.Header.Set("Content-Type", cutForm)
		}
		w := httptest.NewRecorder()
		service.ServeHTTP(w, r)
		answer := &reply{w.Code, w.Header(), w.Body.Bytes()}
		if w.Code >= http.StatusInternalServerError {
			t.Errorf("%s: %d %s", o.path, w.Code, w.Body)
		}
		answer.hold(t, r)
	})
}

// FuzzTarget sends any method to any path with any headers.
func FuzzTarget(f *testing.F) {
	service := build(f, nil)
	f.Add("GET", "/v1/problems/malformed", "a", "*/*", "text/plain")
	f.Add("POST", "/v1/terms", "", "application/json;q=0.5,,;", "multipart/form-data; boundary=\"")
	f.Add("HEAD", "/docs/favicon-32x32.png", "x", ";q=x", "")
	f.Fuzz(func(t *testing.T, method, path, id, accept, media string) {
		r, err := http.NewRequestWithContext(context.Background(), method, "http://guardrow.invalid"+path, http.NoBody)
		if err != nil || r.URL.Path == "" {
			return // nothing that a server would hand on
		}
		r.RemoteAddr = "192.0.2.1:1"
		r.Header.Set(requestIDHeader, id)
		r.Header.Set("Accept", accept)
		r.Header.Set("Content-Type", media)
		w := httptest.NewRecorder()
		service.ServeHTTP(w, r)
		if w.Code >= http.StatusInternalServerError {
			t.Errorf("%s %s: %d %s", method, path, w.Code, w.Body)
		}
	})
}
