package engine

import (
	"cmp"
	"math"
	"math/big"
	"math/bits"
	"strconv"
)

// Rational is an exact rational number. Where numerator and denominator fit an int64 they are kept as such, all others as a
// big.Rat. Values are immutable, and always in lowest terms; the zero Rational is 0.
type Rational struct {
	num, rest int64    // num/(rest + 1)
	large     *big.Rat // nil where num and rest serve
}

// Whole returns n as a Rational.
func Whole(n int64) Rational { return Rational{num: n} }

// Fraction returns num/den; den is above 0.
func Fraction(num, den int64) Rational {
	if num == math.MinInt64 {
		return normal(big.NewRat(num, den))
	}
	if g := divisor(num, den); g > 1 {
		num, den = num/g, den/g
	}
	return Rational{num: num, rest: den - 1}
}

// divisor returns the greatest common divisor of |a| and b > 0.
func divisor(a, b int64) int64 {
	for a != 0 {
		a, b = b%a, a
	}
	return max(b, -b)
}

func normal(r *big.Rat) Rational {
	if r.Num().IsInt64() && r.Denom().IsInt64() {
		return Rational{num: r.Num().Int64(), rest: r.Denom().Int64() - 1}
	}
	return Rational{large: r}
}

// den returns the denominator of a number that is not large.
func (q Rational) den() int64 { return q.rest + 1 }

// Rat returns q as a big.Rat that the caller may change.
func (q Rational) Rat() *big.Rat {
	if q.large != nil {
		return new(big.Rat).Set(q.large)
	}
	return big.NewRat(q.num, q.den())
}

// Sign returns -1, 0 or 1.
func (q Rational) Sign() int {
	if q.large != nil {
		return q.large.Sign()
	}
	return cmp.Compare(q.num, 0)
}

// IsOne reports whether q = 1.
func (q Rational) IsOne() bool { return q.large == nil && q.num == 1 && q.rest == 0 }

// Equal reports whether q = r.
func (q Rational) Equal(r Rational) bool {
	if q.large == nil || r.large == nil {
		return q == r
	}
	return q.large.Cmp(r.large) == 0
}

// Mul returns q·r.
func (q Rational) Mul(r Rational) Rational {
	if q.large == nil && r.large == nil {
		num, fits := multiply(q.num, r.num)
		if q.rest == 0 && r.rest == 0 && fits {
			return Rational{num: num}
		}
		den, alsoFits := multiply(q.den(), r.den())
		if fits && alsoFits {
			return Fraction(num, den)
		}
	}
	return normal(new(big.Rat).Mul(q.Rat(), r.Rat()))
}

// Sub returns q − r.
func (q Rational) Sub(r Rational) Rational {
	if q.large == nil && r.large == nil {
		left, fitsLeft := multiply(q.num, r.den())
		right, fitsRight := multiply(r.num, q.den())
		den, fits := multiply(q.den(), r.den())
		num := left - right
		if fits && fitsLeft && fitsRight && (num < left) == (right > 0) {
			return Fraction(num, den)
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
	if r.large == nil && r.num > 0 {
		return q.Mul(Rational{num: r.den(), rest: r.num - 1})
	}
	return normal(new(big.Rat).Quo(q.Rat(), r.Rat()))
}

// Float64 returns the nearest double.
func (q Rational) Float64() float64 {
	const exact = 1 << 53 // up to here int64 and double agree, and one division is rounded once
	if q.large == nil && (q.rest == 0 || -exact <= q.num && q.num <= exact && q.rest < exact) {
		return float64(q.num) / float64(q.den())
	}
	x, _ := q.Rat().Float64()
	return x
}

// String returns an integer, or a fraction in lowest terms such as "3/4".
func (q Rational) String() string {
	switch {
	case q.large != nil:
		return q.large.RatString()
	case q.rest == 0:
		return strconv.FormatInt(q.num, 10)
	}
	return strconv.FormatInt(q.num, 10) + "/" + strconv.FormatInt(q.den(), 10)
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
