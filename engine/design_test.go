package engine_test

import (
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// declare reads a design from JSON.
func declare(t testing.TB, text string) *api.Design {
	t.Helper()
	var d api.Design
	if err := json.Unmarshal([]byte(text), &d); err != nil {
		t.Fatal(err)
	}
	return &d
}

// random declares a design of one to six factors with any nesting; names are in no particular order.
func random(r *rand.Rand) *api.Design {
	k := 1 + r.IntN(6)
	d := &api.Design{Replicates: new(api.Integer(1 + r.IntN(3)))}
	names := []string{"rack", "age", "box", "zone", "mill", "cup"}
	order := r.Perm(k)
	factors := make([]api.Factor, k)
	for rank, i := range order {
		f := api.Factor{Name: names[i], Levels: api.Levels{Count: int64(1 + r.IntN(4))}, Effect: []string{api.Fixed, api.Random}[r.IntN(2)]}
		for _, j := range order[:rank] {
			if r.IntN(4) == 0 {
				f.Within = append(f.Within, names[j])
			}
		}
		factors[i] = f
	}
	d.Factors = factors
	return d
}

func check(t testing.TB, declared *api.Design) *engine.Design {
	t.Helper()
	d, faults := engine.Check(declared)
	if faults != nil {
		t.Fatal(faults)
	}
	return d
}

// Degrees of freedom add up to N − 1, terms are down-closed and all there are, in the contract's order, and their names lead
// back to them in every form.
func TestTermsOfRandomDesigns(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 1))
	for range 500 {
		d := check(t, random(r))
		total, previous := int64(0), -1
		seen := map[string]bool{}
		for i, s := range d.Terms() {
			total += d.DF(s)
			if d.Closure(s) != s || d.Index(s) != i {
				t.Fatalf("%s is not down-closed, or not where it is", d.Name(s))
			}
			if s == d.Residual() {
				continue
			}
			if d.Order(s) < previous {
				t.Fatalf("%s comes after a term of more crossed factors", d.Name(s))
			}
			previous = d.Order(s)
			if seen[d.Name(s)] {
				t.Fatalf("two terms are named %s", d.Name(s))
			}
			seen[d.Name(s)] = true
			resolveAll(t, d, s)
		}
		if total != d.Observations()-1 {
			t.Fatalf("df add up to %d of %d observations", total, d.Observations())
		}
		if n := ideals(d); n != len(d.Terms())-1 {
			t.Fatalf("%d terms, counting by pairs gives %d", len(d.Terms())-1, n)
		}
	}
}

// ideals counts the sets of factors in which no factor is without one that it is nested in, pair by pair.
func ideals(d *engine.Design) int {
	n := 0
	for s := engine.Set(1); s <= d.All(); s++ {
		whole := true
		for i, f := range d.Factors() {
			for _, j := range f.Parents.Members() {
				if s.Has(i) && !s.Has(j) {
					whole = false
				}
			}
		}
		if whole {
			n++
		}
	}
	return n
}

func resolveAll(t *testing.T, d *engine.Design, s engine.Set) {
	t.Helper()
	crossed, within := d.Parts(s)
	loose := slices.Clone(crossed)
	slices.Reverse(loose)
	for _, ref := range []api.TermRef{
		{Text: d.Name(s)},
		{Text: strings.Join(loose, "×")},
		{Factors: crossed},
		{Factors: append(slices.Clone(within), loose...)},
		{Parted: true, Crossed: crossed, Within: within},
		{Parted: true, Crossed: loose},
	} {
		if got, fault := d.Resolve(ref); fault != nil || got != s {
			t.Fatalf("%v is %v %v, want %s", ref, got, fault, d.Name(s))
		}
	}
}

func TestResidualIsNamedInEveryForm(t *testing.T) {
	d := check(t, declare(t, `{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}, {"name": "box", "levels": 2, "effect": "random", "within": ["rack"]}]}`))
	for _, ref := range []api.TermRef{{Text: "residual"}, {Parted: true, Crossed: []string{}, Within: []string{"rack", "box"}}} {
		if got, fault := d.Resolve(ref); fault != nil || got != d.Residual() {
			t.Errorf("%v: %v %v", ref, got, fault)
		}
	}
}

