package data

import (
	"math"
	"math/bits"
)

// nestedAxis finds the levels of a nested factor that was declared with a count.
func nestedAxis[T width](l *layout, f int) ([]T, bool) {
	factor := &l.design.Factors()[f]
	parents := int64(1)
	for _, p := range factor.Above.Members() {
		parents *= l.design.Factors()[p].Levels
	}
	finder := newLevelFinder(int(parents), len(l.columns.Factors[f].Labels), factor.Levels, l.columns.Rows)
	axis := make([]T, l.columns.Rows)
	strides := l.strides(factor.Above)
	var parentBuffer, labelBuffer [chunk]uint32
	for first := 0; first < len(axis); first += chunk {
		n := min(chunk, len(axis)-first)
		parent, label := parentBuffer[:n], labelBuffer[:n]
		clear(parent)
		clear(label)
		for _, p := range factor.Above.Members() {
			l.axes[p].addTo(parent, first, strides[p])
		}
		l.columns.Factors[f].Codes.addTo(label, first, 1)
		if !findLevels(finder, axis[first:first+n], parent, label) {
			return nil, false
		}
	}
	return axis, true // too few levels show as cells with too many readings
}

// levelFinder numbers the labels of a nested factor within each combination of what it is nested in (a parent), as they
// first appear there.
type levelFinder struct {
	limit uint32   // levels within each parent
	used  []uint32 // by parent: how many levels were found
	// Where parents × labels are few, levels holds one more than the level by parent and label; 0 is none.
	labels int
	levels []uint32
	// Otherwise a label mostly belongs to one parent: owner is one more than that parent, by label, level its level there.
	// What a label is in any other parent is in others.
	owner  []uint32
	level  []uint32
	others map[uint64]uint32
}

func newLevelFinder(parents, labels int, limit int64, rows int) *levelFinder {
	l := &levelFinder{limit: uint32(min(limit, math.MaxUint32)), used: make([]uint32, parents), labels: labels}
	if over, size := bits.Mul64(uint64(parents), uint64(labels)); over == 0 && size <= uint64(rows/4+1024) {
		l.levels = make([]uint32, size)
		return l
	}
	l.owner, l.level = make([]uint32, labels), make([]uint32, labels)
	return l
}

// findLevels fills axis with the levels of labels within parents; false if there are too many.
func findLevels[T width](l *levelFinder, axis []T, parents, labels []uint32) bool {
	if l.levels == nil {
		return findSparse(l, axis, parents, labels)
	}
	labels, parents = labels[:len(axis)], parents[:len(axis)]
	for i := range axis {
		at := int(parents[i])*l.labels + int(labels[i])
		level := l.levels[at]
		if level == 0 {
			next, ok := l.next(parents[i])
			if !ok {
				return false
			}
			level = next + 1
			l.levels[at] = level
		}
		axis[i] = T(level - 1)
	}
	return true
}

func findSparse[T width](l *levelFinder, axis []T, parents, labels []uint32) bool {
	for i, parent := range parents {
		label := labels[i]
		if l.owner[label] == parent+1 {
			axis[i] = T(l.level[label])
			continue
		}
		pair := uint64(parent)<<32 | uint64(label)
		level, known := l.others[pair]
		if !known {
			next, ok := l.next(parent)
			if !ok {
				return false
			}
			level = next
			if l.owner[label] == 0 {
				l.owner[label], l.level[label] = parent+1, level
			} else {
				if l.others == nil {
					l.others = make(map[uint64]uint32)
				}
				l.others[pair] = level
			}
		}
		axis[i] = T(level)
	}
	return true
}

// next returns the next level of a parent, or false if it has all.
func (l *levelFinder) next(parent uint32) (uint32, bool) {
	level := l.used[parent]
	if level == l.limit {
		return 0, false
	}
	l.used[parent]++
	return level, true
}
