package fit

// plain is the number of values that are added up plainly, four sums in turn, before they join a pair. Readings are often
// round numbers that recur: the rounding of each addition is then the same, and adds up with their number.
const plain = 64

// pair is an unevaluated sum of two doubles, hi + lo, that carries about twice a double's digits.
type pair struct{ hi, lo float64 }

// add returns p + x. The error of hi + x is computed exactly (Knuth 1969, The Art of Computer Programming 2, section
// 4.2.2, theorem B) and kept in lo.
func (p pair) add(x float64) pair {
	hi := p.hi + x
	part := hi - p.hi
	return pair{hi, p.lo + ((p.hi - (hi - part)) + (x - part))}
}

// value returns p rounded to a double.
func (p pair) value() float64 { return p.hi + p.lo }

// sum adds x in blocks, the blocks' sums as a pair: within a few units in the last place of Σ|x| for any length.
func sum(x []float64) float64 {
	var total pair
	for len(x) > 0 {
		n := min(plain, len(x))
		total = total.add(unrolled(x[:n]))
		x = x[n:]
	}
	return total.value()
}

// unrolled adds x plainly.
func unrolled(x []float64) float64 {
	var a, b, c, d float64
	for ; len(x) >= 4; x = x[4:] {
		a += x[0]
		b += x[1]
		c += x[2]
		d += x[3]
	}
	for _, v := range x {
		a += v
	}
	return (a + b) + (c + d)
}
