package answer

import (
	"fmt"

	"guardrow/api"
	"guardrow/engine"
)

// Terms answers /v1/terms.
func Terms(request *api.TermsRequest) (*api.TermsAnswer, []engine.Fault) {
	d, faults := check(request.Design)
	if faults != nil {
		return nil, faults
	}
	chosen, faults := only(d, request.Only)
	if faults != nil {
		return nil, faults
	}
	n := newNamer(d)
	answer := &api.TermsAnswer{Title: d.Title(), Observations: d.Observations(), Factors: n.factors(), Terms: []api.TermLine{}, Impossible: impossible(d)}
	if request.Only == nil {
		chosen = d.Terms()
		if len(chosen) > MaxTerms {
			chosen, answer.AboveOrder = withinOrder(d)
		}
	}
	if len(chosen) > MaxTerms {
		return nil, []engine.Fault{tooManyTerms(len(chosen))}
	}
	for _, s := range chosen {
		answer.Terms = append(answer.Terms, api.TermLine{
			Term: n.term(s), Effect: n.effect(s), Order: d.Order(s), DF: d.DF(s), DFFormula: d.DFFormula(s), Negligible: d.Negligible(s),
		})
	}
	return answer, nil
}

// withinOrder returns the terms that max_order keeps, and one entry that stands for the others; nil where all are kept.
func withinOrder(d *engine.Design) ([]engine.Set, *api.AboveOrder) {
	above := &api.AboveOrder{AboveOrder: d.MaxOrder()}
	var kept []engine.Set
	for _, s := range d.Terms() {
		if d.AboveOrder(s) {
			above.Terms++
			above.DF += d.DF(s)
		} else {
			kept = append(kept, s)
		}
	}
	if above.Terms == 0 {
		return kept, nil
	}
	return kept, above
}

// impossible lists the pairs of factors that have no interaction because one is nested in the other.
func impossible(d *engine.Design) []api.Impossible {
	list := []api.Impossible{}
	factors := d.Factors()
	for inner, f := range factors {
		for _, outer := range f.Above.Members() {
			o, i := factors[outer].Name, f.Name
			list = append(list, api.Impossible{
				Factors: []string{o, i}, Because: "nested",
				Detail: fmt.Sprintf("There is no %s × %s: each level of %s occurs within one level of %s only, so no level of %s is ever seen under another. Its variation is in the term %s.", o, i, i, o, i, d.Name(d.Closure(engine.SetOf(inner)))),
			})
		}
	}
	return list
}
