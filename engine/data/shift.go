package data

import (
	"math"
	"math/big"
	"math/bits"
	"strconv"
)

// shifter turns the readings of one column into offsets from the first (see the package's comment).
type shifter struct {
	plain bool // no shift: each reading is rounded as it is
	set   bool
	first decimal // 0 if plain
	steps [mantissaDigits]step
}

// step is what turns ±m·10^-k, for one k, into an offset if m is below limit:
//
//	offset = (±m·times − shift) / power
//
// where the bracket is below 2^63 and power is a power of ten that is a double.
type step struct {
	limit uint64 // 0 where there is no quick way
	times int64
	shift int64
	power float64
}

// A verdict says what became of a reading.
type verdict uint8

const (
	taken       verdict = iota
	outOfRange          // beyond the doubles, or not 0 and nearer to it than any double
	unshiftable         // the column has to be read again, plain
)

// wide is the power of ten by which two numbers may differ and still be subtracted exactly, whatever their digits.
const wide = 20

// exactInteger is the largest integer up to which all integers are doubles.
const exactInteger = 1 << 53

// start makes x the first reading of the column.
func (s *shifter) start(x decimal) {
	s.set = true
	s.first = x
	if s.plain {
		s.first = decimal{}
	}
	first := s.first
	for ; first.e > 0 && first.m < 1e17; first.e-- {
		first.m *= 10
	}
	for k := range s.steps {
		s.steps[k] = newStep(&first, k)
	}
}

// newStep returns the step for k decimals after a first reading.
func newStep(first *decimal, k int) step {
	const bound = 1 << 62
	decimals := -first.e
	if decimals < 0 || decimals >= mantissaDigits || first.digits != nil {
		return step{}
	}
	times, shift := uint64(1), first.m
	if decimals > k {
		times = powers[decimals-k]
	} else if hi, lo := bits.Mul64(first.m, powers[k-decimals]); hi == 0 {
		shift = lo
	} else {
		return step{}
	}
	if shift >= bound {
		return step{}
	}
	signed := int64(shift)
	if first.neg {
		signed = -signed
	}
	return step{limit: bound / times, times: int64(times), shift: signed, power: floatPowers[max(k, decimals)]}
}

// quick returns the offset of ±m·10^-k, or false where only offset can tell.
func (s *step) quick(neg bool, m uint64) (float64, bool) {
	if m >= s.limit {
		return 0, false
	}
	d := int64(m) * s.times
	if neg {
		d = -d
	}
	d -= s.shift
	// An integer and a power of ten that are doubles: their quotient is rounded once.
	return float64(d) / s.power, uint64(d+exactInteger) <= 2*exactInteger
}

// offset returns x − first, exact and then rounded once.
func (s *shifter) offset(x decimal) (float64, verdict) {
	if !s.inRange(&x) {
		return 0, outOfRange
	}
	if !s.set {
		s.start(x)
	}
	if s.first.isZero() {
		return x.float() + 0, taken // + 0 turns −0 into 0
	}
	if x.digits == nil && s.first.digits == nil {
		if difference, ok := s.subtract(&x); ok {
			return difference, verdictOn(difference)
		}
	}
	if !x.isZero() {
		if apart := x.magnitude() - s.first.magnitude(); apart >= wide || apart <= -wide {
			return 0, unshiftable
		}
	}
	difference := s.subtractBig(&x)
	return difference, verdictOn(difference)
}

func verdictOn(difference float64) verdict {
	if math.IsInf(difference, 0) {
		return unshiftable
	}
	return taken
}

// inRange reports whether x is 0 or rounds to a double that is neither 0 nor infinite.
func (s *shifter) inRange(x *decimal) bool {
	if x.isZero() {
		return true
	}
	switch k := x.magnitude(); {
	case k > 310 || k < -330:
		return false
	case k < 300 && k > -300:
		return true
	}
	f := x.float()
	return f != 0 && !math.IsInf(f, 0)
}

