package prob

import "math"

// nearOrigin returns both tails for a < 1 and small b·x, where the distribution has much of its mass near 0 and the lower
// tail is a fast series of positive terms:
//
//	lower = E/a · Σ (N)ₙ/(a + 1)ₙ · xⁿ
//
// A small upper tail would lose digits as 1 − lower; originUpper finds it directly.
func (fr *frame) nearOrigin(density float64) (lower, upper float64) {
	sum, term := 1.0, 1.0
	nx := fr.a * fr.xr // N·x
	for n := 0.0; n < maxTerms; n++ {
		term *= (nx + n*fr.x) / (fr.a + 1 + n)
		sum += term
		if term < sum*settledAt {
			break
		}
	}
	lower = density / fr.a * sum
	if lower <= 0.9 || fr.a >= 1 {
		return lower, 1 - lower
	}
	upper = fr.originUpper()
	return 1 - upper, upper
}

// originUpper returns the upper tail for a < 1 and small b·x from
//
//	upper = 1 − e^g·(1 + a·s) = −(e^g − 1) − e^g·a·s,
//	g = ln( x^a·Γ(N)/(Γ(b)·Γ(1 + a)) ),   s = Σ_{n≥1} (1 − b)ₙ·xⁿ/(n!·(a + n))
//
// (DiDonato and Morris 1992, section 7, in another arrangement), in which all parts shrink with a.
func (fr *frame) originUpper() float64 {
	s, power := 0.0, 1.0
	for n := 1.0; n < maxTerms; n++ {
		power *= (n*fr.x - fr.bx) / n
		term := power / (fr.a + n)
		s += term
		if math.Abs(term) <= settledAt*math.Abs(s) {
			break
		}
	}
	g := fr.logRise() - fr.a*polynomial(logGammaNearOne[:], 2*fr.a-1)
	rise := math.Expm1(g)
	return math.Max(0, -rise-(1+rise)*fr.a*s)
}

// logRise returns a·ln x + ln Γ(b + a) − ln Γ(b), every part of which is proportional to a, by Stirling's formula at b ≥ 12,
//
//	a·ln(x·b) + (N − ½)·(ln(1 + a/b) − a/b) + a·(a − ½)/b + δ(N) − δ(b),
//
// and by recurrence below.
func (fr *frame) logRise() float64 {
	a, b := fr.a, fr.b
	if math.IsInf(b, 1) {
		return a * math.Log(fr.bx)
	}
	g := 0.0
	x := fr.x
	if b < 12 {
		for ; b < 12; b++ {
			g -= math.Log1p(a / b)
		}
		g += a * math.Log(x*b)
	} else {
		g += a * math.Log(fr.bx)
	}
	n := a + b
	return g + ((n-0.5)*logLess(a/b) + a*(a-0.5)/b) + stirlingDifference(n, b, a)
}

// logLess returns ln(1 + z) − z for 0 ≤ z ≤ 1/12.
func logLess(z float64) float64 {
	sum := 0.0
	for k := 15.0; k >= 2; k-- {
		sum = 1/k - z*sum
	}
	return -z * z * sum
}

// stirlingSeries holds the coefficients of δ(s) = 1/(12s) − 1/(360s³) + …, the remainder of Stirling's formula.
var stirlingSeries = [...]float64{1.0 / 12, -1.0 / 360, 1.0 / 1260, -1.0 / 1680, 1.0 / 1188, -691.0 / 360360}

// stirlingDifference returns δ(n) − δ(b) for n = b + a, b ≥ 12, with the factor a taken out so that it keeps its digits however
// small a is: with u = 1/n, v = 1/b, each uᵏ − vᵏ is u − v times a sum of products.
func stirlingDifference(n, b, a float64) float64 {
	u, v := 1/n, 1/b
	sum, quotient, power := 0.0, 1.0, 1.0 // (uᵏ − vᵏ)/(u − v) and uᵏ⁻¹ for k = 1, 3, 5, …
	for _, c := range stirlingSeries {
		sum += c * quotient
		quotient = power*u*(u+v) + v*v*quotient
		power *= u * u
	}
	return -a * u * v * sum
}
