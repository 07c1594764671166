package service

import (
	"net/http"
	"strings"
	"testing"
)

const cutForm = "multipart/form-data; boundary=cut"

// formOf writes a form of parts by hand: name and text in turn.
func formOf(parts ...string) string {
	var text strings.Builder
	for i := 0; i < len(parts); i += 2 {
		text.WriteString("--cut\r\nContent-Disposition: form-data; name=\"" + parts[i] + "\"\r\n\r\n" + parts[i+1] + "\r\n")
	}
	return text.String() + "--cut--\r\n"
}

const rackCSV = "rack,y\r\n1,3\r\n2,4\r\n"

func TestForm(t *testing.T) {
	s := start(t, nil)
	design := rackDesign("")
	for _, c := range []struct {
		name, media, body string
		status            int
		want              string // places and codes
	}{
		{"right", cutForm, formOf("design", design, "data", rackCSV), 200, ""},
		{"every part, readings first", cutForm, formOf("data", rackCSV, "id", `"x"`, "only", `["rack"]`, "responses", `["y"]`, "missing", `["NA"]`, "approximate_form", `"sum"`, "confidence", "0.9", "data_fingerprint", "true", "design", design), 200, ""},
		{"a file with its name and type", cutForm, "--cut\r\nContent-Disposition: form-data; name=\"data\"; filename=\"r.csv\"\r\nContent-Type: text/csv\r\n\r\n" + rackCSV + "\r\n" + formOf("design", design), 200, ""},
		{"no file", cutForm, formOf("design", design), 400, "/data missing_field"},
		{"nothing", cutForm, "--cut--\r\n", 400, "/data missing_field /design missing_field"},
		{"an empty file", cutForm, formOf("design", design, "data", ""), 422, "/data "},
		{"a file twice", cutForm, formOf("design", design, "data", rackCSV, "data", rackCSV), 400, "/data duplicate_key"},
		{"a part twice", cutForm, formOf("design", design, "design", design, "data", rackCSV), 400, "/design duplicate_key"},
		{"an unknown part", cutForm, formOf("design", design, "data", rackCSV, "reponses", `["y"]`, "csv", `""`), 400, "/csv unknown_field /reponses unknown_field"},
		{"a part that is no JSON", cutForm, formOf("design", design, "data", rackCSV, "id", "study 7", "only", ""), 400, "/id not_json /only empty_body"},
		{"a design that is no JSON, and another fault", cutForm, formOf("design", `{"factors": [`, "data", rackCSV, "confidence", `"0.9"`), 400, "/confidence wrong_type /design not_json"},
		{"a faulty design and faulty readings", cutForm, formOf("design", `{"factors": [{"name": "rack", "levels": 0, "effect": "fixed"}]}`, "data", "rack,y\n1,NA\n2,3\n"), 422, "/data non_numeric_reading /design/factors/0/levels invalid_levels"},
		{"no boundary", "multipart/form-data", formOf("design", design), 400, " invalid_form"},
		{"another boundary", "multipart/form-data; boundary=other", formOf("design", design), 400, " invalid_form"},
		{"cut short", cutForm, strings.TrimSuffix(formOf("design", design, "data", rackCSV), "--cut--\r\n"), 400, " invalid_form"},
		{"a part without a name", cutForm, "--cut\r\n\r\nx\r\n--cut--\r\n", 400, " invalid_form"},
		{"a name that is not UTF-8", cutForm, formOf("\xff", "1"), 400, " invalid_form"},
		{"many parts", cutForm, strings.Repeat("--cut\r\nContent-Disposition: form-data; name=\"a\"\r\n\r\n1\r\n", 65) + "--cut--\r\n", 400, " invalid_form"},
	} {
		t.Run(c.name, func(t *testing.T) {
			answer := s.request(t, http.MethodPost, "/v1/anova", c.body, "Content-Type", c.media)
			got := ""
			if answer.status != http.StatusOK {
				var places []string
				for _, e := range answer.problem(t).Errors {
					places = append(places, e.Pointer+" "+string(e.Code))
				}
				got = strings.Join(places, " ")
			}
			if answer.status != c.status || !strings.HasPrefix(got, c.want) || c.want == "" && got != "" {
				t.Errorf("got %d %s, want %d %s\n%s", answer.status, got, c.status, c.want, answer.body)
			}
		})
	}
}

// TestFormEqualsJSON holds the three ways to send readings to one analysis.
func TestFormEqualsJSON(t *testing.T) {
	s := start(t, nil)
	design := rackDesign("")
	form := s.request(t, http.MethodPost, "/v1/anova", formOf("design", design, "data", rackCSV, "data_fingerprint", "true"), "Content-Type", cutForm)
	csv := s.post(t, "/v1/anova", `{"design": `+design+`, "csv": "rack,y\n2,4\n1,3\n", "data_fingerprint": true}`)
	columns := s.post(t, "/v1/anova", `{"design": `+design+`, "data": {"y": [3, 4], "rack": [1, 2]}, "data_fingerprint": true}`)
	if form.status != http.StatusOK || string(form.body) != string(columns.body) {
		t.Errorf("form:\n%s\nJSON:\n%s", form.body, columns.body)
	}
	if csv.status != http.StatusOK {
		t.Errorf("CSV in JSON: %s", csv.body)
	}
}
