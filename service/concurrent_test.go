package service

import (
	"bytes"
	"fmt"
	"net/http"
	"strings"
	"sync"
	"testing"

	"guardrow/api"
)

// TestCallersDoNotMix lets many callers at once ask different things with faults among them: each answer holds the caller's
// own names and no other's, and is the same, to the byte, each time.
func TestCallersDoNotMix(t *testing.T) {
	s := start(t, nil)
	const callers, times = 12, 6
	var all sync.WaitGroup
	for caller := range callers {
		all.Go(func() {
			name := fmt.Sprintf("caller%dfactor", caller)
			factors := fmt.Sprintf(`{"factors": [{"name": %q, "levels": ["%sA", "%sB"], "effect": "fixed"}, {"name": "%sUnit", "levels": %d, "effect": "random", "within": [%q]}], "replicates": %d}`, name, name, name, name, caller+2, name, caller+1)
			var rows, units, y []string
			for i := range 2 * (caller + 2) * (caller + 1) {
				rows = append(rows, fmt.Sprintf("%q", name+string("AB"[i%2])))
				units = append(units, fmt.Sprint(i/2%(caller+2)))
				y = append(y, fmt.Sprint(i*i%17+100*caller))
			}
			requests := []struct{ path, body string }{
				{"/v1/terms", `{"id": "` + name + `", "design": ` + factors + `}`},
				{"/v1/tests", `{"design": ` + factors + `}`},
				{"/v1/expected-mean-squares", `{"design": ` + factors + `, "only": ["` + name + `x"]}`},
				{"/v1/anova", fmt.Sprintf(`{"design": %s, "data": {%q: [%s], "%sUnit": [%s], "%sY": [%s]}}`, factors, name, strings.Join(rows, ","), name, strings.Join(units, ","), name, strings.Join(y, ","))},
				{"/v1/anova", fmt.Sprintf(`{"design": %s, "csv": "%s,%sUnit,%sY\nnone,1,1\n"}`, factors, name, name, name)},
			}
			first := make([][]byte, len(requests))
			for range times {
				for i, r := range requests {
					answer := s.post(t, r.path, r.body)
					if first[i] == nil {
						first[i] = answer.body
					}
					if !bytes.Equal(first[i], answer.body) {
						t.Errorf("two answers to one request:\n%s\n%s", first[i], answer.body)
					}
					if !bytes.Contains(answer.body, []byte(name)) {
						t.Errorf("%s: an answer without the caller's name: %d %s", r.path, answer.status, answer.body)
					}
					for other := range callers {
						if other != caller && bytes.Contains(answer.body, fmt.Appendf(nil, "caller%dfactor", other)) {
							t.Errorf("caller %d reads of caller %d: %s", caller, other, answer.body)
						}
					}
				}
			}
		})
	}
	all.Wait()
}

// TestSameBytes asks every example of the catalogue that any service refuses twice, of two services.
func TestSameBytes(t *testing.T) {
	a, b := start(t, nil), start(t, nil)
	for _, entry := range api.Catalogue() {
		e := entry.Example
		if e.Setting != "" || e.Method != "" || e.MediaType != "" || e.Accept != "" || e.Encoding != "" || entry.Code == api.TooManyRows {
			continue
		}
		x, y := a.post(t, e.Path, e.Body), b.post(t, e.Path, e.Body)
		if x.status != y.status || !bytes.Equal(x.body, y.body) {
			t.Errorf("%s: two answers:\n%s\n%s", entry.Code, x.body, y.body)
		}
		if x.status == http.StatusOK {
			t.Errorf("%s: the example breaks no rule", entry.Code)
		}
	}
}
