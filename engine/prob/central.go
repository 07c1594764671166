package prob

import "math"

const (
	// centralPrecision is the smallest M, and centralReach the largest |ζ|, at which the uniform expansion is used: there its
	// first neglected terms are below a rounding.
	centralPrecision = 30
	centralReach     = 0.7
)

// inCentre reports whether the uniform expansion holds.
func (fr *frame) inCentre() bool {
	return fr.m >= centralPrecision && 2*fr.deviance.high <= centralReach*centralReach*fr.m
}

// centralTails returns both tails and the density of ln F by a uniform expansion (of Temme's kind: Temme 1979, SIAM J. Math.
// Anal. 10, for the incomplete gamma function). With ζ²/2 = D/M, ζ of the sign of f − 1, and w = ln F,
//
//	upper = ½·erfc(√D) + exp(−D)/√(2πM) · S(ζ),   S′/M − ζ·S = 1 − C·g(ζ),   g = dw/dζ = Σ gₖ·ζᵏ,
//
// where C = Γ*(N)/(Γ*(a)·Γ*(b)). Equating powers of ζ, from the highest down,
//
//	sₖ₋₁ = C·gₖ + (k + 1)·sₖ₊₁/M,   C = 1 − s₁/M,
//
// so that C follows too. The gₖ are polynomials in (b − a)/N (table_central.go), bounded alike for all shapes; the series in ζ
// converges for |ζ| < √(4π). Limits need no care: b = +Inf has (b − a)/N = 1.
func (fr *frame) centralTails() (lower, upper, density float64) {
	zeta := math.Sqrt(2 * fr.deviance.high / fr.m)
	if fr.lambda < 0 {
		zeta = -zeta
	}
	order := fr.centralOrder(math.Abs(zeta))
	inverse := 1 / fr.m
	skew := fr.skew()
	square := skew * skew
	series, s0, s1 := 0.0, 0.0, 0.0 // s0, s1: the two latest coefficients, s0 the later
	for k := order; k > 0; k-- {
		row := &centralTable[k]
		g := row[k/2]
		for i := k/2 - 1; i >= 0; i-- {
			g = g*square + row[i]
		}
		if k&1 == 1 {
			g *= skew
		}
		s0, s1 = float64(k+1)*inverse*s1+g, s0
		series = series*zeta + s0
	}
	c := 1 / (1 + s1*inverse)
	spread := 1 / math.Sqrt(2*math.Pi*fr.m)
	correction := c * series * spread
	decay := expMinus(fr.deviance, 1)
	density = decay * c * fr.m * spread
	tail := 0.5 * scaledErfc(math.Sqrt(fr.deviance.high))
	if zeta < 0 {
		lower = decay * (tail - correction)
		return lower, 1 - lower, density
	}
	upper = decay * (tail + correction)
	return 1 - upper, upper, density
}

// centralOrder returns how many of the gₖ matter. They fall off like 0.01/3.54ᵏ, so that what is left out of S stays below a tenth of a
// rounding of the tail, both in powers of ζ and in the terms k‼·gₖ/M^(k/2) that the recurrence sums.
func (fr *frame) centralOrder(zeta float64) int {
	switch {
	case fr.m >= 500 && zeta < 0.07:
		return 8
	case fr.m >= 70 && zeta < 0.23:
		return 12
	case fr.m >= 45 && zeta < 0.45:
		return 16
	default:
		return len(centralTable) - 1
	}
}
