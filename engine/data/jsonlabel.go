package data

import (
	"bytes"
	"math"
	"math/bits"

	"guardrow/api"
	"guardrow/engine"
)

// labels reads a factor's column from its first element, and returns its length and where it ends.
func (s *jsonScan) labels(index, pos int) (rows, end int) {
	column := &s.columns.Factors[index]
	d := newDictionary()
	narrow, pos, row, why := labelLoop(s, column.Name, d, make([]uint8, s.expect(pos)), pos, 0)
	if why == widen {
		var middle []uint16
		middle, pos, row, why = labelLoop(s, column.Name, d, widened[uint16](narrow, row), pos, row)
		if why == widen {
			var wide []uint32
			wide, pos, row, why = labelLoop(s, column.Name, d, widened[uint32](middle, row), pos, row)
			column.Codes = codesOf(wide[:min(row, len(wide))])
		} else {
			column.Codes = codesOf(middle[:min(row, len(middle))])
		}
	} else {
		column.Codes = codesOf(narrow[:min(row, len(narrow))])
	}
	if why == failed {
		return row, -1
	}
	column.Labels = d.labels()
	return row, pos
}

// labelLoop reads labels from pos, which is at an element, into codes[row:].
func labelLoop[T width](s *jsonScan, name string, d *dictionary, codes []T, pos, row int) ([]T, int, int, outcome) {
	text := s.text
	for {
		pos, row = nearLabels(&d.near, text, codes, pos, row)
		var entry uint32
		next := pos
		if pos+20 <= len(text) {
			entry, next = d.quick(text, pos)
		}
		if entry == 0 {
			if entry, next = s.label(name, d, pos, row); next < 0 {
				return codes, pos, row, failed
			}
		}
		code := entryNumber(entry)
		if code > widest[T]() {
			return codes, pos, row, widen
		}
		if row >= len(codes) && row < s.room() {
			codes = grown(codes, min(2*row+16, s.room()))
		}
		if row < len(codes) {
			codes[row] = T(code)
		}
		row++
		var last bool
		if pos, last = s.separator(next); pos < 0 {
			return codes, pos, row, failed
		}
		if last {
			return codes, pos, row, ended
		}
	}
}

// nearLabels reads labels from pos as long as they are written alike, short, were seen lately and are followed by another
// element. Their codes fit, since they were stored before.
func nearLabels[T width](near *nearTable, text []byte, codes []T, pos, row int) (int, int) {
	places, shift := near.places, near.shift&63
	if places == nil || pos >= len(text) {
		return pos, row
	}
	opens := text[pos] == '"'
	closing, way, quotes := uint64(','*ones), uint64(nearNumber), 0
	if opens {
		closing, way, quotes = '"'*ones, 0, 1
	}
	for pos+12 <= len(text) && row < len(codes) && (text[pos] == '"') == opens {
		key := word64(text, pos+quotes)
		end := zeroBytes(key ^ closing)
		if end == 0 {
			break
		}
		n := bits.TrailingZeros64(end) &^ 7
		key = key&(1<<(n&63)-1) | uint64(n)<<53 | way
		place := &places[nearHash(key)>>shift]
		if place.key != key || n == 0 {
			break
		}
		next := pos + 2*quotes + n>>3
		if text[next] != ',' {
			break
		}
		if next++; text[next] == ' ' {
			next++
		}
		if text[next] <= ' ' {
			break
		}
		codes[row] = T(place.number)
		row++
		pos = next
	}
	return pos, row
}

// label reads any label, known or not, or reports what stands in its place; its entry is then not to be relied on.
func (s *jsonScan) label(name string, d *dictionary, pos, row int) (entry uint32, end int) {
	const none = 1 << entryBits
	switch c := s.at(pos); {
	case c == '"':
		if end = s.str(pos); end < 0 {
			return 0, -1
		}
		raw := s.text[pos+1 : end-1]
		if len(raw) == 0 {
			s.noLabel(name, row, "is an empty text")
			return none, end
		}
		if bytes.IndexByte(raw, '\\') >= 0 {
			return d.spelling(raw, func() []byte { return unescape(nil, raw) }), end
		}
		return d.entry(raw), end
	case c == '-' || isDigit(c):
		if end = s.number(pos); end < 0 {
			return 0, -1
		}
		raw := s.text[pos:end]
		if isShortestNumber(raw) {
			return d.entry(raw), end
		}
		x, _ := parseDecimal(raw)
		if value := x.float(); math.IsInf(value, 0) || value == 0 && !x.isZero() {
			s.unusable(name, row, "a number beyond the range of a double")
			return none, end
		}
		return d.spelling(raw, func() []byte { return []byte(api.NumberLabel(x.float())) }), end
	case c == 'n':
		if end = s.word(pos, "null"); end >= 0 {
			s.noLabel(name, row, "is null")
		}
		return none, end
	}
	if end = s.value(pos); end >= 0 {
		s.unusable(name, row, kindOf(s.text[pos]))
	}
	return none, end
}

// spelling returns the entry of a label that is not its own text, made by label the first time.
func (d *dictionary) spelling(raw []byte, label func() []byte) uint32 {
	if entry, known := d.spelt[string(raw)]; known {
		return entry
	}
	if d.spelt == nil {
		d.spelt = make(map[string]uint32)
	}
	entry := d.entry(label())
	d.spelt[string(raw)] = entry
	return entry
}

func (s *jsonScan) unusable(name string, row int, what string) {
	if s.wants(api.UnusableLabel, name) {
		s.tell(api.UnusableLabel, s.row(name, row), "Row %d of %s holds %s where a label is expected. Send the level's label as a text or a number.", row+1, engine.Quote(name), what)
	}
}

// kindOf names the kind of a JSON value that begins with c.
func kindOf(c byte) string {
	switch c {
	case '{':
		return "an object"
	case '[':
		return "an array"
	case 't':
		return "true"
	case 'f':
		return "false"
	}
	return "another value"
}

// quick returns the entry of the label at pos, and where the label ends, if it is a short one that is known; otherwise 0.
// At least 20 bytes are left from pos.
func (d *dictionary) quick(text []byte, pos int) (entry uint32, end int) {
	closing, written := uint64(','*ones), uint32(asNumber)
	if text[pos] == '"' {
		closing, written = '"'*ones, asText
		pos++
	}
	lo, hi := word64(text, pos), uint64(0)
	n := bits.TrailingZeros64(zeroBytes(lo^closing)) &^ 7
	if n < 64 {
		lo &= 1<<n - 1
	} else {
		hi = word64(text, pos+8)
		n = bits.TrailingZeros64(zeroBytes(hi^closing)) &^ 7
		if n == 64 {
			return 0, 0
		}
		hi &= 1<<n - 1
		n += 64
	}
	entry = d.find(lo, hi|uint64(n)<<53)
	if entry&written == 0 {
		return 0, 0
	}
	if n < 64 {
		way := uint64(0)
		if written == asNumber {
			way = nearNumber
		}
		d.near.put(lo|uint64(n)<<53|way, entryNumber(entry), len(d.words))
	}
	return entry, pos + n>>3 + int(written>>1) // past the closing quote
}
