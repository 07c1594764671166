package fit

import "math"

// rowBlock is the number of rows whose cells are found at once: their indexes stay in the nearest cache.
const rowBlock = 1024

// eachBlock calls f with the cells of rows first, first+1, … for block after block of rows.
func (k *Kernel) eachBlock(f func(first int, cells []uint32)) {
	var buffer [rowBlock]uint32
	for first := 0; first < k.grid.Rows; first += rowBlock {
		n := min(rowBlock, k.grid.Rows-first)
		if k.index != nil {
			f(first, k.index[first:first+n])
			continue
		}
		k.grid.Cells(buffer[:n], first)
		f(first, buffer[:n])
	}
}

func placeSingles(x []float64, cells []uint32, y []float64, origin float64) {
	for i, c := range cells {
		x[c] = y[i] - origin
	}
}

// scatteredMeans is cellMeans for rows in any order. The sums of the cells carry twice a double's digits, so that neither
// the number of replicates nor the order of the rows matters.
func (k *Kernel) scatteredMeans(y []float64, origin float64) float64 {
	if k.sums == nil {
		k.sums = make([]pair, k.cells)
	}
	clear(k.sums)
	var total pair // Σ (y − origin)²
	k.eachBlock(func(first int, cells []uint32) {
		total = total.add(gather(k.sums, cells, y[first:], origin))
	})
	between := k.divide()
	within := total.value() - between
	if within > total.value()/8 || math.IsNaN(within) {
		return within
	}
	// The cells explain most: the difference would lose digits, so look again at the distances from the cell means.
	var again pair
	k.eachBlock(func(first int, cells []uint32) {
		again = again.add(squaresAbout(k.sums, cells, y[first:], origin))
	})
	return again.value()
}

// divide turns k.sums into means, fills k.means, and returns Σ sum²/replicates.
func (k *Kernel) divide() float64 {
	const stretch = 64
	r := float64(k.replicates)
	var between pair
	for first := 0; first < k.cells; first += stretch {
		sums := k.sums[first:min(first+stretch, k.cells)]
		means := k.means[first : first+len(sums)]
		var part float64
		for c, p := range sums {
			s := p.value()
			part += s * s
			sums[c] = p.over(r)
			means[c] = sums[c].value()
		}
		between = between.add(part)
	}
	return between.value() / r
}

// gather adds the rows of a block to the sums of their cells, and returns Σ (y − origin)² over the block.
func gather(sums []pair, cells []uint32, y []float64, origin float64) float64 {
	y = y[:len(cells)]
	var even, odd float64
	i := 0
	for ; i+1 < len(cells); i += 2 {
		d, e := y[i]-origin, y[i+1]-origin
		p := &sums[cells[i]]
		*p = p.add(d)
		even += d * d
		p = &sums[cells[i+1]]
		*p = p.add(e)
		odd += e * e
	}
	if i < len(cells) {
		d := y[i] - origin
		sums[cells[i]] = sums[cells[i]].add(d)
		even += d * d
	}
	return even + odd
}

// squaresAbout returns the sum of squares of a block's rows about the means of their cells.
func squaresAbout(means []pair, cells []uint32, y []float64, origin float64) float64 {
	y = y[:len(cells)]
	var even, odd float64
	i := 0
	for ; i+1 < len(cells); i += 2 {
		p, o := means[cells[i]], means[cells[i+1]]
		d := ((y[i] - origin) - p.hi) - p.lo
		e := ((y[i+1] - origin) - o.hi) - o.lo
		even += d * d
		odd += e * e
	}
	if i < len(cells) {
		p := means[cells[i]]
		d := ((y[i] - origin) - p.hi) - p.lo
		even += d * d
	}
	return even + odd
}
