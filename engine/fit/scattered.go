package fit

const (
	// rowBlock is the number of rows whose cells are found at once: their indexes stay in the nearest cache.
	rowBlock = 1024
	// longSum is the number of readings of a cell that are added up plainly. Longer sums are carried over into pairs after
	// every so many rows that the work is a small part of that on the rows.
	longSum     = 64
	rowsPerCell = 16
	// plainTwo is plain where two sums take turns.
	plainTwo = plain / 2
	// smallStudy is the number of rows up to which a second look at the data costs nothing worth saving.
	smallStudy = 1 << 16
)

// cell gathers the readings of one cell as distances from its presumed mean.
type cell struct{ mean, sum float64 }

// add adds a reading and returns the square of its distance.
func (c *cell) add(reading float64) float64 {
	d := reading - c.mean
	c.sum += d
	return d * d
}

// scatteredMeans is cellMeans for rows in any order:
//
//	within = Σ (y − m)² − Σ over cells of (Σ (y − m))² / replicates
//
// where the presumed means m are the origin first. In small studies, and where the difference is a small part of the first
// sum and so would lose digits, the rows are gone through again about the means just found; and a third time where all
// replicates of a cell are equal, which gives 0 exactly.
func (k *Kernel) scatteredMeans(y []float64, origin float64) float64 {
	if k.sums == nil {
		k.sums = make([]cell, k.cells)
	}
	for c := range k.sums {
		k.sums[c] = cell{mean: origin}
	}
	passes := 1
	if len(y) <= smallStudy {
		passes = 2
	}
	var within float64
	for pass := 1; pass <= 3; pass++ {
		all := k.gather(y)
		within = all - k.centre(origin)
		if pass >= passes && within > all/16 {
			break
		}
	}
	return max(within, 0)
}

// gather adds all readings to their cells and returns the sum of squares of their distances.
func (k *Kernel) gather(y []float64) float64 {
	long := k.replicates > longSum
	every := max(1, rowsPerCell*k.cells/rowBlock) * rowBlock // rows between two carries
	if long {
		if k.carry == nil {
			k.carry = make([]pair, k.cells)
		}
		clear(k.carry)
	}
	var squares pair
	var buffer [rowBlock]uint32
	axes, narrow := shortAxes(k.grid, k.cells)
	for first := 0; first < len(y); first += rowBlock {
		part := y[first:min(first+rowBlock, len(y))]
		switch {
		case !narrow || len(part) < rowBlock:
			squares = scan(k.sums, k.indexes(buffer[:len(part)], first), part, squares)
		case axes.wide:
			squares = axes.scanWide(k.sums, (*[rowBlock]float64)(part), first, squares)
		default:
			squares = axes.scan(k.sums, (*[rowBlock]float64)(part), first, squares)
		}
		if long && (first+rowBlock)%every == 0 {
			k.carryOver()
		}
	}
	if long {
		k.carryOver()
	}
	return squares.value()
}

// indexes returns the cells of rows first, first+1, … as many as the buffer holds.
func (k *Kernel) indexes(buffer []uint32, first int) []uint32 {
	if k.index != nil {
		return k.index[first : first+len(buffer)]
	}
	cellsOf(k.grid, buffer, first)
	return buffer
}

// scan adds a block of readings to their cells, and the squares of their distances to those so far.
func scan(cells []cell, index []uint32, y []float64, squares pair) pair {
	for len(index) > 0 {
		n := min(plainTwo, len(index))
		squares = squares.add(scanPart(cells, index[:n], y[:n]))
		index, y = index[n:], y[n:]
	}
	return squares
}

func scanPart(cells []cell, index []uint32, y []float64) float64 {
	y = y[:len(index)]
	var p, q float64
	i := 0
	for ; i+1 < len(index); i += 2 {
		p += cells[index[i]].add(y[i])
		q += cells[index[i+1]].add(y[i+1])
	}
	if i < len(index) {
		p += cells[index[i]].add(y[i])
	}
	return p + q
}

// carryOver moves the cells' sums into k.carry.
func (k *Kernel) carryOver() {
	for c := range k.sums {
		k.carry[c] = k.carry[c].add(k.sums[c].sum)
		k.sums[c].sum = 0
	}
}

// centre fills k.means, as distances from the origin, makes the means just found the presumed ones, and returns
// Σ sum²/replicates.
func (k *Kernel) centre(origin float64) float64 {
	const stretch = 16
	r := float64(k.replicates)
	if k.replicates > longSum {
		for c := range k.sums {
			k.sums[c].sum = k.carry[c].value()
		}
	}
	var between pair
	for first := 0; first < k.cells; first += stretch {
		var part float64
		sums := k.sums[first:min(first+stretch, k.cells)]
		means := k.means[first : first+len(sums)]
		for c, s := range sums {
			part += s.sum * s.sum
			step := s.sum / r
			means[c] = (s.mean - origin) + step
			sums[c] = cell{mean: s.mean + step}
		}
		between = between.add(part)
	}
	return between.value() / r
}

// placeSingles is scatteredMeans for one reading per cell.
func (k *Kernel) placeSingles(y []float64, origin float64) {
	var buffer [rowBlock]uint32
	for first := 0; first < len(y); first += rowBlock {
		part := y[first:min(first+rowBlock, len(y))]
		for i, c := range k.indexes(buffer[:len(part)], first) {
			k.means[c] = part[i] - origin
		}
	}
}
