// Package answer turns a checked request into its answer: the one place where sets become names, rationals become text, and
// a NaN becomes null with a reason. It knows nothing of HTTP; places of faults are relative to the request
// ("design/factors/2/within/0").
package answer

import (
	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// Bounds of one answer. They are stated in the contract.
const (
	MaxTerms      = 8192     // terms listed
	MaxComponents = 250000   // components in expectations, or weights in tests
	MaxNames      = 96 << 20 // bytes of names in components, where names are long
	MaxPooledList = 32       // terms above max_order named one by one in a pooled line
	MaxAnalysed   = 1000000  // components in the lines of all analyses of one answer
)

// maxComponents returns how many components an answer on the design may hold: each repeats names of factors, so it is fewer
// where these are long.
func maxComponents(d *engine.Design) int { return min(MaxComponents, MaxNames/nameBytes(d)) }

// nameBytes returns about how many bytes a component takes in an answer at the most.
func nameBytes(d *engine.Design) int {
	const besides = 100
	n := besides
	for _, f := range d.Factors() {
		n += len(f.Name)
	}
	return n
}

// namer names the terms of one design, each once.
type namer struct {
	design     *engine.Design
	terms      []api.Term
	components []string
	pools      map[*ems.Line][]api.Pooled
}

func newNamer(d *engine.Design) *namer {
	return &namer{design: d, terms: make([]api.Term, len(d.Terms())), components: make([]string, len(d.Terms()))}
}

// term returns the name of a term in both forms.
func (n *namer) term(s engine.Set) api.Term {
	t := &n.terms[n.design.Index(s)]
	if t.Term == "" {
		t.Crossed, t.Within = n.design.Parts(s)
		t.Term = api.TermName(t.Crossed, t.Within)
	}
	return *t
}

func (n *namer) name(s engine.Set) string { return n.term(s).Term }

func (n *namer) names(sets []engine.Set) []string {
	names := make([]string, len(sets))
	for i, s := range sets {
		names[i] = n.name(s)
	}
	return names
}

func (n *namer) effect(s engine.Set) string {
	if n.design.IsRandom(s) {
		return api.Random
	}
	return api.Fixed
}

// pooled lists the members of a pooled line, once for each line. Where max_order pooled more than MaxPooledList terms into
// it, one entry stands for those.
func (n *namer) pooled(line *ems.Line) []api.Pooled {
	if len(line.Pooled) == 0 {
		return []api.Pooled{}
	}
	list, ok := n.pools[line]
	if ok {
		return list
	}
	above := &api.AboveOrder{AboveOrder: n.design.MaxOrder()}
	for _, s := range line.Pooled {
		if n.design.AboveOrder(s) {
			above.Terms++
			above.DF += n.design.DF(s)
		}
	}
	for _, s := range line.Pooled {
		if above.Terms <= MaxPooledList || !n.design.AboveOrder(s) {
			list = append(list, api.Pooled{Term: n.name(s)})
		}
	}
	if above.Terms > MaxPooledList {
		list = append(list, api.Pooled{Above: above})
	}
	if n.pools == nil {
		n.pools = make(map[*ems.Line][]api.Pooled)
	}
	n.pools[line] = list
	return list
}

// share returns a line's weight.
func (n *namer) share(w ems.Weight) api.Share {
	return api.Share{Term: n.term(w.Set), Weight: w.Weight.Float64(), Exact: w.Weight.String()}
}

func (n *namer) shares(weights []ems.Weight) []api.Share {
	list := make([]api.Share, len(weights))
	for i, w := range weights {
		list[i] = n.share(w)
	}
	return list
}

// weights returns weights of the model's lines, each with what is pooled into the line.
func (n *namer) weights(m *ems.Model, weights []ems.Weight) []api.Weight {
	list := make([]api.Weight, len(weights))
	for i, w := range weights {
		list[i] = api.Weight{Share: n.share(w), Pooled: n.pooled(&m.Lines[m.Line(w.Set)])}
	}
	return list
}

func (n *namer) factors() []api.DeclaredFactor {
	list := make([]api.DeclaredFactor, len(n.design.Factors()))
	for i, f := range n.design.Factors() {
		list[i] = api.DeclaredFactor{
			Name: f.Name, Symbol: f.Symbol, Levels: f.Levels, Effect: n.effect(engine.SetOf(i)),
			Population: f.Population, Within: n.design.Names(f.Parents),
		}
	}
	return list
}

func constraint(d *engine.Design) string {
	if d.Restricted() {
		return api.Restricted
	}
	return api.Unrestricted
}
