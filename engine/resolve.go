package engine

import (
	"fmt"
	"strings"

	"guardrow/api"
)

// Resolve returns the term that a caller names, in any of the forms of api.TermRef. In the list form, and in the crossed
// part of the others, the factors that a named factor is nested in may be left out. The fault's place is relative to the
// reference: empty, or such as "/1".
func (d *Design) Resolve(ref api.TermRef) (Set, *Fault) {
	switch {
	case ref.Parted:
		return d.parted(ref, ref.Crossed, ref.Within, "/crossed", "/within")
	case ref.Text != "":
		crossed, within, ok := split(ref.Text)
		if !ok {
			return 0, &Fault{api.UnknownTerm, "", fmt.Sprintf("%s is not the name of a term. Write it as in the answer of /v1/terms, such as %s, or as a list of factor names.", Quote(ref.Text), Quote(d.exampleName()))}
		}
		if len(crossed) == 1 && crossed[0] == api.Residual && len(within) == 0 {
			return d.Residual(), nil
		}
		return d.parted(ref, crossed, within, "", "")
	}
	s, fault := d.gather(ref.Factors, "", len(ref.Factors) > 0)
	if fault != nil {
		return 0, fault
	}
	if s == 0 {
		return 0, &Fault{api.UnknownTerm, "", "The list of factors is empty, so it names no term. Name at least one factor."}
	}
	return d.Closure(s), nil
}

// parted resolves a term given by its crossed factors and those they are nested in.
func (d *Design) parted(ref api.TermRef, crossed, within []string, atCrossed, atWithin string) (Set, *Fault) {
	indexed := atCrossed != ""
	c, fault := d.gather(crossed, atCrossed, indexed)
	if fault != nil {
		return 0, fault
	}
	w, fault := d.gather(within, atWithin, indexed)
	if fault != nil {
		return 0, fault
	}
	if c == 0 {
		if w == d.all {
			return d.Residual(), nil
		}
		return 0, &Fault{api.UnknownTerm, "", "The term names no crossed factor. Name at least one, or all factors within for the residual."}
	}
	s := d.Closure(c)
	if d.Crossed(s) != c {
		return 0, &Fault{api.UnknownTerm, "", fmt.Sprintf("%s is not a term: one of its factors is nested in another, and a factor has no interaction with what it is nested in. See \"impossible\" in the answer of /v1/terms.", Quote(ref.String()))}
	}
	if !(s &^ c).Holds(w) {
		return 0, &Fault{api.UnknownTerm, "", fmt.Sprintf("%s is not a term: its factors are nested in other factors than those it names. It is written %s here.", Quote(ref.String()), Quote(d.Name(s)))}
	}
	return s, nil
}

// gather turns names into a set; with indexed, a fault's place says which name.
func (d *Design) gather(names []string, place string, indexed bool) (Set, *Fault) {
	var s Set
	for i, name := range names {
		at := place
		if indexed {
			at = fmt.Sprintf("%s/%d", place, i)
		}
		f := d.find(name)
		switch {
		case f < 0:
			return 0, &Fault{api.UnknownFactor, at, fmt.Sprintf("No factor is named %s.%s", Quote(name), DidYouMean(name, d.Names(d.all)))}
		case s.Has(f):
			return 0, &Fault{api.RepeatedFactor, at, fmt.Sprintf("The factor %s is named twice. Name it once.", Quote(name))}
		}
		s |= SetOf(f)
	}
	return s, nil
}

func (d *Design) find(name string) int {
	for i, f := range d.factors {
		if f.Name == name {
			return i
		}
	}
	return -1
}

func (d *Design) exampleName() string { return d.Name(d.terms[max(0, len(d.terms)-2)]) }

// split takes a term's name apart: "a × b(c, d)". Blanks around the parts do not matter.
func split(text string) (crossed, within []string, ok bool) {
	head, rest, bracketed := strings.Cut(text, "(")
	if bracketed {
		inner, after, closed := strings.Cut(rest, ")")
		if !closed || strings.TrimSpace(after) != "" {
			return nil, nil, false
		}
		within = strings.Split(inner, ",")
	}
	crossed = strings.Split(head, "×")
	for _, parts := range [][]string{crossed, within} {
		for i := range parts {
			parts[i] = strings.TrimSpace(parts[i])
			if parts[i] == "" {
				return nil, nil, false
			}
		}
	}
	return crossed, within, true
}
