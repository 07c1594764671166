package data

import (
	"bytes"
	"math/bits"

	"guardrow/engine"
)

// readings reads a response's column from its first element, and returns its length and where it ends.
func (s *jsonScan) readings(name string, index, first int) (rows, end int) {
	c := &readings{name: name, index: index, offsets: s.floats(s.expect(first))}
	end, rows, why := s.readingLoop(c, first)
	if why == again {
		c.again, c.told = false, rows
		c.shift = shifter{plain: true}
		end, rows, why = s.readingLoop(c, first)
	}
	if why == failed {
		return rows, -1
	}
	c.offsets = c.offsets[:min(rows, len(c.offsets))]
	s.finish(c)
	return rows, end
}

// floats returns room for n offsets. Short columns share one allocation.
func (s *jsonScan) floats(n int) []float64 {
	const block = 4096
	if n > block/4 || s.rows < 0 {
		return make([]float64, n)
	}
	if len(s.spare) < n {
		s.spare = make([]float64, block)
	}
	cut := s.spare[:n:n]
	s.spare = s.spare[n:]
	return cut
}

// readingLoop reads readings from pos, which is at the first element.
func (s *jsonScan) readingLoop(c *readings, pos int) (end, row int, why outcome) {
	text := s.text
	quick := len(s.lost.numbers) == 0
	const enough = 16 // tries of the quickest way in vain, after which it is left
	futile := 0
	for {
		offset, next := 0.0, -1
		if quick {
			if before := row; futile < enough {
				if pos, row = nearReadings(&c.shift, text, c.offsets, pos, row); row > before {
					futile = 0
				} else {
					futile++
				}
			}
			offset, next = c.shift.quick(text, pos)
		}
		if next < 0 {
			if offset, next = s.reading(c, pos, row); next < 0 {
				return -1, row, failed
			}
			if c.again {
				return -1, row, again
			}
		}
		if row >= len(c.offsets) && row < s.room() {
			c.offsets = append(make([]float64, 0, min(2*row+16, s.room())), c.offsets...)
			c.offsets = c.offsets[:cap(c.offsets)]
		}
		if row < len(c.offsets) {
			c.offsets[row] = offset
		}
		row++
		if next+2 < len(text) && text[next] == ',' {
			if pos = next + 1; text[pos] == ' ' {
				pos++
			}
			if text[pos] <= ' ' {
				pos = s.space(pos)
			}
			continue
		}
		var last bool
		if pos, last = s.separator(next); pos < 0 {
			return -1, row, failed
		}
		if last {
			return pos, row, ended
		}
	}
}

// nearReadings reads numbers from pos as long as they are plain decimals of at most 7 characters that a step turns into
// offsets, and are followed by another element.
func nearReadings(s *shifter, text []byte, offsets []float64, pos, row int) (int, int) {
	for pos+12 <= len(text) && row < len(offsets) {
		first, sign := pos, int64(0)
		if text[pos] == '-' {
			first, sign = pos+1, -1
		}
		x, marks := digitMarks(word64(text, first))
		rest := marks & (marks - 1)
		if rest == 0 {
			break
		}
		n := bits.TrailingZeros64(marks) >> 3
		last := bits.TrailingZeros64(rest) >> 3
		decimals := last - n - 1
		if n == 0 || decimals <= 0 || text[first+n] != '.' || text[first+last] != ',' || x&0xFF == 0 && n > 1 {
			break
		}
		// Close the gap that the point leaves.
		low := uint64(1)<<(8*n&63) - 1
		m := digits8((x&low | x>>8&^low) << (8 * (9 - last) & 63))
		step := &s.steps[decimals&7]
		d := (int64(m)*step.times ^ sign) - sign - step.shift
		if m >= step.limit || uint64(d+exactInteger) > 2*exactInteger {
			break
		}
		next := first + last + 1
		if text[next] == ' ' {
			next++
		}
		if text[next] <= ' ' {
			break
		}
		offsets[row] = float64(d) / step.power
		row++
		pos = next
	}
	return pos, row
}

// quick returns the offset of the number at pos, and where the number ends: -1 unless it is a plain decimal that is
// quickly converted.
func (s *shifter) quick(text []byte, pos int) (offset float64, end int) {
	if pos+9 > len(text) {
		return 0, -1
	}
	neg := text[pos] == '-'
	if neg {
		pos++
	}
	x, marks := digitMarks(word64(text, pos))
	n := bits.TrailingZeros64(marks) >> 3
	var m uint64
	decimals := 0
	rest := marks & (marks - 1)
	switch {
	case n == 0 || x&0xFF == 0 && n > 1:
		return 0, -1
	case n < 8 && text[pos+n] != '.':
		m, end = digits8(x<<(64-8*n)), pos+n
	case n < 8 && rest != 0:
		// Close the gap that the point leaves.
		last := bits.TrailingZeros64(rest) >> 3
		decimals = last - n - 1
		low := uint64(1)<<(8*n) - 1
		m, end = digits8((x&low|x>>8&^low)<<(64-8*(last-1))), pos+last
		if decimals == 0 {
			return 0, -1
		}
	default:
		if m, decimals, end = plainDecimal(text, pos); end < 0 {
			return 0, -1
		}
	}
	if c := text[end]; c|0x20 == 'e' || c == '.' || decimals >= len(s.steps) {
		return 0, -1
	}
	offset, ok := s.steps[decimals].quick(neg, m)
	if !ok {
		end = -1
	}
	return offset, end
}

// reading reads any reading, or reports what stands in its place.
func (s *jsonScan) reading(c *readings, pos, row int) (offset float64, end int) {
	switch first := s.at(pos); {
	case first == '-' || isDigit(first):
		if end = s.number(pos); end < 0 {
			return 0, -1
		}
		raw := s.text[pos:end]
		x, _ := parseDecimal(raw)
		return s.take(c, x, row, raw), end
	case first == 'n':
		if end = s.word(pos, "null"); end >= 0 {
			s.isLost(c, row, nil)
		}
		return 0, end
	case first == '"':
		if end = s.str(pos); end >= 0 {
			s.textReading(c, s.text[pos+1:end-1], row)
		}
		return 0, end
	}
	if end = s.value(pos); end >= 0 {
		s.notNumber(c, row, kindOf(s.text[pos]), "")
	}
	return 0, end
}

// textReading reports a text that stands where a reading belongs.
func (s *jsonScan) textReading(c *readings, raw []byte, row int) {
	if bytes.IndexByte(raw, '\\') >= 0 {
		raw = unescape(nil, raw)
	}
	if s.lost.text(raw) {
		s.isLost(c, row, raw)
		return
	}
	hint := numberHint(raw)
	if _, ok := parseDecimal(raw); ok {
		hint = " Send it without the quotation marks."
	}
	s.notNumber(c, row, "the text "+engine.Quote(readable(raw)), hint)
}
