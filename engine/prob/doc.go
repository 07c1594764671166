// Package prob computes tail probabilities and upper quantiles of the F, chi-square and t distributions, each tail as a
// tail: a probability of 1e-300 has as many right digits as one of a half.
//
// Everything rests on one quantity, the density of w = ln F for shapes a = df1/2, b = df2/2, N = a + b,
//
//	E(w) = x^a·y^b / B(a, b),   x = a·f/(a·f + b),   y = b/(a·f + b),
//
// written so that nothing large cancels (Loader 2000, Fast and accurate computation of binomial probabilities):
//
//	E = √(M/2π) · Γ*(N)/(Γ*(a)·Γ*(b)) · exp(−D),   M = a·b/N,
//	D = N·ln((a·f + b)/N) − a·ln f  ≥ 0,
//
// with Γ*(s) = Γ(s)·e^s·s^(½−s)/√(2π). D is evaluated in pairs of float64, because at p = 1e-300 a relative error of one rounding
// in D ≈ 700 would cost a factor of 700 in p. The smaller tail is E times one of
//
//   - a continued fraction (fraction.go), the general case;
//   - a uniform expansion in 1/M about the centre (central.go), where the fraction is slow;
//   - a power series near the origin of a distribution with less than two degrees of freedom (origin.go);
//
// and the other tail is 1 less that one. No tail that may be small is ever found by subtraction from 1.
//
// Infinite degrees of freedom are limits of the same formulas, not special distributions: F with df2 = +Inf is χ²/df1, and
// t² with df degrees of freedom is F with 1 and df.
package prob
