package service

import (
	"fmt"
	"net/http"
	"strings"
	"testing"

	"guardrow/api"
)

// Designs of the tests: invented.
const rackFactor = `{"name": "rack", "levels": 2, "effect": "fixed"}`

func rackDesign(rest string) string { return `{"factors": [` + rackFactor + `]` + rest + `}` }

// TestBadInput posts what should not be posted, and demands every fault at its place.
func TestBadInput(t *testing.T) {
	s := start(t, nil)
	long := strings.Repeat("x", 10000)
	for _, c := range []struct {
		name, path, body string
		status           int
		want             []string // "pointer code", in the order of the answer
	}{
		{"empty body", "/v1/terms", "", 400, []string{" empty_body"}},
		{"blank body", "/v1/tests", " \n\t", 400, []string{" empty_body"}},
		{"not JSON", "/v1/terms", `{"design": }`, 400, []string{" not_json"}},
		{"cut short", "/v1/terms", `{"design": {`, 400, []string{" not_json"}},
		{"NaN", "/v1/tests", `{"design": ` + rackDesign("") + `, "components": [{"term": "residual", "variance": NaN}]}`, 400, []string{" not_json"}},
		{"NaN as text", "/v1/tests", `{"design": ` + rackDesign("") + `, "components": [{"term": "residual", "variance": "NaN"}]}`, 400, []string{"/components/0/variance wrong_type"}},
		{"comment", "/v1/terms", `{"design": ` + rackDesign("") + `} // rack`, 400, []string{" trailing_text"}},
		{"two values", "/v1/terms", `{}{}`, 400, []string{" trailing_text"}},
		{"a list", "/v1/terms", `[]`, 400, []string{" not_an_object"}},
		{"a text", "/v1/terms", `"design"`, 400, []string{" not_an_object"}},
		{"byte order mark", "/v1/terms", "\ufeff{}", 400, []string{" not_json"}},
		{"not UTF-8", "/v1/terms", "{\"id\": \"\xff\"}", 400, []string{" invalid_utf8"}},
		{"UTF-16", "/v1/terms", "\xfe\xff\x00{\x00}", 400, []string{" invalid_utf8"}},
		{"half a surrogate pair", "/v1/terms", `{"id": "\ud800"}`, 400, []string{" not_json"}},
		{"deep in an unknown field", "/v1/terms", `{"x": ` + strings.Repeat(`{"x":`, 1000) + "1" + strings.Repeat("}", 1000) + `}`, 400, []string{" too_deep"}},
		{"deep in the readings", "/v1/anova", `{"data": ` + strings.Repeat(`[`, 100000) + strings.Repeat("]", 100000) + `}`, 400, []string{" too_deep"}},
		{"an empty object", "/v1/terms", `{}`, 400, []string{"/design missing_field"}},
		{"an empty object for an analysis", "/v1/anova", `{}`, 400, []string{"/data missing_field", "/design missing_field"}},
		{"null for an object", "/v1/terms", `{"design": null}`, 400, []string{"/design wrong_type"}},
		{"fields in other letters", "/v1/terms", `{"Design": ` + rackDesign("") + `}`, 400, []string{"/Design unknown_field", "/design missing_field"}},
		{"an escaped name is the name", "/v1/terms", `{"d\u0065sign": ` + rackDesign("") + `, "design": ` + rackDesign("") + `}`, 400, []string{"/design duplicate_key"}},
		{"twice, deep within", "/v1/terms", `{"design": {"factors": [{"name": "a", "name": "b", "levels": 2, "effect": "fixed", "effect": "random"}]}}`, 400, []string{"/design/factors/0/effect duplicate_key", "/design/factors/0/name duplicate_key"}},
		{"readings twice", "/v1/anova", `{"design": ` + rackDesign("") + `, "data": {"rack": [1, 2], "y": [1, 2]}, "data": {}}`, 400, []string{"/data duplicate_key"}},
		{"readings in both forms", "/v1/anova", `{"design": ` + rackDesign("") + `, "data": {}, "csv": ""}`, 400, []string{"/csv conflicting_fields"}},
		{"readings where there are none", "/v1/terms", `{"design": ` + rackDesign("") + `, "data": {"rack": [1, 2]}}`, 400, []string{"/data unknown_field"}},
		{"readings as a list", "/v1/anova", `{"design": ` + rackDesign("") + `, "data": [1, 2]}`, 400, []string{"/data wrong_type"}},
		{"CSV as an object", "/v1/anova", `{"design": ` + rackDesign("") + `, "csv": {"rack": [1, 2]}}`, 400, []string{"/csv wrong_type"}},
		{"readings that are no JSON", "/v1/anova", `{"design": ` + rackDesign("") + `, "data": {"rack": [1, 2], "y": [1.5, .5]}}`, 400, []string{"/data not_json"}},
		{"both parts wrong", "/v1/anova", `{"design": {"factors": 1}, "data": {"rack": [1, 2], "y": [1.5, NaN]}}`, 400, []string{"/data not_json", "/design/factors wrong_type"}},
		{"every union", "/v1/tests", `{"id": 1.5, "design": {"factors": [{"name": 1, "levels": 2.5, "effect": "fixed"}, {"name": "b", "levels": [1, true, null, [], {}], "effect": 7}], "negligible": [3, {"crossed": "a", "with": []}]}, "only": {"crossed": []}}`, 400, []string{
			"/design/factors/0/levels wrong_type", "/design/factors/0/name wrong_type", "/design/factors/1/effect wrong_type", "/design/factors/1/levels/1 wrong_type",
			"/design/factors/1/levels/2 wrong_type", "/design/factors/1/levels/3 wrong_type", "/design/factors/1/levels/4 wrong_type",
			"/design/negligible/0 wrong_type", "/design/negligible/1/crossed wrong_type", "/design/negligible/1/with unknown_field", "/id wrong_type", "/only wrong_type",
		}},
		{"a list for a text", "/v1/terms", `{"design": {"factors": [{"name": "a", "levels": 2, "effect": "random", "within": "b"}]}}`, 400, []string{"/design/factors/0/within wrong_type"}},
		{"a place with escapes", "/v1/terms", `{"a/b~c": 1, "design": ` + rackDesign("") + `}`, 400, []string{"/a~1b~0c unknown_field"}},
		{"a long unknown field", "/v1/terms", `{"` + long + `": 1, "design": ` + rackDesign("") + `}`, 400, []string{" unknown_field"}},
		{"a long word", "/v1/terms", `{"design": ` + rackDesign(`, "constraint": "`+long+`"`) + `}`, 400, []string{"/design/constraint not_in_enumeration"}},
		{"form before values", "/v1/terms", `{"id": 1e999, "design": {"factors": [{"name": "", "levels": 0, "effect": "fix"}]}}`, 400, []string{"/design/factors/0/effect not_in_enumeration"}},

		{"no factors", "/v1/terms", `{"design": {"factors": []}}`, 422, []string{"/design/factors empty_design"}},
		{"a long name", "/v1/terms", `{"design": {"factors": [{"name": "` + long + `", "levels": 2, "effect": "fixed"}]}}`, 422, []string{"/design/factors/0/name invalid_name"}},
		{"zero and negative levels", "/v1/terms", `{"design": {"factors": [{"name": "a", "levels": 0, "effect": "fixed"}, {"name": "b", "levels": -3, "effect": "fixed"}, {"name": "c", "levels": [], "effect": "fixed"}]}}`, 422, []string{"/design/factors/0/levels invalid_levels", "/design/factors/1/levels invalid_levels", "/design/factors/2/levels invalid_levels"}},
		{"a cycle, an unknown parent, a name twice", "/v1/terms", `{"design": {"factors": [{"name": "a", "levels": 2, "effect": "fixed", "within": ["b"]}, {"name": "b", "levels": 2, "effect": "fixed", "within": ["a", "z"]}, {"name": "a", "levels": 2, "effect": "fixed"}]}}`, 422, []string{"/design/factors/0/within nesting_cycle", "/design/factors/1/within/1 unknown_factor", "/design/factors/2/name duplicate_name"}},
		{"population below levels", "/v1/terms", `{"design": {"factors": [{"name": "a", "levels": 5, "effect": "random", "population": 4}], "constraint": "restricted"}}`, 422, []string{"/design/factors/0/population population_below_levels"}},
		{"numbers beyond a double, among others", "/v1/tests", `{"design": {"factors": [{"name": "a,b", "levels": [-1e999, 1e400], "effect": "random"}]}, "components": [{"term": "residual", "variance": 1e309}]}`, 422, []string{
			"/components/0/variance number_out_of_range", "/design/factors/0/levels/0 number_out_of_range", "/design/factors/0/levels/1 number_out_of_range", "/design/factors/0/name invalid_name",
		}},
		{"a number with a large exponent for a count", "/v1/terms", `{"design": ` + rackDesign(`, "replicates": 1e999999999`) + `}`, 422, []string{"/design/factors design_too_large", "/design/replicates number_out_of_range"}},
		{"bounds that the engine does not look at", "/v1/terms", `{"id": "` + long + `", "design": ` + rackDesign(`, "title": "`+long+`"`) + `}`, 422, []string{"/design/title out_of_bounds", "/id out_of_bounds"}},
		{"a symbol of no letters", "/v1/terms", `{"design": {"factors": [{"name": "a", "symbol": "", "levels": 2, "effect": "fixed"}]}}`, 422, []string{"/design/factors/0/symbol out_of_bounds"}},
		{"confidence of 1", "/v1/anova", `{"design": ` + rackDesign("") + `, "data": {"rack": [1, 2], "y": [3, 4]}, "confidence": 1}`, 422, []string{"/confidence invalid_confidence"}},
		{"design and readings at once", "/v1/anova", `{"design": {"factors": [{"name": "rack", "levels": 0, "effect": "fixed"}]}, "data": {"rack": [1, 2], "y": [3, null]}}`, 422, []string{"/data/y/1 lost_reading", "/design/factors/0/levels invalid_levels"}},
	} {
		t.Run(c.name, func(t *testing.T) {
			answer := s.post(t, c.path, c.body)
			var got []string
			for _, e := range answer.problem(t).Errors {
				got = append(got, e.Pointer+" "+string(e.Code))
				if !strings.HasSuffix(e.Detail, ".") && !strings.HasSuffix(e.Detail, "?") {
					t.Errorf("not a sentence: %s", e.Detail)
				}
			}
			if answer.status != c.status || strings.Join(got, "\n") != strings.Join(c.want, "\n") {
				t.Errorf("got %d\n%s\nwant %d\n%s\n%s", answer.status, strings.Join(got, "\n"), c.status, strings.Join(c.want, "\n"), answer.body)
			}
			if len(answer.body) > 1000+500*len(c.want) {
				t.Errorf("an answer of %d bytes repeats too much of the request", len(answer.body))
			}
		})
	}
}

