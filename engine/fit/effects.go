package fit

import "math/bits"

// strip is the number of neighbouring columns that are transformed or folded together: they stay in the nearest cache.
const strip = 256

// transform replaces x, an array with one axis per entry of levels (the last fastest), by its Helmert contrasts along
// every axis. Along an axis of a levels, with x₀ … x₍a−1₎ the values there:
//
//	element 0: x₀ + x₁ + … + x₍a−1₎
//	element j: x₀ + … + x₍j−1₎ − j·xⱼ      for j ≥ 1
//
// These are orthogonal; the squares of their lengths, a and j(j+1), are divided out by fold.
func transform(x []float64, levels []int) {
	stride := len(x)
	for a := 0; a < len(levels); a++ {
		n := levels[a]
		stride /= n
		switch {
		case n == 1:
		case n == 2 && a+1 < len(levels) && levels[a+1] == 2:
			a++
			stride /= 2
			fours(x, stride)
		case n == 2:
			twos(x, stride)
		case stride == 1:
			helmertRows(x, n)
		default:
			for first := 0; first < len(x); first += n * stride {
				helmert(x[first:first+n*stride], n, stride)
			}
		}
	}
}

// helmert transforms one block of n·stride elements along its first axis.
func helmert(x []float64, n, stride int) {
	for low := 0; low < stride; low += strip {
		width := min(strip, stride-low)
		total := x[low : low+width]
		for j := 1; j < n; j++ {
			row := x[j*stride+low:][:len(total)]
			weight := float64(j)
			for i, v := range row {
				s := total[i]
				row[i] = s - weight*v
				total[i] = s + v
			}
		}
	}
}

// helmertRows transforms along the last axis, of n levels.
func helmertRows(x []float64, n int) {
	for ; len(x) >= n; x = x[n:] {
		row := x[1:n]
		total := x[0]
		for j, v := range row {
			row[j] = total - float64(j+1)*v
			total += v
		}
		x[0] = total
	}
}

// twos transforms along an axis of two levels.
func twos(x []float64, stride int) {
	for ; len(x) >= 2*stride; x = x[2*stride:] {
		a, b := x[:stride], x[stride:2*stride]
		b = b[:len(a)]
		for i, v := range a {
			w := b[i]
			a[i], b[i] = v+w, v-w
		}
	}
}

// fours transforms along two neighbouring axes of two levels each.
func fours(x []float64, stride int) {
	if stride == 1 {
		for ; len(x) >= 4; x = x[4:] {
			p, q, r, s := x[0], x[1], x[2], x[3]
			x[0], x[1], x[2], x[3] = (p+q)+(r+s), (p-q)+(r-s), (p+q)-(r+s), (p-q)-(r-s)
		}
		return
	}
	for ; len(x) >= 4*stride; x = x[4*stride:] {
		a, b, c, d := x[:stride], x[stride:2*stride], x[2*stride:3*stride], x[3*stride:4*stride]
		b, c, d = b[:len(a)], c[:len(a)], d[:len(a)]
		for i, p := range a {
			q, r, s := b[i], c[i], d[i]
			a[i], b[i], c[i], d[i] = (p+q)+(r+s), (p-q)+(r-s), (p+q)-(r+s), (p-q)-(r-s)
		}
	}
}

// fold squares the contrasts x that transform left, divides them by the squares of their lengths, and adds up what
// belongs to the same subset of axes: those along which the contrast is not the mean. It returns one sum of squares per
// subset, indexed by the set of its axes (bit a for axis a), and overwrites x. An axis of one level has no contrasts:
// subsets that hold it are 0 exactly.
func fold(x []float64, levels []int, lengths [][]float64) []float64 {
	for i, v := range x {
		x[i] = v * v
	}
	var axes []int // those with at least two levels
	scale := 1.0
	stride := len(x)
	for a, n := range levels {
		if n == 1 {
			continue
		}
		axes = append(axes, a)
		stride /= n
		if n == 2 {
			scale /= 2
			continue
		}
		foldAxis(x, stride, lengths[a])
		x = x[:len(x)/n*2]
	}
	subsets := make([]float64, 1<<len(levels))
	for i, v := range x {
		var set int
		for rest := uint(i); rest != 0; rest &= rest - 1 { //nolint:gosec // i is an index
			set |= 1 << axes[len(axes)-1-bits.TrailingZeros(rest)]
		}
		subsets[set] = v * scale
	}
	return subsets
}

// inverseLengths returns, for an axis of n levels, 1 / the square of the length of each contrast: 1/n and 1/(j(j+1)).
func inverseLengths(n int) []float64 {
	w := make([]float64, n)
	w[0] = 1 / float64(n)
	for j := 1; j < n; j++ {
		w[j] = 1 / (float64(j) * float64(j+1))
	}
	return w
}

// foldAxis folds the axis with the given stride to two elements: x becomes the array with
//
//	element 0: w₀x₀
//	element 1: Σ wⱼxⱼ  over j ≥ 1
//
// along that axis. The new array fills the front of x.
func foldAxis(x []float64, stride int, w []float64) {
	n := len(w)
	to := 0
	for first := 0; first < len(x); first += n * stride {
		block := x[first : first+n*stride]
		if stride == 1 {
			// The right-hand sides are computed first: both ends may lie in the block.
			x[to], x[to+1] = w[0]*block[0], weightedSum(w[1:], block[1:])
		} else {
			for low := 0; low < stride; low += strip {
				width := min(strip, stride-low)
				foldStrip(x[to+low:][:width], x[to+stride+low:][:width], block[low:], stride, w)
			}
		}
		to += 2 * stride
	}
}

// foldBlock is the number of terms that are added up plainly before they join a sum of twice a double's digits.
const foldBlock = 32

// foldStrip folds some neighbouring columns of a block into mean and rest.
func foldStrip(mean, rest, block []float64, stride int, w []float64) {
	var buffer, low, part [strip]float64
	hi, lo, sum := buffer[:len(rest)], low[:len(rest)], part[:len(rest)]
	for j := 1; j < len(w); {
		clear(sum)
		for end := min(j+foldBlock, len(w)); j < end; j++ {
			weight := w[j]
			for i, v := range block[j*stride:][:len(sum)] {
				sum[i] += weight * v
			}
		}
		for i, s := range sum {
			p := pair{hi[i], lo[i]}.add(s)
			hi[i], lo[i] = p.hi, p.lo
		}
	}
	for i, v := range block[:len(mean)] {
		mean[i] = w[0] * v
	}
	for i := range rest {
		rest[i] = hi[i] + lo[i]
	}
}

// weightedSum returns Σ wⱼxⱼ.
func weightedSum(w, x []float64) float64 {
	var total pair
	for len(x) > foldBlock {
		total = total.add(plainSum(w[:foldBlock], x[:foldBlock]))
		w, x = w[foldBlock:], x[foldBlock:]
	}
	return total.add(plainSum(w, x)).value()
}

func plainSum(w, x []float64) float64 {
	var even, odd float64
	x = x[:len(w)]
	for ; len(w) >= 2; w, x = w[2:], x[2:] {
		even += w[0] * x[0]
		odd += w[1] * x[1]
	}
	if len(w) > 0 {
		even += w[0] * x[0]
	}
	return even + odd
}
