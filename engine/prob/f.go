package prob

import "math"

// tinyF is a value of F whose lower tail is below 2^-54 for df1 ≥ 3 and df1 ≤ 1e6·df2: there D ≥ a·(−ln f − (1 + b/a)·ln(1 + a/b)) > 37.9.
const tinyF = 1e-17

// FUpperTail returns P(F > f) for df1 (numerator) and df2 (denominator) degrees of freedom, whole or not:
//
//	P(F > f) = I_y(df2/2, df1/2),   y = df2/(df1·f + df2),
//
// the regularised incomplete beta function, by the methods of the package comment.
//
// Accuracy, against the reference values of testdata/prob (1,700 and 1,100 of them): relative error at most 1.3e-15 for p from 1e-305
// to 1, with degrees of freedom from 0.3 to 1e5 and to 1e8; 2.3e-15 from 0.01 on; 1.4e-15 with one infinite. Beside few others, up to
// 1e15 are as good. Below 1e-308 the result fades through subnormal numbers to 0. Degrees of freedom below 2e-100 count as 2e-100,
// above 2^151 as infinite.
//
// Special cases are:
//
//	FUpperTail(f, df1, df2) = 1 for f ≤ 0
//	FUpperTail(+Inf, df1, df2) = 0
//	FUpperTail(f, df1, +Inf) = P(χ²/df1 > f)
//	FUpperTail(f, +Inf, df2) = P(χ²/df2 < 1/f)
//	FUpperTail(f, +Inf, +Inf) = 1 for f < 1, 0 for f ≥ 1
//	FUpperTail(f, df1, df2) = NaN for f NaN, or df1 or df2 NaN or ≤ 0
func FUpperTail(f, df1, df2 float64) float64 {
	switch {
	case !validDF(df1, df2) || math.IsNaN(f):
		return math.NaN()
	case f <= 0:
		return 1
	case math.IsInf(f, 1):
		return 0
	case f < tinyF && df1 >= 3 && df1 <= 1e6*df2:
		return 1
	}
	return upperTail(scaled(f), df1, df2)
}

// FLowerTail returns P(F ≤ f), the upper tail of 1/F at 1/f with the degrees of freedom exchanged, not 1 less the upper tail of F:
// relative error at most 5e-15 for p from 1e-305 to 1 and the degrees of freedom that FUpperTail names.
//
// Special cases are:
//
//	FLowerTail(f, df1, df2) = 0 for f ≤ 0
//	FLowerTail(+Inf, df1, df2) = 1
//	FLowerTail(f, +Inf, +Inf) = 0 for f < 1, 1 for f ≥ 1
//	FLowerTail(f, df1, df2) = NaN for f NaN, or df1 or df2 NaN or ≤ 0
func FLowerTail(f, df1, df2 float64) float64 {
	switch {
	case !validDF(df1, df2) || math.IsNaN(f):
		return math.NaN()
	case f <= 0:
		return 0
	case math.IsInf(f, 1):
		return 1
	case min(df1, df2) >= 2*manyDF:
		return 1 - upperTail(scaled(f), df1, df2) // 0, ½ or 1
	}
	return upperTail(scaled(f).inverse(), df2, df1)
}

// FUpperQuantile returns f with P(F > f) = p, the upper 100·p percentage point of F, by Newton's method on the logarithm of the smaller
// tail (quantile.go). The lower point, P(F ≤ f) = p, is 1/FUpperQuantile(p, df2, df1).
//
// Accuracy, against 3,600 reference values with p from 1e-300 to 0.5: relative error at most 2.5e-15·(1 + p/E), E the density of ln F at f:
// a tail hardly changes with f where the degrees of freedom are few, and p/E ≤ 4/df2 in the upper tail. For p near 1 what counts is
// the rounding of 1 − p.
//
// Special cases are:
//
//	FUpperQuantile(0, df1, df2) = +Inf
//	FUpperQuantile(1, df1, df2) = 0
//	FUpperQuantile(p, df1, df2) = +Inf or 0 where f is too large or too small for a float64
//	FUpperQuantile(p, +Inf, +Inf) = 1 for 0 < p < 1
//	FUpperQuantile(p, df1, df2) = NaN for p NaN, < 0 or > 1, or df1 or df2 NaN or ≤ 0
func FUpperQuantile(p, df1, df2 float64) float64 {
	switch {
	case !validDF(df1, df2) || !(p >= 0 && p <= 1):
		return math.NaN()
	case p == 0:
		return math.Inf(1)
	case p == 1:
		return 0
	}
	return upperQuantile(p, df1, df2)
}

// validDF reports whether all are positive, +Inf included.
func validDF(df ...float64) bool {
	for _, d := range df {
		if !(d > 0) {
			return false
		}
	}
	return true
}
