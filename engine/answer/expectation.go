package answer

import (
	"strings"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// ExpectedMeanSquares answers /v1/expected-mean-squares.
func ExpectedMeanSquares(request *api.ExpectedMeanSquaresRequest) (*api.ExpectedMeanSquaresAnswer, []engine.Fault) {
	d, faults := check(request.Design)
	if faults != nil {
		return nil, faults
	}
	m := ems.New(d)
	chosen, faults := lines(m, request.Only, false)
	if faults != nil {
		return nil, faults
	}
	n := newNamer(d)
	answer := &api.ExpectedMeanSquaresAnswer{Title: d.Title(), Constraint: constraint(d), Factors: n.factors(), Inseparable: [][]string{}}
	answer.ExpectedMeanSquares = make([]api.ExpectedMeanSquare, len(chosen))
	for i, s := range chosen {
		answer.ExpectedMeanSquares[i] = n.expectation(m, s, request.Latex)
	}
	for _, g := range m.Inseparable() {
		answer.Inseparable = append(answer.Inseparable, n.names(g.Sets))
	}
	return answer, nil
}

func (n *namer) expectation(m *ems.Model, s engine.Set, latex bool) api.ExpectedMeanSquare {
	line := &m.Lines[m.Line(s)]
	components := m.Expectation(s)
	e := api.ExpectedMeanSquare{
		Term: n.term(s), Effect: n.effect(s), DF: line.DF, Pooled: n.pooled(line),
		Components: make([]api.Component, len(components)), Text: n.sum(components),
	}
	for i, c := range components {
		e.Components[i] = api.Component{
			Term: n.term(c.Set), Effect: n.effect(c.Set),
			Coefficient: c.Coefficient.Float64(), Exact: c.Coefficient.String(), Formula: m.Formula(s, c.Set),
		}
		if latex {
			e.Components[i].Latex = product(m.LatexFormula(s, c.Set), n.latex(c.Set))
		}
	}
	if latex {
		e.Latex = n.latexSum(components)
	}
	return e
}

// sum writes components as a person would: "σ² + 2 σ²(box(temperature, freezer)) + 48 κ²(temperature)".
func (n *namer) sum(components []ems.Component) string {
	var text strings.Builder
	for i, c := range components {
		if i > 0 {
			text.WriteString(" + ")
		}
		if !c.Coefficient.IsOne() {
			text.WriteString(c.Coefficient.String())
			text.WriteByte(' ')
		}
		text.WriteString(n.component(c.Set))
	}
	return text.String()
}

// component writes a component: σ² for the residual, σ²(term) for a random term, κ²(term) for a fixed one.
func (n *namer) component(s engine.Set) string {
	text := &n.components[n.design.Index(s)]
	switch {
	case *text != "":
	case s == n.design.Residual():
		*text = "σ²"
	case n.design.IsRandom(s):
		*text = "σ²(" + n.name(s) + ")"
	default:
		*text = "κ²(" + n.name(s) + ")"
	}
	return *text
}

// latexSum is sum in LaTeX, with the factors' symbols.
func (n *namer) latexSum(components []ems.Component) string {
	parts := make([]string, len(components))
	for i, c := range components {
		coefficient := c.Coefficient.String()
		if num, den, fraction := strings.Cut(coefficient, "/"); fraction {
			coefficient = `\frac{` + num + "}{" + den + "}"
		}
		parts[i] = product(coefficient, n.latex(c.Set))
	}
	return strings.Join(parts, " + ")
}

func (n *namer) latex(s engine.Set) string {
	switch {
	case s == n.design.Residual():
		return `\sigma^2`
	case n.design.IsRandom(s):
		return `\sigma^2_{` + n.design.Symbols(s) + "}"
	}
	return `\kappa^2_{` + n.design.Symbols(s) + "}"
}

func product(coefficient, component string) string {
	if coefficient == "1" {
		return component
	}
	return coefficient + `\,` + component
}
