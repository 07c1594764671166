package data

import (
	"encoding/binary"
	"fmt"
	"math/bits"
	"unicode/utf8"
)

// MaxDepth is how deep arrays and objects may be nested.
const MaxDepth = 128

// SyntaxError says that a text is not JSON, or not the JSON that is read here, and where it stops being so.
type SyntaxError struct {
	Offset  int    // in bytes, within the text that was given
	Message string // a sentence
}

// Error returns the message and the offset.
func (e *SyntaxError) Error() string { return fmt.Sprintf("%s (byte %d)", e.Message, e.Offset) }

// Valid reports whether text is one strict JSON value: RFC 8259, in valid UTF-8 without lone surrogates, at most MaxDepth
// deep, and nothing after it. The error is a *SyntaxError.
func Valid(text []byte) error {
	r := reader{text: text}
	if end := r.value(r.space(0)); end >= 0 {
		r.end(end)
	}
	return r.failure()
}

// reader reads JSON from text. Its methods take a position and return the one after what they read, or -1 once something
// is wrong; err then says what.
type reader struct {
	text []byte
	err  *SyntaxError
}

// failure returns err as an error, nil where there is none.
func (r *reader) failure() error {
	if r.err == nil {
		return nil
	}
	return r.err
}

func (r *reader) fail(pos int, message string) int {
	if r.err == nil {
		r.err = &SyntaxError{Offset: min(pos, len(r.text)), Message: message}
	}
	return -1
}

// at returns the byte at pos, 0 at the end. A 0 within the text is never valid JSON.
func (r *reader) at(pos int) byte {
	if pos < len(r.text) {
		return r.text[pos]
	}
	return 0
}

// space skips white space.
func (r *reader) space(pos int) int {
	for pos < len(r.text) && isSpace(r.text[pos]) {
		pos++
	}
	return pos
}

func isSpace(c byte) bool { return c == ' ' || c == '\n' || c == '\t' || c == '\r' }

// end demands that nothing but white space is left.
func (r *reader) end(pos int) {
	if pos = r.space(pos); pos < len(r.text) {
		r.fail(pos, "There is text after the end of the JSON value.")
	}
}

// value skips one value, however deep, without recursion.
func (r *reader) value(pos int) int {
	var objects [MaxDepth / 64]uint64 // a bit per open container: whether it is an object
	depth := 0
	for {
		opened := false
		switch c := r.at(pos); c {
		case '{', '[':
			if depth == MaxDepth {
				return r.fail(pos, fmt.Sprintf("The JSON is nested more than %d deep.", MaxDepth))
			}
			bit := uint64(1) << (depth & 63)
			objects[depth>>6] &^= bit
			if c == '{' {
				objects[depth>>6] |= bit
			}
			depth++
			opened = true
			pos++
		default:
			if pos = r.scalar(pos); pos < 0 {
				return -1
			}
		}
		// After a value, or after an opening bracket: close what closes here, then go to where the next value begins.
		for {
			if depth == 0 {
				return pos
			}
			pos = r.space(pos)
			object := objects[(depth-1)>>6]>>((depth-1)&63)&1 == 1
			c := r.at(pos)
			if object && c == '}' || !object && c == ']' {
				depth--
				opened = false
				pos++
				continue
			}
			if !opened {
				if c != ',' {
					return r.fail(pos, missingComma(object, pos >= len(r.text)))
				}
				pos = r.space(pos + 1)
			}
			if object {
				if pos = r.key(pos); pos < 0 {
					return -1
				}
			}
			break
		}
	}
}

func missingComma(object, ended bool) string {
	switch {
	case ended && object:
		return "The text ends inside an object."
	case ended:
		return "The text ends inside an array."
	case object:
		return "A comma or a closing } is expected here."
	}
	return "A comma or a closing ] is expected here."
}

// key skips a member's name and its colon, to where its value begins.
func (r *reader) key(pos int) int {
	if r.at(pos) != '"' {
		return r.fail(pos, "A member's name in quotes is expected here.")
	}
	if pos = r.str(pos); pos < 0 {
		return -1
	}
	if pos = r.space(pos); r.at(pos) != ':' {
		return r.fail(pos, "A colon is expected here.")
	}
	return r.space(pos + 1)
}

// scalar skips a string, a number, true, false or null.
func (r *reader) scalar(pos int) int {
	switch c := r.at(pos); {
	case c == '"':
		return r.str(pos)
	case c == '-' || isDigit(c):
		return r.number(pos)
	case c == 't':
		return r.word(pos, "true")
	case c == 'f':
		return r.word(pos, "false")
	case c == 'n':
		return r.word(pos, "null")
	case pos >= len(r.text):
		return r.fail(pos, "The text ends where a value is expected.")
	}
	return r.fail(pos, "A JSON value is expected here.")
}

