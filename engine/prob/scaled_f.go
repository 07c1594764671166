package prob

import "math"

// scaledF is a value of F as pair·2^exponent, so that the square of a t, the ratio χ²/df and 1/F keep all their digits.
type scaledF struct {
	pair
	exponent int // not negative
}

// scaled returns f > 0 as a scaledF, with room for products.
func scaled(f float64) scaledF {
	if f > 0x1p400 {
		return scaledF{pair{f * 0x1p-1000, 0}, 1000}
	}
	return scaledF{pair{f, 0}, 0}
}

// inverse returns 1/f.
func (f scaledF) inverse() scaledF {
	if f.exponent == 0 && f.high < 0x1p-400 {
		r := pair{1, 0}.over(pair{f.high * 0x1p1000, f.low * 0x1p1000})
		return scaledF{r, 1000}
	}
	r := pair{1, 0}.over(f.pair)
	if f.exponent == 0 {
		return scaledF{r, 0}
	}
	return scaledF{pair{math.Ldexp(r.high, -f.exponent), math.Ldexp(r.low, -f.exponent)}, 0}
}

// lessOne returns (f − 1)/2^exponent.
func (f scaledF) lessOne() float64 {
	if f.exponent > 0 {
		return f.high // 1 is below a rounding
	}
	return f.plus(-1).high
}
