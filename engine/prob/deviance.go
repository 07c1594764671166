package prob

import "math"

// logDeviance returns D for N = n and a·f + b = sum, the latter divided by f's power of two:
//
//	D = N·ln((a·f + b)/N) − a·ln f = N·ln((a + b/f)/N) + b·ln f,
//
// by the form whose last product is the smaller, so that less cancels.
func logDeviance(f scaledF, n, sum pair, a, b float64) pair {
	divisor, shape := n, a
	if a > b && f.high > 0x1p-900 {
		divisor, shape = n.times(f.pair), -b
	}
	u := sum.high / divisor.high
	rest := math.FMA(-u, divisor.high, sum.high) + (sum.low - u*divisor.low) // what rounding left of u
	logU, logF := logPair(u, rest/sum.high), logPair(f.high, f.low/f.high)
	d := difference(n, logU, shape, logF)
	if f.exponent > 0 { // b of the factors 2^exponent remain
		e := float64(f.exponent)
		d = d.minus(pair{-b, 0}.times(pair{e * ln2High, e * ln2Low}))
	}
	return d.notNegative()
}

// near reports whether f is so near 1 that D is small and its power series short.
func near(excess, m float64) bool { return math.Abs(excess) < 1.0/512 && m*excess*excess < 0.5 }

// nearDeviance returns D from the power series in w = ln f, M·Σ qₙ·wⁿ/n! (see centralTails), to a few roundings of D itself. The logarithms
// would leave an absolute error of about N·2^-105, of which the square root matters to a tail near a half.
func nearDeviance(w, m, skew float64) pair {
	c2 := skew * skew
	q4 := (3*c2 - 1) / 2
	q5 := skew * (3*c2 - 2)
	q6 := ((15*c2-15)*c2 + 2) / 2
	sum := 0.5 + w*(skew/6+w*(q4/24+w*(q5/120+w*q6/720)))
	return pair{m * w * w * sum, 0}
}