// TestErrorsAreCapped sends more faults than are listed, of form and of value.
func TestErrorsAreCapped(t *testing.T) {
	s := start(t, nil)
	for name, body := range map[string]string{
		"form":  `{"design": {"factors": [{"name": "a", "effect": "fixed", "levels": [` + strings.Repeat("null, ", 249) + `null]}]}}`,
		"value": `{"design": {"factors": [{"name": "a", "effect": "fixed", "levels": [` + strings.Repeat(`"", `, 124) + `""]}]}}`, // each empty; from the second on, each twice
	} {
		p := s.post(t, "/v1/terms", body).problem(t)
		if len(p.Errors) != maxErrors || !strings.Contains(p.Detail, "first 100") || !strings.HasPrefix(p.Detail, "2") {
			t.Errorf("%s: %d errors, %s", name, len(p.Errors), p.Detail)
		}
		for i, e := range p.Errors {
			if name == "form" && e.Pointer != fmt.Sprintf("/design/factors/0/levels/%d", i) {
				t.Errorf("error %d is at %s", i, e.Pointer)
			}
		}
	}
}

// TestNearestField holds the service to name the field that was meant.
func TestNearestField(t *testing.T) {
	s := start(t, nil)
	for _, c := range []struct{ body, want string }{
		{`{"design": {"factors": [{"name": "a", "level": 2, "effect": "fixed"}]}}`, "levels"},
		{`{"desing": {}}`, "design"},
		{`{"design": {"factors": [{"name": "a", "levels": 2, "effect": "fixd"}]}}`, "fixed"},
	} {
		if p := s.post(t, "/v1/terms", c.body).problem(t); !strings.Contains(fmt.Sprint(p.Errors), "Did you mean “"+c.want+"”?") {
			t.Errorf("%s: %v", c.body, p.Errors)
		}
	}
}

