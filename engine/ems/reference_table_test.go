package ems_test

// The reference derives everything from the explicit rows of a study: which rows share which labels. It knows neither
// down-closed sets nor the rules for df and coefficients that the engine goes by.

// table is the explicit rows of a plan: column c < len(factors) holds the labels of a factor, a nested factor's being
// different in different parents; the last column numbers the rows.
type table struct {
	columns   []*partition
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
	whole := &partition{cell: make([]int32, n), cells: 1, pairs: int64(n) * int64(n)}
	t.partition[0] = whole
	own := make([]*partition, len(p.factors)) // level within parents, by row
	each := 1
	for i, f := range p.factors {
		own[i] = byLabel(n, func(row int) int { return row / each % int(f.levels) })
		each *= int(f.levels)
	}
	t.columns = make([]*partition, len(p.factors)+1)
	var label func(i int) *partition
	label = func(i int) *partition {
		if t.columns[i] == nil {
			t.columns[i] = own[i]
			for _, parent := range p.factors[i].within {
				t.columns[i] = refine(t.columns[i], label(parent))
			}
		}
		return t.columns[i]
	}
	for i := range p.factors {
		label(i)
	}
	t.columns[len(p.factors)] = byLabel(n, func(row int) int { return row })
	return t
}

// byLabel groups rows by a label from 0 to n−1.
func byLabel(n int, label func(row int) int) *partition {
	p := &partition{cell: make([]int32, n)}
	for row := range p.cell {
		p.cell[row] = int32(label(row))
	}
	p.cells = n
	return refine(&partition{cell: make([]int32, n), cells: 1}, p)
}

// refine groups rows that are in one cell of a and in one cell of b.
func refine(a, b *partition) *partition {
	p := &partition{cell: make([]int32, len(a.cell))}
	number := make([]int32, a.cells*b.cells) // 1 + the number of a cell; 0 where it is new
	var size []int64
	for row := range a.cell {
		k := &number[int(a.cell[row])*b.cells+int(b.cell[row])]
		if *k == 0 {
			size = append(size, 0)
			*k = int32(len(size))
		}
		p.cell[row] = *k - 1
		size[*k-1]++
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
	if last == len(t.columns)-1 { // each row by itself
		t.partition[columns] = t.columns[last]
		return t.columns[last]
	}
	p := refine(t.of(columns&^(1<<last)), t.columns[last])
	t.partition[columns] = p
	return p
}

// finer reports whether every cell of a lies in one cell of b.
func finer(a, b *partition) bool { return refine(a, b).cells == a.cells }
