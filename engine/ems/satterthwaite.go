package ems

import "math"

// Satterthwaite returns the approximate degrees of freedom of the combination Σ weight·ms of independent mean squares
// with the given df (Satterthwaite 1946):
//
//	ν = (Σ w·M)² / Σ (w·M)²/df
//
// The three slices have one length; every df is above 0. The terms are scaled by the largest before squaring, so that
// neither large nor small mean squares overflow. Special cases are:
//
//	all w·M = 0: NaN
//	one line:    its df
func Satterthwaite(weight, ms, df []float64) float64 {
	largest := 0.0
	for i, w := range weight {
		largest = max(largest, math.Abs(w*ms[i]))
	}
	if largest == 0 {
		return math.NaN()
	}
	sum, below := 0.0, 0.0
	for i, w := range weight {
		part := w * ms[i] / largest
		sum += part
		below += part * part / df[i]
	}
	return sum * sum / below
}
