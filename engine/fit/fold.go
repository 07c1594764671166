package fit

// squareTwos transforms along an axis of two levels and squares.
func squareTwos(a, b []float64) {
	b = b[:len(a)]
	for i, v := range a {
		w := b[i]
		a[i], b[i] = (v+w)*(v+w), (v-w)*(v-w)
	}
}

// squareStrip transforms width neighbouring columns along the first axis, squares and folds that axis as foldAxis does,
// all in one look at the elements. The results are the first two rows.
func squareStrip(x []float64, width, stride int, w []float64) {
	var high, low, part [strip]float64
	hi, lo, sum := high[:width], low[:width], part[:width]
	row := func(level int) []float64 { return x[level*stride:][:width] }
	n := len(w)
	for count := 4; count <= n; count += 4 {
		squareFour(row(count-4), row(count-3), row(count-2), row(count-1), sum)
		for m := 4; count&m == 0; m *= 2 {
			mergeSquare(row(count-2*m), row(count-m), m, m, sum, w[count-m])
		}
		if count%foldBlock == 0 {
			carry(hi, lo, sum)
		}
	}
	if n&2 != 0 {
		mergeSquare(row(n&^3), row(n&^3+1), 1, 1, sum, 1./2)
	}
	leftOver(n, func(left, m, right, p int) { mergeSquare(row(left), row(right), m, p, sum, w[right]) })
	carry(hi, lo, sum)
	mean, rest := row(0), row(1)
	for i, s := range mean {
		mean[i] = s * s * w[0]
		rest[i] = hi[i] + lo[i]
	}
}

// squareFour is mergeFour with the squared contrasts, times their weights, added to sum and not kept.
func squareFour(a, b, c, d, sum []float64) {
	b, c, d, sum = b[:len(a)], c[:len(a)], d[:len(a)], sum[:len(a)]
	for i, p := range a {
		q, r, s := b[i], c[i], d[i]
		left, right := p+q, r+s
		a[i] = left + right
		sum[i] += ((p-q)*(p-q)+(r-s)*(r-s))/2 + (left-right)*(left-right)/4
	}
}

// mergeSquare is merge with the squared contrast, times its weight, added to sum and not kept.
func mergeSquare(left, right []float64, m, p int, sum []float64, weight float64) {
	right, sum = right[:len(left)], sum[:len(left)]
	if m == p {
		for i, l := range left {
			r := right[i]
			left[i] = l + r
			sum[i] += (l - r) * (l - r) * weight
		}
		return
	}
	a, b := float64(p), float64(m)
	for i, l := range left {
		r := right[i]
		left[i] = l + r
		d := a*l - b*r
		sum[i] += d * d * weight
	}
}

// carry moves plain sums into sums of twice a double's digits.
func carry(hi, lo, sum []float64) {
	hi, lo = hi[:len(sum)], lo[:len(sum)]
	for i, s := range sum {
		p := pair{hi[i], lo[i]}.add(s)
		hi[i], lo[i], sum[i] = p.hi, p.lo, 0
	}
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
const foldBlock = 16

// foldStrip folds some neighbouring columns of a block into mean and rest.
func foldStrip(mean, rest, block []float64, stride int, w []float64) {
	var high, low, part [strip]float64
	hi, lo, sum := high[:len(rest)], low[:len(rest)], part[:len(rest)]
	for j := 1; j < len(w); {
		for end := min(j+foldBlock, len(w)); j < end; j++ {
			weight := w[j]
			for i, v := range block[j*stride:][:len(sum)] {
				sum[i] += weight * v
			}
		}
		carry(hi, lo, sum)
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
