package answer

import (
	"fmt"
	"slices"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// check checks a request's design; the faults' places begin with "design/".
func check(declared *api.Design) (*engine.Design, []engine.Fault) {
	d, faults := engine.Check(declared)
	for i := range faults {
		faults[i].Place = "design/" + faults[i].Place
	}
	return d, faults
}

// only resolves a request's list of terms, in the contract's order and each once; nil where there is no list.
func only(d *engine.Design, refs []api.TermRef) ([]engine.Set, []engine.Fault) {
	if refs == nil {
		return nil, nil
	}
	var faults []engine.Fault
	sets := make([]engine.Set, 0, len(refs))
	for i, ref := range refs {
		s, fault := d.Resolve(ref)
		if fault != nil {
			fault.Place = fmt.Sprintf("only/%d%s", i, fault.Place)
			faults = append(faults, *fault)
			continue
		}
		sets = append(sets, s)
	}
	slices.SortFunc(sets, func(a, b engine.Set) int { return d.Index(a) - d.Index(b) })
	return slices.Compact(sets), faults
}

// lines returns the lines that an answer lists: those of only, or all. Terms of only that have no line, and a list that is
// too long, are faults. With tests, the residual is left out of the whole list and is a fault in only.
func lines(m *ems.Model, refs []api.TermRef, tests bool) ([]engine.Set, []engine.Fault) {
	d := m.Design
	chosen, faults := only(d, refs)
	if faults != nil {
		return nil, faults
	}
	if refs == nil {
		for _, l := range m.Lines {
			if !tests || l.Set != d.Residual() {
				chosen = append(chosen, l.Set)
			}
		}
	}
	if len(chosen) > MaxTerms {
		return nil, []engine.Fault{tooManyTerms(len(chosen))}
	}
	for i, ref := range refs {
		s, _ := d.Resolve(ref)
		place := fmt.Sprintf("only/%d", i)
		switch {
		case m.Line(s) < 0:
			faults = append(faults, engine.Fault{Code: api.NoSuchLine, Place: place, Detail: fmt.Sprintf("The term %s is negligible in this design, so it has no line of its own. Leave it out of \"only\", or keep it in the model.", engine.Quote(d.Name(s)))})
		case tests && s == d.Residual():
			faults = append(faults, engine.Fault{Code: api.NoSuchLine, Place: place, Detail: "The residual tests other terms and has no test itself. Leave it out of \"only\"."})
		}
	}
	if faults != nil {
		return nil, faults
	}
	if limit := maxComponents(d); m.CountComponents(chosen, limit) > limit {
		return nil, []engine.Fault{{Code: api.TooManyComponents, Place: "design", Detail: fmt.Sprintf("The expectations of the %d lines asked for hold more than %d components. Name fewer lines in \"only\", or set \"max_order\" so that interactions of many factors are taken as negligible.", len(chosen), limit)}}
	}
	return chosen, nil
}

func tooManyTerms(n int) engine.Fault {
	return engine.Fault{Code: api.TooManyTerms, Place: "design", Detail: fmt.Sprintf("The design has %d terms; an answer lists at most %d. Name those you need in \"only\", or set \"max_order\" so that interactions of more factors than that are taken as negligible.", n, MaxTerms)}
}
