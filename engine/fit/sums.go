// Package fit analyses the readings of a balanced design: sums of squares without a design matrix, the fitted table with
// its tests, and variance components. A Kernel takes a data.Grid to Sums; a Plan takes Sums to a Table.
package fit

import (
	"errors"
	"math"

	"guardrow/engine"
)

// ErrNotFinite says that a reading, or its distance from the shift, is not a finite double.
var ErrNotFinite = errors.New("fit: a reading is too far from the others to be held as a double")

// Sums is the decomposition of one response's sum of squares about its mean:
//
//	Total = Σ over terms of Term(t) + Within
//
// Every part is a sum of squares, so none is negative. For readings of ordinary size Exponent is 0. Where Total would lie
// outside 2^±400 the readings were scaled by a power of two, which costs no digit, and every sum of squares here is in
// units of 4^Exponent: ratios of them (F, Satterthwaite's df) are right as they stand, and InReadings gives the sums
// themselves.
type Sums struct {
	Mean     float64 // mean of all readings, in their own unit
	Within   float64 // about the cell means: the residual line before anything is pooled
	Total    float64
	Exponent int

	terms []float64 // by set of factors; 0 where the set is no term
}

// Term returns the sum of squares of term t; of the residual, Within.
//
// Special cases are:
//
//	Term(t) = 0 exactly if t has 0 df
//	Term(residual) = 0 exactly if there is one replicate, or all replicates of every cell are equal
//	Term(t) = 0 if t is no term of the design
func (s *Sums) Term(t engine.Set) float64 {
	if t>>engine.MaxFactors != 0 {
		return s.Within
	}
	if int(t) >= len(s.terms) {
		return 0
	}
	return s.terms[t]
}

// InReadings returns x, a sum of squares or a mean square of this decomposition, in the squared unit of the readings:
// x·4^Exponent. It is +Inf, or 0 or subnormal, where a double cannot hold it.
func (s *Sums) InReadings(x float64) float64 { return math.Ldexp(x, 2*s.Exponent) }
