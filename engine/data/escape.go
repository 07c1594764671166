package data

import (
	"bytes"
	"unicode/utf8"
)

// unescape appends to dst what the inside of a JSON string stands for. The text was checked by reader.str. What is appended
// is never longer than what was read, so that dst may be text[:0].
func unescape(dst, text []byte) []byte {
	r := reader{text: text}
	pos := 0
	for {
		next := bytes.IndexByte(text[pos:], '\\')
		if next < 0 {
			return append(dst, text[pos:]...)
		}
		dst = append(dst, text[pos:pos+next]...)
		pos += next
		c := text[pos+1]
		if c != 'u' {
			dst = append(dst, escaped(c))
			pos += 2
			continue
		}
		char := r.hex(pos + 2)
		pos += 6
		if char >= 0xD800 && char < 0xDC00 {
			char = (char-0xD800)<<10 + (r.low(pos) - 0xDC00) + 0x10000
			pos += 6
		}
		dst = utf8.AppendRune(dst, char)
	}
}

// escaped returns the character that a backslash and c stand for.
func escaped(c byte) byte {
	switch c {
	case 'b':
		return '\b'
	case 'f':
		return '\f'
	case 'n':
		return '\n'
	case 'r':
		return '\r'
	case 't':
		return '\t'
	}
	return c
}