func TestWhatIsNoTerm(t *testing.T) {
	d := check(t, declare(t, `{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}, {"name": "box", "levels": 2, "effect": "random", "within": ["rack"]}, {"name": "age", "levels": 2, "effect": "fixed"}]}`))
	for _, c := range []struct {
		ref   api.TermRef
		code  api.Code
		place string
	}{
		{api.TermRef{Text: "rack × box"}, api.UnknownTerm, ""},
		{api.TermRef{Text: "age(rack)"}, api.UnknownTerm, ""},
		{api.TermRef{Text: "box(rack"}, api.UnknownTerm, ""},
		{api.TermRef{Text: "box(rack) x"}, api.UnknownTerm, ""},
		{api.TermRef{Text: "× box"}, api.UnknownTerm, ""},
		{api.TermRef{Text: "bx(rack)"}, api.UnknownFactor, ""},
		{api.TermRef{}, api.UnknownTerm, ""},
		{api.TermRef{Factors: []string{"age", "bx"}}, api.UnknownFactor, "/1"},
		{api.TermRef{Factors: []string{"age", "age"}}, api.RepeatedFactor, "/1"},
		{api.TermRef{Parted: true, Crossed: []string{"box", "rack"}}, api.UnknownTerm, ""},
		{api.TermRef{Parted: true, Crossed: []string{"box"}, Within: []string{"age"}}, api.UnknownTerm, ""},
		{api.TermRef{Parted: true, Crossed: []string{"box"}, Within: []string{"rak"}}, api.UnknownFactor, "/within/0"},
		{api.TermRef{Parted: true, Within: []string{"rack"}}, api.UnknownTerm, ""},
	} {
		s, fault := d.Resolve(c.ref)
		if fault == nil || fault.Code != c.code || fault.Place != c.place {
			t.Errorf("%+v is %v, %v; want %s at %q", c.ref, s, fault, c.code, c.place)
		}
	}
}

// Formulas of df, with the numbers put in, give the df.
func TestFormulasOfDF(t *testing.T) {
	r := rand.New(rand.NewPCG(2, 2))
	for range 200 {
		d := check(t, random(r))
		values := map[byte]int64{'n': d.Replicates()}
		for _, f := range d.Factors() {
			values[f.Symbol[0]+'a'-'A'] = f.Levels
		}
		for _, s := range d.Terms() {
			if got := product(t, d.DFFormula(s), values); got != d.DF(s) {
				t.Fatalf("%s: %s is %d, want %d", d.Name(s), d.DFFormula(s), got, d.DF(s))
			}
		}
	}
}

// product evaluates products of letters and of (letter - 1); "a - 1" alone too.
func product(t *testing.T, formula string, values map[byte]int64) int64 {
	t.Helper()
	if len(formula) == 5 && formula[1:] == " - 1" {
		formula = "(" + formula + ")"
	}
	result := int64(1)
	for formula != "" {
		if formula[0] == '(' {
			if len(formula) < 7 || formula[2:7] != " - 1)" {
				t.Fatalf("cannot read %q", formula)
			}
			result *= values[formula[1]] - 1
			formula = formula[7:]
			continue
		}
		value, known := values[formula[0]]
		if !known {
			t.Fatalf("cannot read %q", formula)
		}
		result *= value
		formula = formula[1:]
	}
	return result
}

func TestSymbols(t *testing.T) {
	d := check(t, declare(t, `{"factors": [{"name": "x", "levels": 2, "effect": "fixed"}, {"name": "y", "symbol": "a", "levels": 2, "effect": "fixed"}, {"name": "z", "levels": 2, "effect": "random", "within": ["y"]}]}`))
	got := ""
	for _, f := range d.Factors() {
		got += f.Symbol
	}
	if got != "BAC" {
		t.Errorf("symbols %s, want those given, and the next free letters", got)
	}
	if s := d.Symbols(d.All()); s != "BC(A)" {
		t.Errorf("the highest term is %s in symbols", s)
	}
}

func TestSixteenFactors(t *testing.T) {
	declared := &api.Design{MaxOrder: new(api.Integer(2))}
	for i := range engine.MaxFactors {
		declared.Factors = append(declared.Factors, api.Factor{Name: fmt.Sprint("f", i), Levels: api.Levels{Count: 2}, Effect: api.Random})
	}
	d := check(t, declared)
	if len(d.Terms()) != 1<<16 || d.NegligibleCount() != 1<<16-1-16-120 {
		t.Errorf("%d terms, %d negligible", len(d.Terms()), d.NegligibleCount())
	}
	if last := d.Factors()[15].Symbol; last != "Q" {
		t.Errorf("the last symbol is %s", last)
	}
}