func (r *reader) word(pos int, word string) int {
	if len(r.text)-pos < len(word) || string(r.text[pos:pos+len(word)]) != word {
		return r.fail(pos, "A JSON value is expected here; NaN, Infinity and words without quotes are none.")
	}
	return pos + len(word)
}

func isDigit(c byte) bool { return c-'0' <= 9 }

// number skips a number in the strict grammar.
func (r *reader) number(pos int) int {
	if r.at(pos) == '-' {
		pos++
	}
	first := pos
	pos = r.digits(pos)
	switch {
	case pos == first:
		return r.fail(pos, "A digit is expected here.")
	case r.text[first] == '0' && pos > first+1:
		return r.fail(first, "A number has no leading zeros in JSON.")
	}
	if r.at(pos) == '.' {
		first = pos + 1
		if pos = r.digits(first); pos == first {
			return r.fail(pos, "A digit is expected after the decimal point.")
		}
	}
	if c := r.at(pos); c == 'e' || c == 'E' {
		pos++
		if c = r.at(pos); c == '+' || c == '-' {
			pos++
		}
		first = pos
		if pos = r.digits(first); pos == first {
			return r.fail(pos, "A digit is expected in the exponent.")
		}
	}
	return pos
}

func (r *reader) digits(pos int) int {
	for pos < len(r.text) && isDigit(r.text[pos]) {
		pos++
	}
	return pos
}

const (
	ones  = 0x0101010101010101
	highs = 0x8080808080808080
)

// word64 returns the eight bytes at pos, the first in the lowest place.
func word64(text []byte, pos int) uint64 { return binary.LittleEndian.Uint64(text[pos:]) }

// zeroBytes marks, in its top bit, the lowest byte of x that is 0. Higher marks may be wrong: a borrow makes them.
func zeroBytes(x uint64) uint64 { return (x - ones) &^ x & highs }

// str skips the string that opens at pos, and checks its escapes and its UTF-8.
func (r *reader) str(pos int) int {
	start := pos
	pos++
	for {
		for pos+8 <= len(r.text) {
			w := word64(r.text, pos)
			stop := zeroBytes(w^'"'*ones) | zeroBytes(w^'\\'*ones) | (w-' '*ones)&^w&highs | w&highs
			if stop != 0 {
				pos += bits.TrailingZeros64(stop) >> 3
				break
			}
			pos += 8
		}
		if pos >= len(r.text) {
			return r.fail(start, "A string is not closed.")
		}
		switch c := r.text[pos]; {
		case c == '"':
			return pos + 1
		case c == '\\':
			if pos = r.escape(pos); pos < 0 {
				return -1
			}
		case c < ' ':
			return r.fail(pos, "A control character in a string has to be escaped.")
		case c < utf8.RuneSelf:
			pos++
		default:
			char, size := utf8.DecodeRune(r.text[pos:])
			if char == utf8.RuneError && size == 1 {
				return r.fail(pos, "The text is not valid UTF-8.")
			}
			pos += size
		}
	}
}

// escape skips the escape at pos. A surrogate has to be one of a pair.
func (r *reader) escape(pos int) int {
	switch r.at(pos + 1) {
	case '"', '\\', '/', 'b', 'f', 'n', 'r', 't':
		return pos + 2
	case 'u':
		char := r.hex(pos + 2)
		switch {
		case char < 0:
			return r.fail(pos, `Four hexadecimal digits are expected after \u.`)
		case char >= 0xD800 && char < 0xDC00:
			if low := r.low(pos + 6); low < 0 {
				return r.fail(pos, "Half of a surrogate pair stands alone.")
			}
			return pos + 12
		case char >= 0xDC00 && char < 0xE000:
			return r.fail(pos, "Half of a surrogate pair stands alone.")
		}
		return pos + 6
	}
	return r.fail(pos, "There is no such escape in JSON.")
}

// low returns the second half of a surrogate pair written at pos, or -1.
func (r *reader) low(pos int) rune {
	if r.at(pos) != '\\' || r.at(pos+1) != 'u' {
		return -1
	}
	if char := r.hex(pos + 2); char >= 0xDC00 && char < 0xE000 {
		return char
	}
	return -1
}

// hex returns the number written as four hexadecimal digits at pos, or -1.
func (r *reader) hex(pos int) rune {
	var char rune
	for i := range 4 {
		c := r.at(pos + i)
		switch {
		case isDigit(c):
			c -= '0'
		case c|0x20 >= 'a' && c|0x20 <= 'f':
			c = (c | 0x20) - 'a' + 10
		default:
			return -1
		}
		char = char<<4 | rune(c)
	}
	return char
}
