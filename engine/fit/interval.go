package fit

import (
	"math"

	"guardrow/engine/prob"
)

// chiSquareInterval returns the exact interval for the expectation of one mean square, with the given probability in each
// tail:
//
//	df·MS/χ²(upper tail)  to  df·MS/χ²(lower tail)
func chiSquareInterval(ms, df, tail float64) (lower, upper float64) {
	return ms * shrink(tail, df), ms * stretch(tail, df)
}

// shrink returns df/χ² at the upper tail point: 1/F(tail; df, ∞).
func shrink(tail, df float64) float64 { return df / prob.ChiSquareUpperQuantile(tail, df) }

// stretch returns df/χ² at the lower tail point: 1/F(1 − tail; df, ∞).
func stretch(tail, df float64) float64 { return df / prob.ChiSquareLowerQuantile(tail, df) }

// largeSample returns the modified large-sample interval for Σ weight·E[MS] of independent mean squares, with the given
// probability in each tail (Graybill and Wang 1980 for sums; Ting et al. 1990 with differences; Burdick and Graybill 1992,
// chapter 3). With positive parts a, negative parts b (both as c·MS > 0) and γ the estimate:
//
//	lower = γ − √(Σ G²a² + Σ H²b² + ΣΣ G(a,b)·a·b + ΣΣ G*(a,a′)·a·a′)
//	upper = γ + √(Σ H²a² + Σ G²b² + ΣΣ H(a,b)·a·b + ΣΣ H*(b,b′)·b·b′)
//
// where G = 1 − 1/F(α; n, ∞) and H = 1/F(1 − α; n, ∞) − 1, and the joint terms make the limits exact when all but the two
// parts at hand vanish; a sum without negative parts has none. A radicand below 0, which the joint terms can bring about by rounding, counts as 0.
func largeSample(weight, ms, df []float64, tail float64) (lower, upper float64) {
	var plus, minus []part
	estimate := 0.0
	for i, w := range weight {
		estimate += w * ms[i]
		p := part{size: math.Abs(w * ms[i]), df: df[i], g: 1 - shrink(tail, df[i]), h: stretch(tail, df[i]) - 1}
		if w > 0 {
			plus = append(plus, p)
		} else {
			minus = append(minus, p)
		}
	}
	below := side(plus, minus, func(a, b part) float64 {
		f := prob.FUpperQuantile(tail, a.df, b.df)
		return (square(f-1) - square(a.g*f) - square(b.h)) / f
	}, tail)
	above := side(minus, plus, func(b, a part) float64 {
		f := 1 / prob.FUpperQuantile(tail, b.df, a.df) // lower tail point of F with the df of a over those of b
		return (square(1-f) - square(a.h*f) - square(b.g)) / f
	}, tail)
	return estimate - math.Sqrt(max(below, 0)), estimate + math.Sqrt(max(above, 0))
}

// part is one mean square of a combination, with its weight.
type part struct{ size, df, g, h float64 }

// side returns the radicand of one limit: the parts whose G counts (near), those whose H counts (far), their joint terms
// and those between near parts.
func side(near, far []part, joint func(near, far part) float64, tail float64) float64 {
	sum := 0.0
	for i, a := range near {
		sum += square(a.g * a.size)
		for _, b := range far {
			sum += joint(a, b) * a.size * b.size
		}
		if len(far) == 0 {
			continue // a sum alone: Graybill and Wang's limits have no joint terms
		}
		for _, c := range near[i+1:] {
			n := a.df + c.df
			both := square((1-shrink(tail, n))*n) / (a.df * c.df)
			sum += (both - square(a.g)*a.df/c.df - square(c.g)*c.df/a.df) / float64(len(near)-1) * a.size * c.size
		}
	}
	for _, b := range far {
		sum += square(b.h * b.size)
	}
	return sum
}

func square(x float64) float64 { return x * x }
