package data

import (
	"cmp"
	"fmt"
	"slices"
	"strings"

	"guardrow/api"
	"guardrow/engine"
)

// explanation finds everything in which columns do not match their design, as far as it can be told. What it looks at is
// one level per row and factor; where a factor's levels cannot be told, neither can those nested in it, nor the cells.
type explanation struct {
	report
	design  *engine.Design
	columns *Columns
	factors []engine.Factor
	level   [][]uint32 // by factor and row; nil where they cannot be told, noLevel where that of one row cannot
	nests   []*nest    // by factor; nil for those that are listed or not nested
	astray  []bool     // by row: whether a label is not listed; nil if there is no such row
	strays  int
}

// nest holds the labels of a nested factor within each combination of what it is nested in (a parent).
type nest struct {
	ids     map[uint64]uint32 // of parents in order of first appearance, by their levels (see key)
	labels  [][]uint32        // by parent: its labels, in order of first appearance
	example []int             // by parent: a row
}

// explain returns what does not match; never nothing.
func explain(design *engine.Design, columns *Columns) []engine.Fault {
	n := len(design.Factors())
	e := explanation{
		report: report{place: columns.place, pointers: columns.pointers},
		design: design, columns: columns, factors: design.Factors(),
		level: make([][]uint32, n), nests: make([]*nest, n),
	}
	for f := range e.factors {
		if e.factors[f].Labels != nil {
			e.listed(f)
		}
	}
	for _, f := range outermost(design) {
		switch {
		case e.factors[f].Labels != nil:
		case e.factors[f].Above == 0:
			e.counted(f)
		default:
			e.nested(f)
		}
	}
	e.cells()
	if !e.any() {
		panic("data: columns neither match their design nor differ from it")
	}
	return e.faults()
}

// labels returns a factor's column.
func (e *explanation) labels(f int) *LabelColumn { return &e.columns.Factors[f] }

// listed finds the levels of a factor whose labels are listed, and reports the labels that are not.
func (e *explanation) listed(f int) {
	column := e.labels(f)
	levels, unknown := levelsOf(column.Labels, e.factors[f].Labels)
	e.level[f] = make([]uint32, e.columns.Rows)
	for row := range e.level[f] {
		e.level[f][row] = levels[column.Codes.At(row)]
	}
	if !unknown {
		return
	}
	if e.astray == nil {
		e.astray = make([]bool, e.columns.Rows)
	}
	rows := make([]int, len(levels))  // with each label
	first := make([]int, len(levels)) // row with each label
	for row, level := range e.level[f] {
		if level != noLevel {
			continue
		}
		label := column.Codes.At(row)
		if rows[label] == 0 {
			first[label] = row
		}
		rows[label]++
		if !e.astray[row] {
			e.astray[row] = true
			e.strays++
		}
	}
	told, others, otherRows := 0, 0, 0
	for label, n := range rows {
		switch {
		case n == 0:
		case told < maxExamples:
			told++
			e.add(api.UnknownLabel, e.row(column.Name, first[label]), "The design lists the labels of %s, and %s is not among them (%s).%s Use a listed label, or list this one.", engine.Quote(column.Name), engine.Quote(column.Labels[label]), rowsFrom(n, first[label]), nearest(column.Labels[label], e.factors[f].Labels))
		default:
			others++
			otherRows += n
		}
	}
	if others > 0 {
		e.add(api.UnknownLabel, e.column(column.Name), "The labels of %s that are not listed include %s, in %s.", engine.Quote(column.Name), count(others, "further one", "further ones"), count(otherRows, "row", "rows"))
	}
}

// rowsFrom says how many rows are meant, and which comes first.
func rowsFrom(n, first int) string {
	if n == 1 {
		return fmt.Sprintf("row %d", first+1)
	}
	return fmt.Sprintf("%d rows, the first of them row %d", n, first+1)
}

// counted checks the number of levels of a factor that is not nested.
func (e *explanation) counted(f int) {
	column := e.labels(f)
	declared := e.factors[f].Levels
	found := int64(len(column.Labels))
	if found == declared {
		e.level[f] = make([]uint32, e.columns.Rows)
		for row := range e.level[f] {
			e.level[f][row] = column.Codes.At(row)
		}
		return
	}
	if found < declared {
		e.add(api.TooFewLevels, e.column(column.Name), "The design has %s of %s, but the data have only %d: %s.%s %s", levelCount(declared), engine.Quote(column.Name), found, list(column.Labels), alike(column.Labels), e.unchecked(f))
		return
	}
	e.add(api.TooManyLevels, e.column(column.Name), "The design has %s of %s, but the data have %d.%s%s %s", levelCount(declared), engine.Quote(column.Name), found, rarest(column, e.columns.Rows), alike(column.Labels), e.unchecked(f))
}

func levelCount(n int64) string {
	if n == 1 {
		return "1 level"
	}
	return fmt.Sprintf("%d levels", n)
}

// rarest returns a sentence with the labels that stand in the fewest rows: a mistyped one is likely to be among them.
func rarest(column *LabelColumn, rows int) string {
	counts := make([]int, len(column.Labels))
	for row := range rows {
		counts[column.Codes.At(row)]++
	}
	order := make([]int, len(counts))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(counts[a], counts[b]) })
	parts := make([]string, 0, maxExamples)
	for _, label := range order[:min(len(order), maxExamples)] {
		parts = append(parts, fmt.Sprintf("%s (%s)", engine.Quote(column.Labels[label]), count(counts[label], "row", "rows")))
	}
	if len(order) <= maxExamples {
		return " They are " + join(parts) + "."
	}
	return " The rarest are " + join(parts) + "."
}

