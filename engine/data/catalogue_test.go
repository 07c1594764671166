package data

import (
	"encoding/json"
	"slices"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// Every rule on data is broken by its example, which gives that very code.
func TestCatalogue(t *testing.T) {
	first := false
	rules := 0
	for _, entry := range api.Catalogue() {
		if first = first || entry.Code == api.RepeatedResponse; !first {
			continue
		}
		rules++
		parts, err := Split([]byte(entry.Example.Body), "data", "csv")
		if err != nil {
			t.Errorf("%s: %v", entry.Code, err)
			continue
		}
		var request api.AnovaRequest
		if err := json.Unmarshal(parts.Envelope, &request); err != nil {
			t.Errorf("%s: %v", entry.Code, err)
			continue
		}
		design, faults := engine.Check(request.Design)
		if faults != nil {
			t.Errorf("%s: %v", entry.Code, faults)
			continue
		}
		plan := Plan{Responses: request.Responses, Missing: request.Missing, MaxRows: api.RowLimitOfExample}
		for _, f := range design.Factors() {
			plan.Factors = append(plan.Factors, f.Name)
		}
		var columns *Columns
		if parts.Bulk[0].Text != nil {
			columns, faults, err = ScanJSON(parts.Bulk[0].Text, plan)
		} else {
			columns, faults, err = ScanCSVString(parts.Bulk[1].Text, plan)
		}
		if err != nil {
			t.Errorf("%s: %v", entry.Code, err)
		}
		if faults == nil {
			_, faults = Lay(design, columns)
		}
		if !slices.ContainsFunc(faults, func(f engine.Fault) bool { return f.Code == entry.Code }) || entry.Status != 422 {
			t.Errorf("%s: its example gives %+v", entry.Code, faults)
		}
		for _, f := range faults {
			t.Logf("%s: %s: %s", f.Code, f.Place, f.Detail)
		}
	}
	if rules != 21 {
		t.Errorf("%d rules", rules)
	}
}
