package fit

import "math"

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

// over returns p/n, n a whole number, to about twice a double's digits; exactly if the quotient is a double.
func (p pair) over(n float64) pair {
	hi := p.value() / n
	// p − hi·n, its product exact.
	product := hi * n
	rest := (p.hi - product) - math.FMA(hi, n, -product) + p.lo
	lo := rest / n
	sum := hi + lo
	return pair{sum, lo - (sum - hi)}
}

// sum adds x in blocks, the blocks' sums as a pair: within two units in the last place of Σ|x| for any length.
func sum(x []float64) float64 {
	const block = 64
	var total pair
	for len(x) > 0 {
		n := min(block, len(x))
		var part float64
		for _, v := range x[:n] {
			part += v
		}
		total = total.add(part)
		x = x[n:]
	}
	return total.value()
}