// TestWhatIsTaken posts unusual requests that are right.
func TestWhatIsTaken(t *testing.T) {
	s := start(t, nil)
	for name, body := range map[string]string{
		"whole numbers in other forms": `{"design": ` + rackDesign(`, "replicates": 20e-1, "max_order": 1.0`) + `}`,
		"escapes":                      `{"\u0064esign": {"factors": [{"name": "r\u00e4ck\/1", "levels": ["\u00e4", "\""], "effect": "f\u0069xed"}]}}`,
		"white space":                  "\r\n\t {\"design\" :\n" + rackDesign("") + " }\n",
		"id first, last, alone":        `{"id":7,"design":` + rackDesign("") + `,"only":[]}`,
		"labels of both kinds":         `{"design": {"factors": [{"name": "a", "levels": [1, "two", 3.5, -0.0], "effect": "fixed"}]}}`,
		"a term in three forms":        `{"design": ` + rackDesign("") + `, "only": ["rack", ["rack"], {"crossed": ["rack"], "within": []}]}`,
		"a name of 200 characters":     `{"design": {"factors": [{"name": "` + strings.Repeat("ä", 200) + `", "levels": 2, "effect": "fixed"}]}}`,
	} {
		if answer := s.post(t, "/v1/terms", body); answer.status != http.StatusOK {
			t.Errorf("%s: %d %s", name, answer.status, answer.body)
		}
	}
}