// alike returns a sentence with labels that differ only in case or blanks, if there are any.
func alike(labels []string) string {
	seen := make(map[string]string, len(labels))
	for _, label := range labels {
		form := strings.ToLower(strings.Join(strings.Fields(label), " "))
		if other, found := seen[form]; found {
			return " The labels " + engine.Quote(other) + " and " + engine.Quote(label) + " differ only in case or blanks: if they are one level, write them alike."
		}
		seen[form] = label
	}
	return ""
}

// unchecked returns a sentence on what cannot be checked while factor f does not match.
func (e *explanation) unchecked(f int) string {
	var names []string
	for g := range e.factors {
		if e.factors[g].Above.Has(f) && e.factors[g].Labels == nil {
			names = append(names, e.factors[g].Name)
		}
	}
	if len(names) == 0 {
		return "The cells of the design cannot be checked until this is mended."
	}
	return "Neither the levels of " + list(names) + " nor the cells of the design can be checked until this is mended."
}

// key returns the cell that a row belongs to in the array of the factors in s, the last fastest; false if it is not known.
func (e *explanation) key(s engine.Set, row int) (uint64, bool) {
	key := uint64(0)
	for _, p := range s.Members() {
		level := e.level[p][row]
		if level == noLevel {
			return 0, false
		}
		key = key*uint64(e.factors[p].Levels) + uint64(level)
	}
	return key, true
}

// known reports whether the levels of all factors in s can be told.
func (e *explanation) known(s engine.Set) bool {
	for _, p := range s.Members() {
		if e.level[p] == nil {
			return false
		}
	}
	return true
}

// nested checks the number of levels of a factor within each parent.
func (e *explanation) nested(f int) {
	above := e.factors[f].Above
	if !e.known(above) {
		return
	}
	n := &nest{ids: make(map[uint64]uint32)}
	levels := make([]uint32, e.columns.Rows)
	found := make(map[uint64]uint32) // level by parent and label
	for row := range levels {
		parent, ok := e.key(above, row)
		if !ok {
			levels[row] = noLevel
			continue
		}
		id, seen := n.ids[parent]
		if !seen {
			id = uint32(len(n.labels))
			n.ids[parent] = id
			n.labels = append(n.labels, nil)
			n.example = append(n.example, row)
		}
		label := e.labels(f).Codes.At(row)
		pair := uint64(id)<<32 | uint64(label)
		level, seen := found[pair]
		if !seen {
			level = uint32(len(n.labels[id]))
			found[pair] = level
			n.labels[id] = append(n.labels[id], label)
		}
		levels[row] = level
	}
	if e.uneven(f, n) {
		return
	}
	e.nests[f] = n
	e.level[f] = levels
}

// uneven reports the parents that have too many or too few levels of factor f, and whether there are any. Rows that are
// astray may hold the levels that a parent lacks, so that then it is not said that they are too few.
func (e *explanation) uneven(f int, n *nest) bool {
	var many, few []uint32
	for id, labels := range n.labels {
		switch found := int64(len(labels)); {
		case found > e.factors[f].Levels:
			many = append(many, uint32(id))
		case found < e.factors[f].Levels:
			few = append(few, uint32(id))
		}
	}
	if len(many) > 0 {
		e.misnested(api.TooManyLevels, f, n, many, "more")
	}
	if len(few) > 0 && e.strays == 0 {
		e.misnested(api.TooFewLevels, f, n, few, "fewer")
	}
	return len(many)+len(few) > 0
}

// misnested reports parents with a wrong number of levels of factor f.
func (e *explanation) misnested(code api.Code, f int, n *nest, parents []uint32, what string) {
	column := e.labels(f)
	examples := make([]string, 0, maxExamples)
	hint := ""
	for _, id := range parents[:min(len(parents), maxExamples)] {
		labels := make([]string, len(n.labels[id]))
		for i, label := range n.labels[id] {
			labels[i] = column.Labels[label]
		}
		examples = append(examples, fmt.Sprintf("%d (%s) where %s", len(labels), list(labels), e.where(e.factors[f].Above, n.example[id])))
		if hint == "" && code == api.TooManyLevels {
			hint = alike(labels)
		}
	}
	if more := len(parents) - maxExamples; more > 0 {
		examples = append(examples, fmt.Sprintf("likewise in %d more places", more))
	}
	names := e.design.Names(e.factors[f].Above)
	e.add(code, e.column(column.Name), "The design has %s of %s within each %s, but the data have %s in %s: %s.%s %s", levelCount(e.factors[f].Levels), engine.Quote(column.Name), within(names), what, count(len(parents), "place", "places"), strings.Join(examples, "; "), hint, e.unchecked(f))
}

// within names what a factor is nested in.
func within(names []string) string {
	if len(names) == 1 {
		return "level of " + engine.Quote(names[0])
	}
	return "combination of " + list(names)
}

// where says by labels at which levels of the factors in s a row stands.
func (e *explanation) where(s engine.Set, row int) string {
	parts := make([]string, 0, s.Len())
	for _, p := range s.Members() {
		column := e.labels(p)
		parts = append(parts, engine.Quote(column.Name)+" is "+engine.Quote(column.Labels[column.Codes.At(row)]))
	}
	return join(parts)
}
