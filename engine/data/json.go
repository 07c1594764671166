package data

import (
	"bytes"
	"fmt"
	"math"
	"math/bits"

	"guardrow/api"
	"guardrow/engine"
)

// ScanJSON reads an object with one array per column. The columns of factors hold labels: a text, or a number that stands
// for its shortest decimal text (api.NumberLabel); those of responses hold numbers. All other columns are checked to be JSON
// and named in Ignored.
//
// It returns the columns; or what is wrong with them, all of it; or, where text is not one strict JSON object (see Valid), a
// *SyntaxError, at which it stops.
func ScanJSON(text []byte, plan Plan) (*Columns, []engine.Fault, error) {
	s := jsonScan{scan: newScan(&plan, "data", true), reader: reader{text: text}, rows: -1}
	if end := s.object(s.space(0)); end >= 0 {
		s.end(end)
	}
	if s.err != nil {
		return nil, nil, s.err
	}
	s.absent("")
	s.unequal()
	if len(s.lengths) > 0 {
		s.size(s.longest())
	}
	columns, faults := s.result()
	return columns, faults, nil
}

// jsonScan reads the columns of an object.
type jsonScan struct {
	*scan
	reader
	rows    int // of the first column; -1 before it was read
	lengths []columnLength
	spare   []float64 // from which short columns are cut
}

type columnLength struct {
	name string
	rows int
}

// object reads the columns.
func (s *jsonScan) object(pos int) int {
	if s.at(pos) != '{' {
		return s.fail(pos, "The data are an object with one array per column.")
	}
	if pos = s.space(pos + 1); s.at(pos) == '}' {
		return pos + 1
	}
	for columns := 0; ; columns++ {
		start := pos
		if pos = s.key(pos); pos < 0 {
			return -1
		}
		if columns == MaxColumns {
			return s.fail(start, fmt.Sprintf("The data have more than %d columns.", MaxColumns))
		}
		if pos = s.anyColumn(s.name(start), pos); pos < 0 {
			return -1
		}
		pos = s.space(pos)
		switch s.at(pos) {
		case ',':
			pos = s.space(pos + 1)
		case '}':
			return pos + 1
		default:
			return s.fail(pos, missingComma(true, pos >= len(s.text)))
		}
	}
}

// name returns the string at pos, which was checked.
func (s *jsonScan) name(pos int) string {
	raw := s.text[pos+1 : s.str(pos)-1]
	if bytes.IndexByte(raw, '\\') >= 0 {
		raw = unescape(nil, raw)
	}
	return string(raw)
}

// anyColumn reads the column at pos.
func (s *jsonScan) anyColumn(name string, pos int) int {
	role := s.next(name)
	if role.use == unused {
		return s.value(pos)
	}
	if s.at(pos) != '[' {
		if s.wants(api.NotAColumn, name) {
			s.tell(api.NotAColumn, s.scan.column(name), "The column %s is not an array. Send one value per row, in square brackets.", engine.Quote(name))
		}
		return s.value(pos)
	}
	first := s.space(pos + 1)
	empty := s.at(first) == ']'
	rows, end := 0, first+1
	switch {
	case empty:
	case role.use == asFactor:
		rows, end = s.labels(role.index, first)
	default:
		rows, end = s.readings(name, role.index, first)
	}
	if end < 0 {
		return -1
	}
	if s.rows < 0 {
		s.rows = min(rows, s.plan.rowLimit())
	}
	s.lengths = append(s.lengths, columnLength{name, rows})
	return end
}

// expect returns how many rows to make room for: those of the first column, as far as there are bytes for them, or an
// estimate from its commas. Brackets and commas in labels mislead it, which costs no more than time or room.
func (s *jsonScan) expect(pos int) int {
	inside := s.text[pos:]
	if s.rows >= 0 {
		inside = inside[:min(len(inside), 2*s.rows)]
	}
	if end := bytes.IndexByte(inside, ']'); end >= 0 {
		inside = inside[:end]
	}
	if s.rows >= 0 {
		return min(s.rows, len(inside)/2+1)
	}
	return min(bytes.Count(inside, comma)+1, s.plan.rowLimit())
}

var comma = []byte{','}

// room returns how many rows are kept at most.
func (s *jsonScan) room() int {
	if s.rows >= 0 {
		return s.rows
	}
	return s.plan.rowLimit()
}

// An outcome says why a loop over a column stopped.
type outcome uint8

const (
	ended  outcome = iota
	failed         // the syntax is wrong
	widen          // the next code needs a wider type
	again          // the column has to be read again, plain
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

// separator goes from the end of an element to the next one, or past the end of the array.
func (s *jsonScan) separator(pos int) (next int, last bool) {
	pos = s.space(pos)
	switch s.at(pos) {
	case ',':
		return s.space(pos + 1), false
	case ']':
		return pos + 1, true
	}
	return s.fail(pos, missingComma(false, pos >= len(s.text))), false
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

// longest returns the largest number of rows.
func (s *jsonScan) longest() int {
	most := 0
	for _, l := range s.lengths {
		most = max(most, l.rows)
	}
	return most
}

// unequal reports columns of different length, all in one fault.
func (s *jsonScan) unequal() {
	type group struct {
		rows  int
		names []string
	}
	var groups []group
	for _, l := range s.lengths {
		i := 0
		for i < len(groups) && groups[i].rows != l.rows {
			i++
		}
		if i == len(groups) {
			groups = append(groups, group{rows: l.rows})
		}
		groups[i].names = append(groups[i].names, l.name)
	}
	s.columns.Rows = max(s.rows, 0)
	if len(groups) < 2 {
		return
	}
	parts := make([]string, 0, len(groups))
	for _, g := range groups[:min(len(groups), maxExamples)] {
		parts = append(parts, count(g.rows, "value", "values")+" in "+list(g.names))
	}
	if more := len(groups) - maxExamples; more > 0 {
		parts = append(parts, "others of "+count(more, "further length", "further lengths"))
	}
	s.add(api.UnequalColumns, s.place, "The columns are of different length: %s. Send one value per row in each, with null where a reading was lost.", join(parts))
}