// subtract returns x − first if that fits 128 bits at a common exponent.
func (s *shifter) subtract(x *decimal) (float64, bool) {
	e := min(x.e, s.first.e)
	if x.m == 0 {
		e = s.first.e
	}
	xhi, xlo, fits := scale(x.m, x.e-e)
	if !fits {
		return 0, false
	}
	shi, slo, fits := scale(s.first.m, s.first.e-e)
	if !fits {
		return 0, false
	}
	if x.neg != s.first.neg {
		lo, carry := bits.Add64(xlo, slo, 0)
		hi, _ := bits.Add64(xhi, shi, carry)
		return round128(x.neg, hi, lo, -e), true
	}
	neg := x.neg
	if shi > xhi || shi == xhi && slo > xlo {
		xhi, xlo, shi, slo = shi, slo, xhi, xlo
		neg = !neg
	}
	lo, borrow := bits.Sub64(xlo, slo, 0)
	hi, _ := bits.Sub64(xhi, shi, borrow)
	return round128(neg, hi, lo, -e), true
}

// scale returns m·10^k if it is below 2^127.
func scale(m uint64, k int) (hi, lo uint64, fits bool) {
	if m == 0 {
		return 0, 0, true
	}
	if k > 2*mantissaDigits {
		return 0, 0, false
	}
	lo = m
	for ; k > 0; k -= mantissaDigits {
		power := powers[min(k, mantissaDigits)]
		over, high := bits.Mul64(hi, power)
		carry, low := bits.Mul64(lo, power)
		high, out := bits.Add64(high, carry, 0)
		if over != 0 || out != 0 || high>>63 != 0 {
			return 0, 0, false
		}
		hi, lo = high, low
	}
	return hi, lo, true
}

// subtractBig returns x − first for any digits, the two being less than wide powers of ten apart.
func (s *shifter) subtractBig(x *decimal) float64 {
	e := min(x.e, s.first.e)
	if x.isZero() {
		e = s.first.e
	}
	d := x.integer(e)
	d.Sub(d, s.first.integer(e))
	return roundText(d.Append(nil, 10), -e)
}

// integer returns x·10^-e, which has to be an integer.
func (x *decimal) integer(e int) *big.Int {
	n := new(big.Int).SetUint64(x.m)
	if x.digits != nil {
		n.SetString(string(x.digits), 10)
	}
	if x.neg {
		n.Neg(n)
	}
	if x.isZero() {
		return n
	}
	return n.Mul(n, new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(x.e-e)), nil))
}

// round128 returns the double nearest to ±(hi·2^64 + lo)·10^-k.
func round128(neg bool, hi, lo uint64, k int) float64 {
	var f float64
	switch {
	case hi == 0 && lo <= exactInteger && k >= 0 && k < len(floatPowers):
		f = float64(lo) / floatPowers[k]
	case hi == 0 && lo <= exactInteger && k < 0 && -k < len(floatPowers):
		f = float64(lo) * floatPowers[-k]
	case k >= 0 && k <= mantissaDigits:
		f = divide128(hi, lo, powers[k])
	default:
		n := new(big.Int).SetUint64(hi)
		n.Lsh(n, 64)
		f = roundText(n.Or(n, new(big.Int).SetUint64(lo)).Append(nil, 10), k)
	}
	if neg {
		return 0 - f
	}
	return f
}

// divide128 returns the double nearest to (hi·2^64 + lo) / by, which is not 0: a quotient of at least 63 bits whose
// lowest bit also stands for all that follows is rounded by the conversion, to nearest, ties to even.
func divide128(hi, lo, by uint64) float64 {
	up := 0
	if hi == 0 {
		hi, lo, up = lo, 0, 64
	}
	n := bits.LeadingZeros64(hi)
	hi, lo = hi<<n|lo>>(64-n), lo<<n
	up += n
	high := hi / by
	low, rest := bits.Div64(hi%by, lo, by)
	if high != 0 {
		n = bits.Len64(high)
		lost := low << (64 - n)
		low = high<<(64-n) | low>>n
		up -= n
		rest |= lost
	}
	if rest != 0 {
		low |= 1
	}
	return float64(low) * math.Float64frombits(uint64(1023-up)<<52)
}

// roundText returns the double nearest to an integer's digits times 10^-k.
func roundText(digits []byte, k int) float64 {
	f, _ := strconv.ParseFloat(string(strconv.AppendInt(append(digits, 'e'), int64(-k), 10)), 64) // ±Inf beyond the range
	return f + 0
}
