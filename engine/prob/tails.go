package prob

import "math"

const (
	// manyDF is half the number of degrees of freedom that counts as infinite: what lies between is far below a rounding of f.
	manyDF = 0x1p150
	// fewDF is half the smallest number of degrees of freedom told from 0.
	fewDF = 1e-100
	// sureDeviance is a deviance beyond which the larger tail rounds to 1: the smaller is at most exp(−D) (Chernoff's bound for
	// two independent gamma variates), and exp(−38) is below 2^-54.
	sureDeviance = 38
)

// upperTail returns P(F > f) for 0 < f < ∞ and positive degrees of freedom.
func upperTail(f scaledF, df1, df2 float64) float64 {
	var fr frame
	a, b := max(df1/2, fewDF), max(df2/2, fewDF)
	switch {
	case min(a, b) >= manyDF:
		_, upper := oneTails(f, a, b)
		return upper
	case fr.place(f, a, b):
		fr = fr.mirrored()
	}
	if fr.lambda < 0 && fr.deviance.high > sureDeviance {
		return 1
	}
	_, upper, _ := fr.tails()
	return upper
}

// bothTails returns both tails of F and the density of ln F.
func bothTails(f scaledF, df1, df2 float64) (lower, upper, density float64) {
	var fr frame
	a, b := max(df1/2, fewDF), max(df2/2, fewDF)
	switch {
	case min(a, b) >= manyDF:
		lower, upper = oneTails(f, a, b)
		return lower, upper, 0
	case fr.place(f, a, b):
		upper, lower, density = fr.tails()
		return lower, upper, density
	}
	return fr.tails()
}

// place sets the frame for F at f, or, as it reports, for 1/F if a is infinite.
func (fr *frame) place(f scaledF, a, b float64) (inverted bool) {
	switch {
	case a >= manyDF:
		fr.set(f.inverse(), b, math.Inf(1))
		return true
	case b >= manyDF:
		b = math.Inf(1)
	}
	fr.set(f, a, b)
	return false
}

// oneTails returns the tails of a variate that is 1, or as good as 1 with its median there.
func oneTails(f scaledF, a, b float64) (lower, upper float64) {
	excess := f.lessOne()
	switch {
	case excess < 0:
		return 0, 1
	case excess > 0 || math.IsInf(min(a, b), 1):
		return 1, 0
	default:
		return 0.5, 0.5
	}
}

// tails returns both tails and the density of ln F. The smaller tail, and any tail that may be small, is found directly.
func (fr *frame) tails() (lower, upper, density float64) {
	if fr.inCentre() {
		return fr.centralTails()
	}
	density = fr.density()
	if fr.lambda < 0 {
		mirror := fr.mirrored()
		upper, lower = mirror.tailsAbove(density)
	} else {
		lower, upper = fr.tailsAbove(density)
	}
	return lower, upper, density
}

// tailsAbove is tails for f ≥ 1 outside the centre.
func (fr *frame) tailsAbove(density float64) (lower, upper float64) {
	switch {
	case density == 0:
		return 1, 0
	case fr.b < 1 && fr.y <= 0.5:
		mirror := fr.mirrored()
		upper, lower = mirror.nearOrigin(density)
	case fr.a < 4 && fr.x <= 0.5 && fr.bx <= originReach(fr.a):
		lower, upper = fr.nearOrigin(density)
	default:
		upper = density * fr.upperByFraction()
		lower = 1 - upper
	}
	return min(lower, 1), min(upper, 1)
}

// originReach returns the largest b·x at which the series about the origin is better than the fraction, which is slow there.
func originReach(a float64) float64 {
	if a < 1 {
		return 1.25
	}
	return a + 0.5
}
