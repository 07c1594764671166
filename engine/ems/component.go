package ems

import (
	"slices"

	"guardrow/engine"
)

// Estimator is the combination of mean squares whose expectation is a component of variance, or a sum of several that the
// study cannot take apart:
//
//	E[Σ Weights·MS] = Σ Shares·component(Sets)
//
// Where there is none, Weights is nil and With names the terms in whose lines alone the components occur.
type Estimator struct {
	Sets    []engine.Set      // the component's own term first
	Shares  []engine.Rational // the first is 1
	Weights []Weight          // in the contract's order
	With    []engine.Set
}

// Estimators returns one estimator for each random component or group of inseparable ones, in the contract's order of
// their first terms; where only is not nil, for the components of those terms alone.
//
// With equal numbers the combination is unique: the component's own line, less what tests it, over the number of
// observations behind each effect. What no line can take away stays in the sum, named so.
func (m *Model) Estimators(only []engine.Set) []Estimator {
	solver := m.NewSolver()
	groups := m.Inseparable()
	group := func(s engine.Set) *Group {
		for i := range groups {
			if slices.Contains(groups[i].Sets, s) {
				return &groups[i]
			}
		}
		return &Group{Sets: []engine.Set{s}, Shares: []engine.Rational{engine.Whole(1)}}
	}
	estimators := make([]Estimator, 0, len(m.Lines))
	done := make(map[engine.Set]bool)
	for _, line := range m.Lines {
		if done[line.Set] || !m.Design.IsRandom(line.Set) || only != nil && !slices.Contains(only, line.Set) {
			continue
		}
		g := group(line.Set)
		for _, s := range g.Sets[1:] {
			done[s] = true
		}
		estimators = append(estimators, m.estimator(solver, g))
	}
	return estimators
}

func (m *Model) estimator(solver *Solver, g *Group) Estimator {
	var e Estimator
	first := engine.Rational{}
	for i, s := range g.Sets {
		if !m.Design.IsRandom(s) {
			e.With = append(e.With, s)
			continue
		}
		if len(e.Sets) == 0 {
			first = g.Shares[i]
		}
		e.Sets = append(e.Sets, s)
		e.Shares = append(e.Shares, g.Shares[i].Quo(first))
	}
	lead := e.Sets[0]
	switch {
	case len(e.With) > 0:
		return e
	case m.Lines[m.Line(lead)].DF == 0:
		e.With = m.company(e.Sets)
		return e
	}
	solution, unmatched := solver.solve(lead, e.Sets)
	behind := engine.Whole(m.Design.Behind(lead))
	for _, u := range unmatched {
		e.Sets = append(e.Sets, u.Set)
		e.Shares = append(e.Shares, u.Weight.Mul(engine.Whole(m.Design.Behind(u.Set))).Quo(behind))
	}
	e.Weights = append(make([]Weight, 0, 1+len(solution)), Weight{lead, engine.Whole(1).Quo(behind)})
	for _, w := range solution {
		e.Weights = append(e.Weights, Weight{w.Set, w.Weight.Neg().Quo(behind)})
	}
	return e
}

// company returns the terms in whose lines components without a line of their own occur.
func (m *Model) company(sets []engine.Set) []engine.Set {
	_, seen := m.occurrences(sets[0])
	company := make([]engine.Set, 0, len(seen))
	for _, o := range seen {
		company = append(company, m.Lines[o.line].Set)
	}
	return company
}
