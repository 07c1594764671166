package engine

import (
	"strings"

	"guardrow/api"
)

// Names returns the names of the factors in s, in the order of declaration.
func (d *Design) Names(s Set) []string {
	names := make([]string, 0, s.Len())
	for _, i := range (s & d.all).Members() {
		names = append(names, d.factors[i].Name)
	}
	return names
}

// Parts returns term s as the factors that are crossed in it and those that these are nested in.
func (d *Design) Parts(s Set) (crossed, within []string) {
	c := d.Crossed(s)
	return d.Names(c), d.Names(s &^ c)
}

// Name returns the one name of term s, such as "box × tube(temperature, freezer)".
func (d *Design) Name(s Set) string {
	crossed, within := d.Parts(s)
	return api.TermName(crossed, within)
}

// Symbols returns term s in the factors' symbols, such as "CD(AB)"; for the residual it is empty.
func (d *Design) Symbols(s Set) string {
	if s == d.Residual() {
		return ""
	}
	crossed := d.Crossed(s)
	var text, bracket strings.Builder
	for _, i := range s.Members() {
		if crossed.Has(i) {
			text.WriteString(d.factors[i].Symbol)
		} else {
			bracket.WriteString(d.factors[i].Symbol)
		}
	}
	if bracket.Len() > 0 {
		return text.String() + "(" + bracket.String() + ")"
	}
	return text.String()
}

// LevelSymbols returns the product of the level counts of the factors in s as a formula: lower-case symbols in the order
// of declaration, then n for the observation; empty for the empty set.
func (d *Design) LevelSymbols(s Set) string {
	var text strings.Builder
	for _, i := range s.Members() {
		text.WriteString(d.levelSymbol(i))
	}
	return text.String()
}

func (d *Design) levelSymbol(i int) string {
	if i == MaxFactors {
		return "n"
	}
	return strings.ToLower(d.factors[i].Symbol)
}

// DFFormula returns the degrees of freedom of term s in level symbols, such as "ab(c - 1)(d - 1)".
func (d *Design) DFFormula(s Set) string {
	crossed := d.Crossed(s)
	lead := d.LevelSymbols(s &^ crossed)
	if lead == "" && crossed.Len() == 1 {
		return d.LevelSymbols(crossed) + " - 1"
	}
	var text strings.Builder
	text.WriteString(lead)
	for _, i := range crossed.Members() {
		text.WriteString("(" + d.levelSymbol(i) + " - 1)")
	}
	return text.String()
}
