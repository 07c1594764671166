package data

import (
	"fmt"
	"slices"
	"strings"

	"guardrow/api"
	"guardrow/engine"
)

// run is a cell and how many readings it has.
type run struct {
	cell  uint64
	count int64
}

// cells compares the readings of every cell with the replicates, without an array of the cells.
func (e *explanation) cells() {
	if !e.known(e.design.All()) {
		e.total()
		return
	}
	runs := e.runs()
	e.surplus(runs)
	e.missing(runs)
}

// total reports, where the cells cannot be told, a number of readings that cannot be right.
func (e *explanation) total() {
	rows, needed := int64(e.columns.Rows), e.design.Observations()
	const later = "Which cells these concern cannot be told until the levels match."
	switch {
	case rows < needed:
		e.add(api.MissingReadings, e.place, "The design needs %d readings (%s of %s each), and the data have %d. %s", needed, cellCount(e.design.Cells()), readingCount(e.design.Replicates()), rows, later)
	case rows > needed:
		e.add(api.SurplusReadings, e.place, "The design has room for %d readings (%s of %s each), and the data have %d. %s", needed, cellCount(e.design.Cells()), readingCount(e.design.Replicates()), rows, later)
	}
}

func cellCount(n int64) string {
	if n == 1 {
		return "1 cell"
	}
	return fmt.Sprintf("%d cells", n)
}

func readingCount(n int64) string {
	if n == 1 {
		return "1 reading"
	}
	return fmt.Sprintf("%d readings", n)
}

// runs returns the cells that have readings, in order. Rows that are astray are left out.
func (e *explanation) runs() []run {
	keys := make([]uint64, 0, e.columns.Rows)
	for row := range e.columns.Rows {
		if key, ok := e.key(e.design.All(), row); ok {
			keys = append(keys, key)
		}
	}
	slices.Sort(keys)
	var runs []run
	for i, key := range keys {
		if i == 0 || key != keys[i-1] {
			runs = append(runs, run{cell: key})
		}
		runs[len(runs)-1].count++
	}
	return runs
}

// surplus reports the cells with too many readings.
func (e *explanation) surplus(runs []run) {
	replicates := e.design.Replicates()
	cells, readings := int64(0), int64(0)
	var examples []run
	for _, r := range runs {
		if r.count <= replicates {
			continue
		}
		cells++
		readings += r.count - replicates
		if len(examples) < maxExamples {
			examples = append(examples, r)
		}
	}
	if cells == 0 {
		return
	}
	parts := make([]string, 0, maxExamples+1)
	for i, rows := range e.rowsOf(examples) {
		parts = append(parts, fmt.Sprintf("%d where %s (rows %s)", examples[i].count, e.where(e.design.All(), rows[0]-1), numbers(rows, examples[i].count)))
	}
	if more := cells - maxExamples; more > 0 {
		parts = append(parts, "and "+cellCount(more)+" more")
	}
	e.add(api.SurplusReadings, e.place, "The design has room for %s in each cell, but %s: %s. Remove what was measured twice, or declare more replicates.", readingCount(replicates), have(cells, readings), strings.Join(parts, "; "))
}

func have(cells, readings int64) string {
	if cells == 1 {
		return fmt.Sprintf("1 cell has %d too many", readings)
	}
	return fmt.Sprintf("%d cells have too many, %d in all", cells, readings)
}

// rowsOf returns the first rows, counted from 1, of each of a few cells.
func (e *explanation) rowsOf(cells []run) [][]int {
	rows := make([][]int, len(cells))
	for row := range e.columns.Rows {
		key, ok := e.key(e.design.All(), row)
		if !ok {
			continue
		}
		for i, c := range cells {
			if c.cell == key && len(rows[i]) < maxExamples {
				rows[i] = append(rows[i], row+1)
			}
		}
	}
	return rows
}

// numbers lists row numbers, the first few of n.
func numbers(rows []int, n int64) string {
	parts := make([]string, 0, len(rows)+1)
	for _, row := range rows {
		parts = append(parts, fmt.Sprint(row))
	}
	if more := n - int64(len(rows)); more > 0 {
		parts = append(parts, fmt.Sprintf("%d more", more))
	}
	return join(parts)
}

// missing reports the cells with too few readings.
func (e *explanation) missing(runs []run) {
	replicates := e.design.Replicates()
	present, full := int64(0), int64(0) // readings that count, and cells that have all
	for _, r := range runs {
		present += min(r.count, replicates)
		if r.count >= replicates {
			full++
		}
	}
	readings, cells := e.design.Observations()-present, e.design.Cells()-full
	if readings == 0 {
		return
	}
	short := e.short(runs)
	parts := make([]string, 0, maxExamples+1)
	for _, r := range short {
		parts = append(parts, fmt.Sprintf("%s where %s", countOrNone(r.count), e.cellLabels(r.cell)))
	}
	if more := cells - int64(len(short)); more > 0 {
		parts = append(parts, "and "+cellCount(more)+" more")
	}
	astray := ""
	if e.strays > 0 {
		astray = fmt.Sprintf(" The %s could not be placed, and may belong there.", count(e.strays, "row with a label that is not listed", "rows with labels that are not listed"))
	}
	e.add(api.MissingReadings, e.place, "The design needs %s in each cell, but %s missing in %s: %s.%s Send them, or declare a design without these cells.", readingCount(replicates), are(readings), cellCount(cells), strings.Join(parts, "; "), astray)
}

func countOrNone(n int64) string {
	if n == 0 {
		return "none"
	}
	return fmt.Sprint(n)
}

func are(n int64) string {
	if n == 1 {
		return "1 is"
	}
	return fmt.Sprintf("%d are", n)
}

// short returns the first few cells with too few readings, in order. It looks at no more cells than have readings, and
// those few.
func (e *explanation) short(runs []run) []run {
	var found []run
	cells, next := uint64(e.design.Cells()), 0
	for cell := uint64(0); cell < cells && len(found) < maxExamples; cell++ {
		r := run{cell: cell}
		if next < len(runs) && runs[next].cell == cell {
			r = runs[next]
			next++
		}
		if r.count < e.design.Replicates() {
			found = append(found, r)
		}
	}
	return found
}

// cellLabels names a cell by the labels of its levels, as far as they are known: those of a nested factor are not known
// where what it is nested in has no readings.
func (e *explanation) cellLabels(cell uint64) string {
	levels := make([]uint64, len(e.factors))
	for f := len(e.factors) - 1; f >= 0; f-- {
		n := uint64(e.factors[f].Levels)
		levels[f] = cell % n
		cell /= n
	}
	parts := make([]string, 0, len(levels))
	for f := range e.factors {
		label, known := e.levelLabel(f, levels)
		if known {
			parts = append(parts, engine.Quote(e.factors[f].Name)+" is "+engine.Quote(label))
		} else {
			parts = append(parts, "the level of "+engine.Quote(e.factors[f].Name)+" is not in the data")
		}
	}
	return join(parts)
}

// levelLabel returns the label of a factor's level in a cell given by all levels.
func (e *explanation) levelLabel(f int, levels []uint64) (string, bool) {
	factor := &e.factors[f]
	switch {
	case factor.Labels != nil:
		return factor.Labels[levels[f]], true
	case factor.Above == 0:
		return e.labels(f).Labels[levels[f]], true
	}
	key := uint64(0)
	for _, p := range factor.Above.Members() {
		key = key*uint64(e.factors[p].Levels) + levels[p]
	}
	id, seen := e.nests[f].ids[key]
	if !seen {
		return "", false
	}
	return e.labels(f).Labels[e.nests[f].labels[id][levels[f]]], true
}
