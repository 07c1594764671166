package data

import (
	"bytes"
	"math/bits"
	"strconv"
)

// decimal is a number as it was written: ±m·10^e. Where more than 19 digits count, digits holds them in place of m.
type decimal struct {
	neg    bool
	m      uint64
	e      int
	digits []byte // nil if m holds the number; otherwise from the first digit that is not 0 to the last
}

// maxExponent bounds the exponents that are kept apart: far beyond any double, and far below an overflow of int.
const maxExponent = 1 << 30

// mantissaDigits is how many digits always fit m.
const mantissaDigits = 19

// parseDecimal reads all of text as a number: digits with a point before, among or after them, or none, then perhaps an
// exponent. It takes what JSON takes and also a leading +, leading zeros, and a point at either end.
func parseDecimal(text []byte) (decimal, bool) {
	neg := false
	if len(text) > 0 && (text[0] == '-' || text[0] == '+') {
		neg = text[0] == '-'
		text = text[1:]
	}
	whole := leadingDigits(text)
	text = text[len(whole):]
	var fraction []byte
	if len(text) > 0 && text[0] == '.' {
		fraction = leadingDigits(text[1:])
		text = text[1+len(fraction):]
	}
	exponent, ok := parseExponent(text)
	if !ok || len(whole)+len(fraction) == 0 {
		return decimal{}, false
	}
	return newDecimal(neg, whole, fraction, exponent), true
}

func leadingDigits(text []byte) []byte {
	n := 0
	for n < len(text) && isDigit(text[n]) {
		n++
	}
	return text[:n]
}

// parseExponent reads nothing, or all of text as e, a sign or none, and digits.
func parseExponent(text []byte) (int, bool) {
	if len(text) == 0 {
		return 0, true
	}
	if text[0]|0x20 != 'e' {
		return 0, false
	}
	text = text[1:]
	neg := false
	if len(text) > 0 && (text[0] == '-' || text[0] == '+') {
		neg = text[0] == '-'
		text = text[1:]
	}
	if len(text) == 0 || len(leadingDigits(text)) != len(text) {
		return 0, false
	}
	e := 0
	for _, c := range text {
		e = min(10*e+int(c-'0'), maxExponent)
	}
	if neg {
		e = -e
	}
	return e, true
}

// newDecimal returns whole.fraction × 10^exponent.
func newDecimal(neg bool, whole, fraction []byte, exponent int) decimal {
	x := decimal{neg: neg, e: exponent - len(fraction)}
	if whole = bytes.TrimLeft(whole, "0"); len(whole) == 0 {
		fraction = bytes.TrimLeft(fraction, "0")
	}
	if n := len(whole) + len(fraction); n > mantissaDigits {
		trimmed := bytes.TrimRight(fraction, "0")
		if len(trimmed) == 0 {
			whole = bytes.TrimRight(whole, "0")
		}
		fraction = trimmed
		x.e += n - len(whole) - len(fraction)
	}
	if len(whole)+len(fraction) > mantissaDigits {
		x.setDigits(whole, fraction)
		return x
	}
	for _, part := range [][]byte{whole, fraction} {
		for _, c := range part {
			x.m = 10*x.m + uint64(c-'0')
		}
	}
	if x.m == 0 {
		return decimal{}
	}
	return x
}

// manyDigits is how many digits of one number are kept. The exact decimal of any double has at most 767, so that those
// beyond this matter only by whether there are any: the last one kept stands for them.
const manyDigits = 1200

func (x *decimal) setDigits(whole, fraction []byte) {
	n := len(whole) + len(fraction)
	x.digits = make([]byte, 0, min(n, manyDigits+1))
	for _, part := range [][]byte{whole, fraction} {
		x.digits = append(x.digits, part[:min(len(part), manyDigits-len(x.digits))]...)
	}
	if n > manyDigits {
		x.digits = append(x.digits, '1')
		x.e += n - len(x.digits)
	}
}

