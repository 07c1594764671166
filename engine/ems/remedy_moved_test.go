package ems_test

import (
	"slices"
	"testing"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// A is negligible and pools into A × B. Where A × B is assumed zero too, A's degrees of freedom move to A × B × C, which has
// none of its own, and so becomes testable. The random reference found that this remedy was missing.
func TestRemedyByTermsThatWerePooled(t *testing.T) {
	d, faults := engine.Check(&api.Design{
		Factors: []api.Factor{
			{Name: "A", Levels: api.Levels{Count: 2}, Effect: api.Fixed},
			{Name: "B", Levels: api.Levels{Count: 1}, Effect: api.Random},
			{Name: "C", Levels: api.Levels{Count: 1}, Effect: api.Random},
		},
		Replicates: new(api.Integer(2)),
		Negligible: []api.TermRef{{Text: "A"}, {Text: "A × C"}},
	})
	if faults != nil {
		t.Fatal(faults)
	}
	m := ems.New(d)
	remedies := m.Remedies(m.NewSolver().Test(d.All()), &ems.Budget{Steps: 1_000_000})
	found := slices.ContainsFunc(remedies.List, func(r ems.Remedy) bool {
		return len(r.Zero) == 1 && d.Name(r.Zero[0]) == "A × B" && r.Test.Exact()
	})
	if !found || !remedies.Complete {
		t.Errorf("A × B is not among the remedies: %+v", remedies.List)
	}
}
