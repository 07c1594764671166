package prob

import "math"

// logPair returns ln(v·(1 + rest)) for v > 0 and |rest| below a few roundings, with an error below 2^-72, and
// below 2^-52·|ln v|³ near 1, where the logarithm is near 0.
//
// v = 2^k·m with m in [0.6875, 1.375). A table gives c ≈ 1/m of so few bits that r = c·m − 1 is exact, |r| < 1/128, and
//
//	ln v = k·ln 2 − ln c + ln(1 + r),   ln(1 + r) = r − r²/2 + r³/3 − …
//
// of which the first two terms are carried in pairs; the sum of the others is below 2^-22 and of the size of r³.
func logPair(v, rest float64) pair {
	shift := 0.0
	if v < 0x1p-1022 { // subnormal numbers have no full mantissa
		v, shift = v*0x1p100, -100
	}
	const start = 0x3fe6000000000000 // 0.6875
	bits := math.Float64bits(v)
	offset := bits - start
	k := int64(offset) >> 52
	m := math.Float64frombits(bits - uint64(k)<<52)
	t := &logTable[offset>>45&127]
	// Of the products, only those of a mantissa's upper part are exact; each upper part is taken so that it is.
	upper := math.Float64frombits(math.Float64bits(m) &^ (1<<26 - 1))
	r := (upper*t.c - 1) + (m-upper)*t.c
	upper = math.Float64frombits(math.Float64bits(r) &^ (1<<27 - 1))
	half := 0.5 * upper * upper
	halfLow := 0.5 * (r - upper) * (r + upper)
	exponent := float64(k) + shift

	// The parts fall in size, so that each rounding error is found in three steps.
	base := exponent * ln2High
	first := base + t.high
	second := first + r
	third := second - half
	low := (t.high - (first - base)) + (r - (second - first)) + ((second - third) - half)
	low += (exponent*ln2Low + t.low) - halfLow
	low += r*r*r*(r*logTail(r)+1.0/3) + rest // whose square does not count
	return pair{third, low}.settled()
}

// logTail returns (ln(1+r) − r + r²/2 − r³/3)/r⁴ for |r| < 1/128 to 12 digits.
func logTail(r float64) float64 {
	s := r * r
	even := ((-1.0/10*s-1.0/8)*s-1.0/6)*s - 1.0/4
	odd := ((1.0/11*s+1.0/9)*s+1.0/7)*s + 1.0/5
	return odd*r + even
}

// expMinus returns exp(−d)·scale. Where exp(−d) alone would be subnormal, the scale is applied first.
func expMinus(d pair, scale float64) float64 {
	if d.high < 640 {
		e := math.Exp(-d.high)
		return scale * (e - e*d.low)
	}
	// 2^-256 set apart: 256·ln 2 has an exact first part.
	rest := pair{d.high - 256*ln2High, d.low - 256*ln2Low}
	e := math.Exp(-rest.high)
	return scale * (e - e*rest.low) * 0x1p-256
}
