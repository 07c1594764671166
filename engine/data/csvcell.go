package data

import (
	"bytes"
	"fmt"
	"math/bits"
	"unicode/utf8"

	"guardrow/engine"
)

// cell reads the cell at pos into its column, and returns where it ends; -1 where the table is malformed.
func (s *csvScan) cell(c *csvColumn, pos, row int) int {
	switch {
	case c.skip || c.use == unused:
		_, end := s.anyCell(pos, row)
		return end
	case c.use == asFactor:
		code, end := uint32(0), 0
		switch {
		case pos+21 > len(s.text):
		case s.text[pos] == '"':
			code, end = c.dict.quickQuoted(s.text, pos)
		default:
			code, end = c.dict.quickCell(s.text, pos)
		}
		if code == 0 {
			if code, end = s.labelCell(c, pos, row); end < 0 {
				return -1
			}
		}
		if row < s.room {
			c.put(row, code-1)
		}
		return end
	}
	offset, end := 0.0, -1
	if len(s.lost.numbers) == 0 {
		offset, end = c.shift.quick(s.text, pos)
	}
	if end < 0 || s.text[end] != ',' && s.text[end] != '\n' && lineEnd(s.text, end) == end {
		if offset, end = s.readingCell(c.readings, pos, row); end < 0 {
			return -1
		}
	}
	if row < s.room {
		c.offsets[row] = offset
	}
	return end
}

// put stores a code, in a wider type if need be.
func (c *csvColumn) put(row int, code uint32) {
	switch {
	case c.codes.U8 != nil && code <= widest[uint8]():
		c.codes.U8[row] = uint8(code)
	case c.codes.U8 != nil:
		c.codes = Codes{U16: widened[uint16](c.codes.U8, row)}
		c.put(row, code)
	case c.codes.U16 != nil && code <= widest[uint16]():
		c.codes.U16[row] = uint16(code)
	case c.codes.U16 != nil:
		c.codes = Codes{U32: widened[uint32](c.codes.U16, row)}
		c.put(row, code)
	default:
		c.codes.U32[row] = code
	}
}

// quickCell returns one more than the number of the label at pos, and where its cell ends, if it is a short one that is
// known and stands without quotation marks; otherwise 0. At least 16 bytes are left from pos.
func (d *dictionary) quickCell(text []byte, pos int) (code uint32, end int) {
	lo, hi := word64(text, pos), uint64(0)
	n := stop(lo)
	switch {
	case n == 0:
		return 0, 0
	case n < 64:
		lo &= 1<<(n&63) - 1
		if d.near.places != nil {
			if place := &d.near.places[nearHash(lo|uint64(n)<<53)>>(d.near.shift&63)]; place.key == lo|uint64(n)<<53 {
				return place.number + 1, pos + n>>3
			}
		}
	default:
		hi = word64(text, pos+8)
		m := stop(hi)
		if m == 64 {
			return 0, 0
		}
		hi &= 1<<(m&63) - 1
		n += m
	}
	entry := d.find(lo, hi|uint64(n)<<53)
	if entry == 0 {
		return 0, 0
	}
	if n < 64 {
		d.near.put(lo|uint64(n)<<53, entryNumber(entry), len(d.words))
	}
	return entryNumber(entry) + 1, pos + n>>3
}

// quickQuoted is quickCell for a label in quotation marks, none inside. At least 21 bytes are left from pos.
func (d *dictionary) quickQuoted(text []byte, pos int) (code uint32, end int) {
	entry, end := d.quick(text, pos)
	if entry == 0 || text[end] != ',' && lineEnd(text, end) == end {
		return 0, 0
	}
	return entryNumber(entry) + 1, end
}

// stop returns how many bits of w come before the first comma, quotation mark or line break.
func stop(w uint64) int {
	return bits.TrailingZeros64(zeroBytes(w^','*ones)|zeroBytes(w^'\n'*ones)|zeroBytes(w^'\r'*ones)|zeroBytes(w^'"'*ones)) &^ 7
}

// labelCell reads any label, and returns one more than its number; or it reports that there is none.
func (s *csvScan) labelCell(c *csvColumn, pos, row int) (code uint32, end int) {
	raw, end := s.anyCell(pos, row)
	switch {
	case end < 0:
		return 0, -1
	case len(raw) == 0:
		s.noLabel(c.name, row, "is empty")
		return 1, end
	case !utf8.Valid(raw):
		s.malformed(fmt.Sprintf("Row %d", row+1), "")
		return 0, -1
	}
	return entryNumber(c.dict.entry(raw)) + 1, end
}

// readingCell reads any reading, or reports what stands in its place.
func (s *csvScan) readingCell(c *readings, pos, row int) (offset float64, end int) {
	raw, end := s.anyCell(pos, row)
	if end < 0 {
		return 0, -1
	}
	text := bytes.Trim(raw, " \t")
	if len(text) == 0 {
		s.isLost(c, row, nil)
		return 0, end
	}
	if s.lost.text(raw) || s.lost.text(text) {
		s.isLost(c, row, text)
		return 0, end
	}
	x, ok := parseDecimal(text)
	if !ok {
		s.notNumber(c, row, engine.Quote(readable(raw)), numberHint(text))
		return 0, end
	}
	return s.take(c, x, row, text), end
}

// anyCell returns the text of a cell and where it ends; -1 where it is malformed, which it reports.
func (s *csvScan) anyCell(pos, row int) (raw []byte, end int) {
	raw, end, what := csvCell(s.text, pos)
	if what != "" {
		s.malformed(fmt.Sprintf("Row %d", row+1), what)
		return nil, -1
	}
	return raw, end
}

// csvCell returns the text of the cell at pos, and where it ends: at a comma, a line break or the end of the text. What is
// not empty if the cell is malformed.
func csvCell(text []byte, pos int) (raw []byte, end int, what string) {
	if pos < len(text) && text[pos] == '"' {
		return quotedCell(text, pos)
	}
	for end = pos; end < len(text); end++ {
		switch text[end] {
		case ',', '\n':
			return text[pos:end], end, ""
		case '\r':
			if lineEnd(text, end) != end {
				return text[pos:end], end, ""
			}
			return nil, -1, "holds a carriage return that no line feed follows. End lines with LF or CRLF, or put the cell into quotation marks"
		case '"':
			return nil, -1, "holds a quotation mark inside a cell that does not begin with one. Put the whole cell into quotation marks and double those inside"
		}
	}
	return text[pos:end], end, ""
}

// quotedCell is csvCell for a cell in quotation marks.
func quotedCell(text []byte, pos int) (raw []byte, end int, what string) {
	pos++
	for end = pos; ; end += 2 {
		next := bytes.IndexByte(text[end:], '"')
		if next < 0 {
			return nil, -1, "opens a quotation mark that is not closed"
		}
		if raw == nil {
			raw = text[end : end+next : end+next] // copied only if a quotation mark has to be put in
		} else {
			raw = append(raw, text[end:end+next]...)
		}
		end += next
		if end+1 >= len(text) || text[end+1] != '"' {
			break
		}
		raw = append(raw, '"')
	}
	end++
	if end < len(text) && text[end] != ',' && lineEnd(text, end) == end {
		return nil, -1, "has text after the closing quotation mark of a cell. Double the quotation marks inside a cell"
	}
	return raw, end, ""
}
