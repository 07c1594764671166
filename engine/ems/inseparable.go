package ems

import (
	"cmp"
	"slices"
	"strings"

	"guardrow/engine"
)

// Group is a group of components that occur only together: in the same lines, in the same proportions, so that nothing
// can tell them apart. With one replicate the highest interaction and the residual are such a group.
type Group struct {
	Sets   []engine.Set      // in the contract's order
	Shares []engine.Rational // each component's coefficient over that of the first, the same in every line
}

// Inseparable returns all groups of two components or more, in the contract's order of their first members.
//
// The line of a term with degrees of freedom holds no component of a term that does not contain it, so two such terms are
// always told apart, and a group has at most one of them: the union of the lines in which the group's components occur.
// Only components whose own line has no degrees of freedom need to be looked at.
func (m *Model) Inseparable() []Group {
	groups := make(map[string]*Group)
	var order []string
	leads := make(map[engine.Set]string)
	for _, line := range m.Lines {
		if line.DF > 0 {
			continue
		}
		lead, seen := m.occurrences(line.Set)
		if len(seen) == 0 {
			continue
		}
		key, first := pattern(seen), line.Set
		if lead >= 0 && m.proportional(m.Lines[lead].Set, line.Set, seen) {
			first = m.Lines[lead].Set
			if k, ok := leads[first]; ok {
				key = k
			} else {
				leads[first] = key
			}
		}
		g, ok := groups[key]
		if !ok {
			g = &Group{Sets: []engine.Set{first}}
			groups[key] = g
			order = append(order, key)
		}
		if first != line.Set || ok {
			g.Sets = append(g.Sets, line.Set)
		}
	}
	var found []Group
	for _, key := range order {
		if g := groups[key]; len(g.Sets) > 1 {
			m.sort(g.Sets)
			g.Shares = m.shares(g.Sets)
			found = append(found, *g)
		}
	}
	return m.byFirst(found)
}

// occurrence is a line with degrees of freedom in whose expectation a component occurs, and its multiplier there.
type occurrence struct {
	line       int
	multiplier engine.Rational
}

// occurrences returns where the component of t occurs, and the position of the line that is the union of those sets and
// itself among them, or -1.
func (m *Model) occurrences(t engine.Set) (lead int, seen []occurrence) {
	var union engine.Set
	for _, i := range m.inside(t) {
		l := &m.Lines[i]
		if l.DF == 0 {
			continue
		}
		if q := m.multiplier(l.Set, t); q.Sign() != 0 {
			seen = append(seen, occurrence{i, q})
			union |= l.Set
		}
	}
	lead = -1
	for _, o := range seen {
		if m.Lines[o.line].Set == union {
			lead = o.line
		}
	}
	return lead, seen
}

// inside returns the positions of the lines that t contains, ascending.
func (m *Model) inside(t engine.Set) []int {
	var lines []int
	factors := t & m.Design.All()
	if 1<<factors.Len() > len(m.Lines) {
		for i := range m.Lines {
			if t.Holds(m.Lines[i].Set) {
				lines = append(lines, i)
			}
		}
		return lines
	}
	for sub := -factors & factors; sub != 0; sub = (sub - factors) & factors {
		if i := m.Line(sub); i >= 0 {
			lines = append(lines, i)
		}
	}
	if t == m.Design.Residual() {
		lines = append(lines, len(m.Lines)-1)
	}
	slices.Sort(lines)
	return lines
}

// pattern writes the lines and the proportions of the multipliers, so that equal patterns mean inseparable.
func pattern(seen []occurrence) string {
	var text strings.Builder
	for _, o := range seen {
		text.WriteString(engine.Whole(int64(o.line)).String())
		text.WriteByte(':')
		text.WriteString(o.multiplier.Quo(seen[0].multiplier).String())
		text.WriteByte(' ')
	}
	return text.String()
}

// proportional reports whether the component of u occurs in just the lines seen, in the proportions seen for t.
func (m *Model) proportional(u, t engine.Set, seen []occurrence) bool {
	_, own := m.occurrences(u)
	if len(own) != len(seen) {
		return false
	}
	ratio := m.multiplier(u, t)
	for i, o := range own {
		if o.line != seen[i].line || !o.multiplier.Mul(ratio).Equal(seen[i].multiplier) {
			return false
		}
	}
	return true
}

// shares returns each component's coefficient over that of the first, taken in any line where both occur.
func (m *Model) shares(sets []engine.Set) []engine.Rational {
	_, seen := m.occurrences(sets[0])
	in := m.Lines[seen[0].line].Set
	first := m.Coefficient(in, sets[0])
	shares := make([]engine.Rational, len(sets))
	for i, s := range sets {
		shares[i] = m.Coefficient(in, s).Quo(first)
	}
	return shares
}

func (m *Model) byFirst(groups []Group) []Group {
	slices.SortFunc(groups, func(a, b Group) int {
		return cmp.Compare(m.Design.Index(a.Sets[0]), m.Design.Index(b.Sets[0]))
	})
	return groups
}
