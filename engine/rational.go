package engine

import (
	"math/big"
	"math/bits"
	"strconv"
)

// Rational is an exact rational number. Whole numbers that fit an int64 are kept as such, all others as a big.Rat, so that
// designs without finite populations cost integer arithmetic only. Values are immutable; the zero Rational is 0.
type Rational struct {
	whole    int64
	fraction *big.Rat // nil for a whole number
}

// Whole returns n as a Rational.
func Whole(n int64) Rational { return Rational{whole: n} }

// Fraction returns num/den; den is not 0.
func Fraction(num, den int64) Rational { return normal(big.NewRat(num, den)) }

func normal(r *big.Rat) Rational {
	if r.IsInt() && r.Num().IsInt64() {
		return Rational{whole: r.Num().Int64()}
	}
	return Rational{fraction: r}
}

// Rat returns q as a big.Rat that the caller may change.
func (q Rational) Rat() *big.Rat {
	if q.fraction == nil {
		return new(big.Rat).SetInt64(q.whole)
	}
	return new(big.Rat).Set(q.fraction)
}

// Sign returns -1, 0 or 1.
func (q Rational) Sign() int {
	switch {
	case q.fraction != nil:
		return q.fraction.Sign()
	case q.whole < 0:
		return -1
	case q.whole > 0:
		return 1
	}
	return 0
}

// IsOne reports whether q = 1.
func (q Rational) IsOne() bool { return q.fraction == nil && q.whole == 1 }

// Equal reports whether q = r.
func (q Rational) Equal(r Rational) bool {
	if q.fraction == nil || r.fraction == nil {
		return q.fraction == nil && r.fraction == nil && q.whole == r.whole
	}
	return q.fraction.Cmp(r.fraction) == 0
}

// Mul returns q·r.
func (q Rational) Mul(r Rational) Rational {
	if q.fraction == nil && r.fraction == nil {
		if p, ok := multiply(q.whole, r.whole); ok {
			return Rational{whole: p}
		}
	}
	return normal(new(big.Rat).Mul(q.Rat(), r.Rat()))
}

// Sub returns q − r.
func (q Rational) Sub(r Rational) Rational {
	if q.fraction == nil && r.fraction == nil {
		if s := q.whole - r.whole; (s < q.whole) == (r.whole > 0) {
			return Rational{whole: s}
		}
	}
	return normal(new(big.Rat).Sub(q.Rat(), r.Rat()))
}

// Add returns q + r.
func (q Rational) Add(r Rational) Rational { return q.Sub(r.Neg()) }

// Neg returns −q.
func (q Rational) Neg() Rational { return Rational{}.Sub(q) }

// Quo returns q/r; r is not 0.
func (q Rational) Quo(r Rational) Rational {
	if r.IsOne() {
		return q
	}
	return normal(new(big.Rat).Quo(q.Rat(), r.Rat()))
}

// Float64 returns the nearest double.
func (q Rational) Float64() float64 {
	if q.fraction == nil {
		return float64(q.whole)
	}
	x, _ := q.fraction.Float64()
	return x
}

// String returns an integer, or a fraction in lowest terms such as "3/4".
func (q Rational) String() string {
	if q.fraction == nil {
		return strconv.FormatInt(q.whole, 10)
	}
	return q.fraction.RatString()
}

// multiply returns a·b, and whether it fits.
func multiply(a, b int64) (int64, bool) {
	if a == 0 || b == 0 {
		return 0, true
	}
	hi, lo := bits.Mul64(magnitude(a), magnitude(b))
	if hi != 0 || lo > 1<<63-1 {
		return 0, false
	}
	product := int64(lo)
	if (a < 0) != (b < 0) {
		product = -product
	}
	return product, true
}

func magnitude(a int64) uint64 {
	if a < 0 {
		return -uint64(a)
	}
	return uint64(a)
}
