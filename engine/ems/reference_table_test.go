package ems_test

// The reference derives everything from the explicit rows of a study: which rows share which labels. It knows neither
// down-closed sets nor the rules for df and coefficients that the engine goes by.

// table is the explicit rows of a plan: column c < len(factors) holds the labels of a factor, a nested factor's being
// different in different parents; the last column numbers the rows.
type table struct {
	columns   [][]int32
	n         int
	partition map[uint32]*partition // by set of columns
}

// partition groups rows that share the labels in a set of columns. Cells are numbered as they come, so that equal
// partitions are equal slices.
type partition struct {
	cell  []int32 // by row
	cells int
	pairs int64 // ordered pairs of rows in one cell: the sum of squared cell sizes
}

func newTable(p *plan) *table {
	n := int(p.rows())
	t := &table{n: n, partition: make(map[uint32]*partition)}
	own := make([][]int32, len(p.factors)) // level within parents, by row
	each := 1
	for i, f := range p.factors {
		own[i] = make([]int32, n)
		for row := range own[i] {
			own[i][row] = int32(row / each % int(f.levels))
		}
		each *= int(f.levels)
	}
	t.columns = make([][]int32, len(p.factors)+1)
	var label func(i int) []int32
	label = func(i int) []int32 {
		if t.columns[i] == nil {
			cell := own[i]
			for _, parent := range p.factors[i].within {
				cell = refine(cell, label(parent)).cell
			}
			t.columns[i] = cell
		}
		return t.columns[i]
	}
	for i := range p.factors {
		label(i)
	}
	rows := make([]int32, n)
	for row := range rows {
		rows[row] = int32(row)
	}
	t.columns[len(p.factors)] = rows
	t.partition[0] = refine(make([]int32, n), make([]int32, n))
	return t
}

// refine groups rows that share both labels.
func refine(a, b []int32) *partition {
	p := &partition{cell: make([]int32, len(a))}
	number := make(map[[2]int32]int32, 64)
	var size []int64
	for row := range a {
		key := [2]int32{a[row], b[row]}
		k, known := number[key]
		if !known {
			k = int32(len(size))
			number[key] = k
			size = append(size, 0)
		}
		p.cell[row] = k
		size[k]++
	}
	p.cells = len(size)
	for _, s := range size {
		p.pairs += s * s
	}
	return p
}

// of returns the partition by a set of columns.
func (t *table) of(columns uint32) *partition {
	if p, known := t.partition[columns]; known {
		return p
	}
	last := 0
	for c := range t.columns {
		if columns>>c&1 == 1 {
			last = c
		}
	}
	p := refine(t.of(columns&^(1<<last)).cell, t.columns[last])
	t.partition[columns] = p
	return p
}

// finer reports whether every cell of a lies in one cell of b.
func finer(a, b *partition) bool { return refine(a.cell, b.cell).cells == a.cells }
