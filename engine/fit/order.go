package fit

import (
	"bytes"
	"slices"

	"guardrow/engine/data"
)

// inCellOrder reports whether row i belongs to cell i / replicates for every row.
func inCellOrder(g *data.Grid, levels []int, replicates int) bool {
	run := g.Rows // rows over which the axes so far are constant
	for a, axis := range g.Axes {
		period := run
		run /= levels[a]
		var ordered bool
		switch {
		case axis.U8 != nil:
			ordered = cycles(axis.U8, levels[a], run, period, bytes.Equal)
		case axis.U16 != nil:
			ordered = cycles(axis.U16, levels[a], run, period, slices.Equal[[]uint16])
		default:
			ordered = cycles(axis.U32, levels[a], run, period, slices.Equal[[]uint32])
		}
		if !ordered {
			return false
		}
	}
	return run == replicates
}

// cycles reports whether codes are 0, 1, …, levels − 1, each run times, over and over with the given period. Slices are
// compared with themselves, shifted, because that is as fast as memory.
func cycles[T uint8 | uint16 | uint32](codes []T, levels, run, period int, equal func(a, b []T) bool) bool {
	for level := range levels {
		stretch := codes[level*run : (level+1)*run]
		if int(stretch[0]) != level || !equal(stretch[:run-1], stretch[1:]) {
			return false
		}
	}
	return equal(codes[:len(codes)-period], codes[period:])
}
