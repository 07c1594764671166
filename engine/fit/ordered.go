package fit

const (
	// longest is the number of readings of a cell that are handled at once: few enough to stay in the nearest cache for a
	// second look.
	longest = 1024
	// shortest is the number of readings up to which calling a function for each cell costs more than the cell.
	shortest = 24
)

// orderedMeans is cellMeans for rows that stand in cell order.
func (k *Kernel) orderedMeans(y []float64, origin float64) float64 {
	x := k.means
	switch r := k.replicates; {
	case r == 1:
		for c := range x {
			x[c] = y[c] - origin
		}
		return 0
	case r == 2:
		return pairsInOrder(x, y, origin)
	case r <= shortest:
		return shortCellsInOrder(x, y, r, origin, k.enough())
	case r <= longest:
		return cellsInOrder(x, y, r, origin, k.enough())
	}
	var within pair
	r := k.replicates
	for c := range x {
		mean, ss := k.longCell(y[c*r : (c+1)*r])
		x[c] = (y[c*r] - origin) + mean
		within = within.add(ss)
	}
	return within.value()
}

// pairsInOrder is for two readings per cell.
func pairsInOrder(x, y []float64, origin float64) float64 {
	const stretch = 16
	var within pair
	for len(x) > 0 {
		n := min(stretch, len(x))
		cells, readings := x[:n], y[:2*n]
		var part float64
		for c := range cells {
			first := readings[2*c]
			d := readings[2*c+1] - first
			cells[c] = (first - origin) + d/2
			part += d * d
		}
		within = within.add(part / 2)
		x, y = x[n:], y[2*n:]
	}
	return within.value()
}

// shortCellsInOrder is cellsInOrder for cells of at most shortest readings.
func shortCellsInOrder(x, y []float64, r int, origin, enough float64) float64 {
	const stretch = 16
	n := float64(r)
	var within pair
	for len(x) > 0 {
		cells := x[:min(stretch, len(x))]
		var part float64
		for c := range cells {
			readings := y[:r]
			y = y[r:]
			first := readings[0]
			var s0, s1, q0, q1 float64
			for i := 1; i < len(readings)-1; i += 2 {
				d, e := readings[i]-first, readings[i+1]-first
				s0 += d
				q0 += d * d
				s1 += e
				q1 += e * e
			}
			if len(readings)%2 == 0 {
				d := readings[len(readings)-1] - first
				s0 += d
				q0 += d * d
			}
			s, q := s0+s1, q0+q1
			mean := s / n
			ss := q - s*mean
			if ss < enough*q {
				mean, ss = meanAndSS(readings, first, enough)
			}
			cells[c] = (first - origin) + mean
			part += ss
		}
		within = within.add(part)
		x = x[len(cells):]
	}
	return within.value()
}

// cellsInOrder is for cells of r readings, at most longest.
func cellsInOrder(x, y []float64, r int, origin, enough float64) float64 {
	const stretch = 16
	var within pair
	for len(x) > 0 {
		n := min(stretch, len(x))
		var part float64
		for c := range x[:n] {
			cell := y[c*r : (c+1)*r]
			mean, ss := meanAndSS(cell, cell[0], enough)
			x[c] = (cell[0] - origin) + mean
			part += ss
		}
		within = within.add(part)
		x, y = x[n:], y[n*r:]
	}
	return within.value()
}

// longCell returns the mean of a long cell, as its distance from the first reading, and the sum of squares about it: that
// within blocks plus that between their means.
func (k *Kernel) longCell(y []float64) (mean, ss float64) {
	k.block = k.block[:0]
	var total, within pair
	for i := 0; i < len(y); i += longest {
		part := y[i:min(i+longest, len(y))]
		m, w := meanAndSS(part, y[0], k.enough())
		k.block = append(k.block, m)
		total = total.add(m * float64(len(part)))
		within = within.add(w)
	}
	mean = total.value() / float64(len(y))
	for b, m := range k.block {
		n := min(longest, len(y)-b*longest)
		within = within.add((m - mean) * (m - mean) * float64(n))
	}
	return mean, within.value()
}

// enough returns the share of Σ (y − o)² that has to be left as the sum of squares about the mean for the difference to be
// good; all of it in small studies, where a second look costs nothing worth saving.
func (k *Kernel) enough() float64 {
	if k.grid.Rows <= smallStudy {
		return 1
	}
	return 1. / 8
}

// meanAndSS returns the mean of y as its distance from the origin, and the sum of squares about it:
//
//	Σ (y − o)² − (Σ (y − o))² / n
//
// with o the origin or, where the difference would be less than enough of the first sum, the mean found with it. If all of
// y is equal to the origin both are 0 exactly.
func meanAndSS(y []float64, origin, enough float64) (mean, ss float64) {
	n := float64(len(y))
	s, q := moments(y, origin)
	mean = s / n
	if ss = q - s*mean; ss >= enough*q {
		return mean, ss
	}
	better := origin + mean
	s, q = moments(y, better)
	return (better - origin) + s/n, max(q-s*s/n, 0)
}

// moments returns Σ (y − origin) and Σ (y − origin)².
func moments(y []float64, origin float64) (s, q float64) {
	if len(y) <= plain {
		return plainMoments(y, origin)
	}
	var sum, squares pair
	for len(y) > 0 {
		part := y[:min(plain, len(y))]
		s, q := plainMoments(part, origin)
		sum, squares = sum.add(s), squares.add(q)
		y = y[len(part):]
	}
	return sum.value(), squares.value()
}

func plainMoments(y []float64, origin float64) (s, q float64) {
	var s0, s1, s2, s3, q0, q1, q2, q3 float64
	for ; len(y) >= 4; y = y[4:] {
		d0, d1, d2, d3 := y[0]-origin, y[1]-origin, y[2]-origin, y[3]-origin
		s0 += d0
		s1 += d1
		s2 += d2
		s3 += d3
		q0 += d0 * d0
		q1 += d1 * d1
		q2 += d2 * d2
		q3 += d3 * d3
	}
	for _, v := range y {
		d := v - origin
		s0 += d
		q0 += d * d
	}
	return (s0 + s1) + (s2 + s3), (q0 + q1) + (q2 + q3)
}
