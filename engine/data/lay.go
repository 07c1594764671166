package data

import (
	"cmp"
	"math"
	"slices"

	"guardrow/engine"
)

// Lay lays columns onto their design. The columns are those of a Plan whose factors are the design's.
//
// A factor declared with labels has those levels, in that order. One declared with a count has as many distinct labels; one
// that is nested, as many within each combination of the levels of all the factors it is nested in, be they reused in
// other combinations or not; its levels are numbered as they first appear there. Every cell then has as many readings as there
// are replicates. If so, the answer is the grid; if not, everything that does not match, as far as it can be told.
//
// Memory and time are of the order of the rows, whatever the size of the design. The columns are taken over by the grid: their
// codes may be renumbered in place, and they cannot be laid or fingerprinted again.
func Lay(design *engine.Design, columns *Columns) (*Grid, []engine.Fault) {
	if columns.laid || len(columns.Factors) != len(design.Factors()) {
		panic("data: columns laid twice, or onto another design than they were planned for")
	}
	columns.laid = true
	l := layout{design: design, columns: columns, axes: make([]Codes, len(columns.Factors))}
	if l.whole() {
		return &Grid{Design: design, Rows: columns.Rows, Axes: l.axes, Strides: l.strides(design.All()), Responses: columns.Responses}, nil
	}
	return nil, explain(design, columns)
}

// layout lays columns that match their design. It gives up at the first thing that does not match, having changed nothing
// but the numbering of labels.
type layout struct {
	design  *engine.Design
	columns *Columns
	axes    []Codes
}

// whole lays everything, and reports whether it matched.
func (l *layout) whole() bool {
	if int64(l.columns.Rows) != l.design.Observations() {
		return false
	}
	for _, f := range outermost(l.design) {
		if !l.axis(f) {
			return false
		}
	}
	return l.even()
}

// outermost returns the factors in an order in which each comes after all that it is nested in.
func outermost(design *engine.Design) []int {
	factors := design.Factors()
	order := design.All().Members()
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(factors[a].Above.Len(), factors[b].Above.Len()) })
	return order
}

// strides returns, for the factors in s, how far apart neighbouring levels are in an array with an axis for each of them.
func (l *layout) strides(s engine.Set) []uint32 {
	factors := l.design.Factors()
	strides := make([]uint32, len(factors))
	stride := int64(1)
	for f := len(factors) - 1; f >= 0; f-- {
		if s.Has(f) {
			strides[f] = uint32(stride)
			stride *= factors[f].Levels
		}
	}
	return strides
}

// axis lays factor f, those that it is nested in having been laid.
func (l *layout) axis(f int) bool {
	factor := &l.design.Factors()[f]
	column := &l.columns.Factors[f]
	switch {
	case factor.Labels != nil:
		levels, unknown := levelsOf(column.Labels, factor.Labels)
		if unknown || len(column.Labels) != len(factor.Labels) {
			return false
		}
		renumber(column, levels, factor.Labels)
		l.axes[f] = column.Codes
		return true
	case factor.Above == 0:
		l.axes[f] = column.Codes
		return int64(len(column.Labels)) == factor.Levels
	case factor.Levels <= math.MaxUint8+1:
		axis, ok := nestedAxis[uint8](l, f)
		l.axes[f] = codesOf(axis)
		return ok
	case factor.Levels <= math.MaxUint16+1:
		axis, ok := nestedAxis[uint16](l, f)
		l.axes[f] = codesOf(axis)
		return ok
	}
	axis, ok := nestedAxis[uint32](l, f)
	l.axes[f] = codesOf(axis)
	return ok
}

// noLevel stands for the level of a label that is not listed.
const noLevel = math.MaxUint32

// levelsOf returns the position of each of the labels in the list, and whether any is not in it.
func levelsOf(labels, listed []string) (levels []uint32, unknown bool) {
	position := make(map[string]uint32, len(listed))
	for i, label := range listed {
		position[label] = uint32(i)
	}
	levels = make([]uint32, len(labels))
	for i, label := range labels {
		level, known := position[label]
		if !known {
			level, unknown = noLevel, true
		}
		levels[i] = level
	}
	return levels, unknown
}

// renumber makes the labels of a column those that are listed, of which there are as many, in that order.
func renumber(column *LabelColumn, levels []uint32, listed []string) {
	column.Labels = listed
	same := true
	for i, level := range levels {
		same = same && level == uint32(i)
	}
	if same {
		return
	}
	switch c := &column.Codes; {
	case c.U8 != nil:
		renumberCodes(c.U8, levels)
	case c.U16 != nil:
		renumberCodes(c.U16, levels)
	default:
		renumberCodes(c.U32, levels)
	}
}

func renumberCodes[T width](codes []T, levels []uint32) {
	narrow := make([]T, len(levels))
	for i, level := range levels {
		narrow[i] = T(level)
	}
	for i, c := range codes {
		codes[i] = narrow[c]
	}
}

// chunk is how many rows are worked on at a time.
const chunk = 2048

// even reports whether every cell has as many readings as there are replicates. There are cells × replicates rows, so
// that is so if none has more; and then every level is there.
func (l *layout) even() bool {
	replicates := l.design.Replicates()
	cells := int(l.design.Cells())
	switch {
	case replicates == 1:
		return l.single(make([]uint64, cells/64+1))
	case replicates <= math.MaxUint8:
		return countUpTo(l, make([]uint8, cells), uint8(replicates))
	}
	return countUpTo(l, make([]uint32, cells), uint32(replicates))
}

// single reports whether no cell has two readings.
func (l *layout) single(taken []uint64) bool {
	clash := uint64(0)
	l.each(func(cells []uint32) bool {
		for _, cell := range cells {
			bit := uint64(1) << (cell & 63)
			clash |= taken[cell>>6] & bit
			taken[cell>>6] |= bit
		}
		return clash == 0
	})
	return clash == 0
}

// countUpTo reports whether no cell has more readings than there are replicates. No count exceeds its type before that is
// found out, since a chunk is checked row by row.
func countUpTo[T width](l *layout, counts []T, replicates T) bool {
	ok := true
	l.each(func(cells []uint32) bool {
		for _, cell := range cells {
			if counts[cell] == replicates {
				ok = false
				return false
			}
			counts[cell]++
		}
		return true
	})
	return ok
}

// each calls do with the cells of all rows, a chunk at a time, until it returns false.
func (l *layout) each(do func(cells []uint32) bool) {
	grid := Grid{Axes: l.axes, Strides: l.strides(l.design.All())}
	var buffer [chunk]uint32
	for first := 0; first < l.columns.Rows; first += chunk {
		cells := buffer[:min(chunk, l.columns.Rows-first)]
		grid.Cells(cells, first)
		if !do(cells) {
			return
		}
	}
}
