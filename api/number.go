package api

import (
	"math"
	"strconv"
)

// Number is a number in an answer that may be left out (the zero Number), be null because it applies but cannot be
// computed (Null; a reason stands beside it), or have a value. Fields of this type carry the tag omitzero.
type Number struct {
	value float64
	state numberState
}

type numberState uint8

const (
	leftOut numberState = iota
	null
	valued
)

// Null is the Number that applies but cannot be computed.
var Null = Number{state: null}

// Num returns x as a Number, and Null where x is NaN or infinite: JSON has neither.
func Num(x float64) Number {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return Null
	}
	return Number{value: x, state: valued}
}

// IsZero reports whether n is left out.
func (n Number) IsZero() bool { return n.state == leftOut }

// Value returns the number, and whether there is one.
func (n Number) Value() (float64, bool) { return n.value, n.state == valued }

// MarshalJSON writes the shortest decimal that reads back as the same double, or null.
func (n Number) MarshalJSON() ([]byte, error) {
	if n.state != valued {
		return []byte("null"), nil
	}
	return appendNumber(nil, n.value), nil
}

// UnmarshalJSON reads a number or null.
func (n *Number) UnmarshalJSON(text []byte) error {
	if string(text) == "null" {
		*n = Null
		return nil
	}
	x, err := strconv.ParseFloat(string(text), 64)
	if err != nil {
		return err
	}
	*n = Num(x)
	return nil
}

// appendNumber appends x the way ECMAScript prints it (RFC 8785): plain between 1e-6 and 1e21, otherwise with an exponent.
func appendNumber(text []byte, x float64) []byte {
	if size := math.Abs(x); size != 0 && (size < 1e-6 || size >= 1e21) {
		text = strconv.AppendFloat(text, x, 'e', -1, 64)
		// 1e-07 is written 1e-7.
		if n := len(text); n >= 4 && text[n-4] == 'e' && text[n-2] == '0' {
			text[n-2] = text[n-1]
			text = text[:n-1]
		}
		return text
	}
	return strconv.AppendFloat(text, x, 'f', -1, 64)
}
