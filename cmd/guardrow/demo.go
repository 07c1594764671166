package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"net"
	"net/http"
	"slices"
	"time"

	"go.uber.org/zap"

	"guardrow/api"
	"guardrow/service"
	"guardrow/testdata/demo"
)

// demonstrate starts a service on a free loopback port, posts the demonstration study to it, and prints what comes back.
func demonstrate(ctx context.Context, w io.Writer) error {
	handler, err := service.New(service.Options{Logger: zap.NewNop(), Version: version})
	if err != nil {
		return err
	}
	listener, err := (&net.ListenConfig{}).Listen(ctx, "tcp", "127.0.0.1:0")
	if err != nil {
		return err
	}
	serving, stop := context.WithCancel(ctx)
	stopped := make(chan error, 1)
	go func() {
		stopped <- serveOn(serving, listener, handler, zap.NewNop(), &settings{stopTime: 5 * time.Second, bodyTime: time.Minute})
	}()
	err = tell(ctx, w, "http://"+listener.Addr().String())
	stop()
	if ended := <-stopped; err == nil {
		err = ended
	}
	return err
}

// study is what the demonstration gets back.
type study struct {
	terms        api.TermsAnswer
	expectations api.ExpectedMeanSquaresAnswer
	tests        api.TestsAnswer
	fitted       api.AnovaAnswer
	tubesCounted api.AnovaAnswer   // the same readings as though every tube had been stored on its own
	symbols      map[string]string // of each factor
}

// tell posts the study to the service at address and prints the answers.
func tell(ctx context.Context, w io.Writer, address string) error {
	var s study
	var declared struct {
		Factors []json.RawMessage `json:"factors"`
	}
	if err := json.Unmarshal([]byte(demo.Design), &declared); err != nil {
		return err
	}
	design := map[string]any{"design": json.RawMessage(demo.Design)}
	data := map[string]any{"design": json.RawMessage(demo.Design), "csv": demo.Readings, "responses": []string{"potassium"}}
	naive := map[string]any{
		"design": map[string]any{"factors": []json.RawMessage{declared.Factors[0], declared.Factors[3]}, "replicates": 24},
		"csv":    demo.Readings, "responses": []string{"potassium"},
	}
	for _, call := range []struct {
		path    string
		request any
		answer  any
	}{
		{"/v1/terms", design, &s.terms},
		{"/v1/expected-mean-squares", design, &s.expectations},
		{"/v1/tests", design, &s.tests},
		{"/v1/anova", data, &s.fitted},
		{"/v1/anova", naive, &s.tubesCounted},
	} {
		if err := post(ctx, address+call.path, call.request, call.answer); err != nil {
			return fmt.Errorf("%s: %w", call.path, err)
		}
	}
	var text bytes.Buffer
	s.print(&text)
	_, err := w.Write(text.Bytes())
	return err
}

// post sends a request as JSON and reads the answer; a problem becomes an error.
func post(ctx context.Context, target string, request, answer any) error {
	body, err := json.Marshal(request)
	if err != nil {
		return err
	}
	r, err := http.NewRequestWithContext(ctx, http.MethodPost, target, bytes.NewReader(body))
	if err != nil {
		return err
	}
	r.Header.Set("Content-Type", "application/json")
	response, err := http.DefaultClient.Do(r)
	if err != nil {
		return err
	}
	text, err := io.ReadAll(response.Body)
	if closed := response.Body.Close(); err == nil {
		err = closed
	}
	switch {
	case err != nil:
		return err
	case response.StatusCode != http.StatusOK:
		return fmt.Errorf("%s %s", response.Status, text)
	}
	return json.Unmarshal(text, answer)
}

// row returns the row of a term.
func row(answer *api.AnovaAnswer, term string) api.Row {
	rows := answer.Analyses[0].Rows
	return rows[slices.IndexFunc(rows, func(r api.Row) bool { return r.Term.Term == term })]
}