// TestIDAndFingerprint holds the echo of the id, and what the fingerprint covers: the request in canonical form, without id
// and readings, whatever their place and form.
func TestIDAndFingerprint(t *testing.T) {
	s := start(t, nil)
	digest := func(path, body string) (id, fingerprint string) {
		t.Helper()
		answer := s.post(t, path, body)
		var head struct {
			api.Envelope
		}
		if answer.status != http.StatusOK {
			t.Fatalf("%s: %s", body, answer.body)
		}
		decodeInto(t, answer.body, &head)
		if head.Engine != testVersion {
			t.Errorf("the engine is %q", head.Engine)
		}
		return string(head.ID), head.Fingerprint
	}
	_, base := digest("/v1/terms", `{"design":{"factors":[{"name":"rack","levels":2,"effect":"fixed"}]}}`)
	// The canonical text by hand from RFC 8785, its sum from GNU coreutils:
	// printf %s '{"design":{"factors":[{"effect":"fixed","levels":2,"name":"rack"}]}}' | sha256sum
	if want := "6b61968eea5e1a54f7980bfe3a4da0cd0fd8a9b44e75225862011c1c50d6baee"; base != want {
		t.Errorf("the fingerprint is %s", base)
	}
	for _, c := range []struct{ path, body, id string }{
		{"/v1/terms", `{"id": "a", "design": ` + rackDesign("") + `}`, `"a"`},
		{"/v1/terms", `{"design": ` + rackDesign("") + `, "id": 12 }`, `12`},
		{"/v1/terms", `{ "id" : "é\n" , "design": {"factors": [{"effect": "fixed", "levels": 2.0, "name": "rack"}]}}`, `"é\n"`},
		{"/v1/anova", `{"data": {"rack": [1, 2], "y": [1, 2]}, "id": "", "design": ` + rackDesign("") + `}`, `""`},
		{"/v1/anova", `{"design": ` + rackDesign("") + `, "csv": "rack,y\n1,1\n2,2\n"}`, ""},
	} {
		id, got := digest(c.path, c.body)
		if id != c.id || got != base {
			t.Errorf("%s: id %s, fingerprint %s, want %s, %s", c.body, id, got, c.id, base)
		}
	}
	if _, other := digest("/v1/terms", `{"design":`+rackDesign(`, "replicates": 1`)+`}`); other == base {
		t.Error("another request has the same fingerprint")
	}
}
