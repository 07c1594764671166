package engine_test

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// codes lists faults as "code place".
func codes(faults []engine.Fault) string {
	var list []string
	for _, f := range faults {
		list = append(list, string(f.Code)+" "+f.Place)
	}
	return strings.Join(list, "; ")
}

func TestFaultsOfDesigns(t *testing.T) {
	long := strings.Repeat("n", 10000)
	for _, c := range []struct{ design, want string }{
		{`{"factors": []}`, "empty_design factors"},
		{`{"factors": [{"name": "", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": "` + long + `", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": " a", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": "a×b", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": "a,b", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": "a\nb", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{`{"factors": [{"name": "Residual", "levels": 2, "effect": "fixed"}]}`, "invalid_name factors/0/name"},
		{
			`{"factors": [{"name": "a", "levels": -1, "effect": "fixed"}, {"name": "a", "levels": 2, "effect": "random"}], "replicates": 0, "max_order": 0}`,
			"duplicate_name factors/1/name; invalid_levels factors/0/levels; invalid_replicates replicates; invalid_max_order max_order",
		},
		{`{"factors": [{"name": "a", "levels": 2, "effect": "fixed", "within": ["a"]}]}`, "nesting_cycle factors/0/within"},
		{
			`{"factors": [{"name": "a", "levels": 2, "effect": "fixed", "within": ["b"]}, {"name": "b", "levels": 2, "effect": "fixed", "within": ["c"]}, {"name": "c", "levels": 2, "effect": "fixed", "within": ["a"]}, {"name": "d", "levels": 2, "effect": "fixed", "within": ["e"]}, {"name": "e", "levels": 2, "effect": "fixed", "within": ["d"]}]}`,
			"nesting_cycle factors/0/within; nesting_cycle factors/3/within",
		},
		{
			`{"factors": [{"name": "a", "levels": 2, "effect": "fixed", "within": ["q", "b", "b"]}, {"name": "b", "levels": 2, "effect": "fixed"}]}`,
			"unknown_factor factors/0/within/0; repeated_factor factors/0/within/2",
		},
		{
			`{"factors": [{"name": "a", "levels": 4, "effect": "fixed", "population": 3}]}`,
			"population_below_levels factors/0/population; population_of_fixed factors/0/population; population_unrestricted factors/0/population",
		},
		{`{"factors": [{"name": "a", "levels": 2, "effect": "random", "population": 9007199254740992}], "constraint": "restricted"}`, "design_too_large factors/0/population"},
		{`{"factors": [{"name": "a", "levels": 9007199254740992, "effect": "random"}]}`, "design_too_large factors"},
		{`{"factors": [{"name": "a", "levels": 94906266, "effect": "random"}, {"name": "b", "levels": 94906266, "effect": "random"}]}`, "design_too_large factors"},
		{`{"factors": [{"name": "a", "levels": 2, "effect": "random"}], "replicates": 1e300}`, "design_too_large factors"},
		{`{"factors": [{"name": "a", "levels": ["x", "", "x"], "effect": "random"}]}`, "invalid_label factors/0/levels/1; duplicate_label factors/0/levels/2"},
		{
			`{"factors": [{"name": "a", "symbol": "ab", "levels": 2, "effect": "random"}, {"name": "b", "symbol": "x", "levels": 2, "effect": "random"}, {"name": "c", "symbol": "X", "levels": 2, "effect": "random"}]}`,
			"invalid_symbol factors/0/symbol; duplicate_symbol factors/2/symbol",
		},
		{
			`{"factors": [{"name": "a", "levels": 2, "effect": "random"}], "negligible": ["residual", ["b"], "a × a"]}`,
			"negligible_residual negligible/0; unknown_factor negligible/1/0; repeated_factor negligible/2",
		},
	} {
		d, faults := engine.Check(declare(t, c.design))
		if got := codes(faults); got != c.want || d != nil {
			t.Errorf("%.120s\n got %s\nwant %s", c.design, got, c.want)
		}
		for _, f := range faults {
			if len(f.Detail) > 600 || !strings.HasSuffix(strings.TrimRight(f.Detail, "?"), ".") && !strings.HasSuffix(f.Detail, "?") {
				t.Errorf("not a short sentence: %s", f.Detail)
			}
		}
	}
}

// Just below 2^53 a design is taken.
func TestLargestDesign(t *testing.T) {
	d := check(t, declare(t, `{"factors": [{"name": "a", "levels": 9007199254740991, "effect": "random"}]}`))
	if d.Observations() != 1<<53-1 || d.DF(d.Terms()[0]) != 1<<53-2 {
		t.Errorf("%d observations", d.Observations())
	}
}

// Every example in the catalogue that is about the design alone breaks its rule in the engine.
func TestCatalogueOfDesignRules(t *testing.T) {
	tried := 0
	for _, entry := range api.Catalogue() {
		if entry.Example.Path != "/v1/terms" || entry.Status != 422 || entry.Example.Body == "" {
			continue
		}
		var request struct{ Design *api.Design }
		if json.Unmarshal([]byte(entry.Example.Body), &request) != nil || request.Design == nil {
			continue
		}
		_, faults := engine.Check(request.Design)
		if faults == nil {
			continue // a bound on answers, or on the request's form
		}
		tried++
		if faults[0].Code != entry.Code || len(faults) != 1 {
			t.Errorf("%s: got %s", entry.Code, codes(faults))
		}
	}
	if tried < 19 {
		t.Errorf("only %d examples broke a rule", tried)
	}
}

// FuzzCheck: any text that is a design in Go is checked without a panic, and what passes keeps its promises.
func FuzzCheck(f *testing.F) {
	f.Add([]byte(`{"factors": [{"name": "a", "levels": 2, "effect": "fixed"}, {"name": "b", "levels": [1, "x"], "effect": "random", "within": ["a"], "population": 9}], "replicates": 2, "constraint": "restricted", "negligible": [["b"]], "max_order": 1}`))
	f.Add([]byte(`{"factors": [{"name": "a", "levels": 2, "effect": "fixed", "within": ["b"]}, {"name": "b", "levels": 2, "effect": "random", "within": ["a"]}]}`))
	f.Fuzz(func(t *testing.T, text []byte) {
		var declared api.Design
		if json.Unmarshal(text, &declared) != nil || len(declared.Factors) > 12 {
			return
		}
		d, faults := engine.Check(&declared)
		if (d == nil) == (len(faults) == 0) {
			t.Fatal("a design and faults, or neither")
		}
		if d == nil {
			return
		}
		total := int64(0)
		for _, s := range d.Terms() {
			total += d.DF(s)
			if got, fault := d.Resolve(api.TermRef{Text: d.Name(s)}); fault != nil || got != s {
				t.Fatalf("%s does not lead back: %v", d.Name(s), fault)
			}
		}
		if total != d.Observations()-1 {
			t.Fatalf("df add up to %d of %d", total, d.Observations())
		}
	})
}

// FuzzResolve: any text names a term or is a fault.
func FuzzResolve(f *testing.F) {
	d, faults := engine.Check(&api.Design{Factors: []api.Factor{
		{Name: "a", Levels: api.Levels{Count: 2}, Effect: api.Fixed}, {Name: "b", Levels: api.Levels{Count: 2}, Effect: api.Random, Within: []string{"a"}}, {Name: "c", Levels: api.Levels{Count: 3}, Effect: api.Random},
	}})
	if faults != nil {
		f.Fatal(faults)
	}
	for _, text := range []string{"a", "b(a)", "b × c(a)", "c×b", "residual", "((", "a,b", "b()", "×"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		for _, ref := range []api.TermRef{{Text: text}, {Factors: strings.Split(text, ",")}, {Parted: true, Crossed: strings.Split(text, "×"), Within: strings.Split(text, ",")}} {
			s, fault := d.Resolve(ref)
			if fault == nil && d.Index(s) < 0 {
				t.Fatalf("%v is %v, which is no term", ref, s)
			}
		}
	})
}

func TestDidYouMean(t *testing.T) {
	known := []string{"freezer", "box", "temperature"}
	for name, want := range map[string]string{"freezr": "freezer", "Freezer ": "freezer", "temperatur": "temperature", "tube": "", "": ""} {
		got := engine.DidYouMean(name, known)
		if want == "" && got != "" || want != "" && got != fmt.Sprintf(" Did you mean “%s”?", want) {
			t.Errorf("%q: %q", name, got)
		}
	}
}