func (x *decimal) isZero() bool { return x.m == 0 && x.digits == nil }

// magnitude returns the k with 10^(k-1) ≤ |x| < 10^k, for x that is not 0.
func (x *decimal) magnitude() int {
	if x.digits != nil {
		return len(x.digits) + x.e
	}
	n := 1
	for n < len(powers) && x.m >= powers[n] {
		n++
	}
	return n + x.e
}

// text returns x as ±digits and an exponent, the digits ending in one that is not 0: equal numbers have equal texts.
func (x *decimal) text() []byte {
	if x.isZero() {
		return []byte{'0'}
	}
	var text []byte
	if x.neg {
		text = append(text, '-')
	}
	start := len(text)
	if x.digits != nil {
		text = append(text, x.digits...)
	} else {
		text = strconv.AppendUint(text, x.m, 10)
	}
	n := start + len(bytes.TrimRight(text[start:], "0"))
	e := x.e + len(text) - n
	return strconv.AppendInt(append(text[:n], 'e'), int64(e), 10)
}

// float returns the double nearest to x; ±Inf beyond the range, ±0 for what rounds to it.
func (x *decimal) float() float64 {
	if x.digits == nil {
		return round128(x.neg, 0, x.m, -x.e)
	}
	f, _ := strconv.ParseFloat(string(x.text()), 64) // beyond the range it is ±Inf, as wanted
	return f
}

// powers are the powers of ten that fit 64 bits.
var powers = func() (p [mantissaDigits + 1]uint64) {
	p[0] = 1
	for i := 1; i < len(p); i++ {
		p[i] = 10 * p[i-1]
	}
	return p
}()

// floatPowers are the powers of ten that are doubles.
var floatPowers = func() (p [23]float64) {
	p[0] = 1
	for i := 1; i < len(p); i++ {
		p[i] = 10 * p[i-1]
	}
	return p
}()

// digits8 returns the number whose eight decimal digits are the bytes of x, the first in the lowest place.
func digits8(x uint64) uint64 {
	const mask = 0x000000FF000000FF
	x = x*10 + x>>8
	return ((x&mask)*(100+1000000<<32) + (x>>16&mask)*(1+10000<<32)) >> 32
}

// digitMarks returns the eight characters of w less '0', and marks from the first that is no digit. The first mark is
// right; the one after it is too if the first stands for a point, since that adds without a carry.
func digitMarks(w uint64) (x, marks uint64) {
	x = w ^ 0x3030303030303030
	return x, ((x + 0x7676767676767676) | x) & highs
}

// plainDecimal reads digits with a point among them, or none, from pos: at most 19 in all, no needless leading zeros, no
// exponent. It returns m and the number of decimals, and where the number ends; -1 where this way does not cover it.
func plainDecimal(text []byte, pos int) (m uint64, decimals, end int) {
	start := pos
	m, end = digitRun(text, pos, 0)
	whole := end - start
	if end < 0 || whole == 0 || whole > 1 && text[start] == '0' {
		return 0, 0, -1
	}
	if text[end] != '.' {
		if whole > mantissaDigits {
			return 0, 0, -1
		}
		return m, 0, end
	}
	pos = end + 1
	m, end = digitRun(text, pos, m)
	decimals = end - pos
	if decimals <= 0 || whole+decimals > mantissaDigits {
		return 0, 0, -1
	}
	return m, decimals, end
}

// digitRun appends the digits from pos to m, and returns where they end, which is inside the text; -1 near the text's end
// or after far too many digits.
func digitRun(text []byte, pos int, m uint64) (uint64, int) {
	for range 3 {
		if pos+8 > len(text) {
			return 0, -1
		}
		x, marks := digitMarks(word64(text, pos))
		if marks != 0 {
			n := bits.TrailingZeros64(marks) >> 3
			return m*powers[n] + digits8(x<<(64-8*n)), pos + n
		}
		m = m*1e8 + digits8(x)
		pos += 8
	}
	return 0, -1
}
