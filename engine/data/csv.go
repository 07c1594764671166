package data

import (
	"bytes"
	"fmt"
	"math/bits"
	"strings"
	"unicode/utf8"

	"guardrow/api"
	"guardrow/engine"
)

// ScanCSV reads a table in CSV (RFC 4180): a header with the columns' names, then a row a line; cells separated by commas,
// in quotation marks where they hold commas, quotes (doubled) or line breaks. Lines end in LF or CRLF; a byte order mark
// is skipped, and so are empty lines. A label is the text of its cell, exactly. A reading may stand between blanks and have a
// leading +, needless zeros, or a point at either end; an empty cell is a lost reading.
//
// It returns the same columns as ScanJSON for the same content, or what is wrong with them, all of it.
func ScanCSV(text []byte, plan Plan) (*Columns, []engine.Fault) {
	text = bytes.TrimPrefix(text, []byte("\uFEFF"))
	s := csvScan{scan: newScan(&plan, "csv", false), text: text}
	body := s.header()
	if body < 0 {
		return s.result()
	}
	s.prepare(body)
	rows := s.rows(body)
	if rows < 0 {
		return s.result()
	}
	s.absent(s.separatorHint())
	s.size(rows)
	if !s.any() && s.plainAgain() {
		s.rows(body)
	}
	s.finishAll(rows)
	return s.result()
}

// ScanCSVString reads a table in CSV that stands in a JSON string, given with its quotation marks. The string is unescaped
// in place: text is overwritten. The error is a *SyntaxError.
func ScanCSVString(text []byte, plan Plan) (*Columns, []engine.Fault, error) {
	r := reader{text: text}
	if r.at(0) != '"' {
		r.fail(0, "A table in CSV is a JSON string.")
	} else if end := r.str(0); end >= 0 {
		r.end(end)
		text = text[1 : end-1]
	}
	if r.err != nil {
		return nil, nil, r.err
	}
	columns, faults := ScanCSV(unescape(text[:0], text), plan)
	return columns, faults, nil
}

// csvScan reads a table.
type csvScan struct {
	*scan
	text    []byte
	columns []csvColumn
	header1 string // the header's first cell
	second  bool   // the table is read again, for columns to be read plain
	room    int    // rows to make room for
}

// csvColumn is a column of the table and what it is read into.
type csvColumn struct {
	role
	name  string
	dict  *dictionary
	codes Codes
	*readings
	skip bool // in a second reading: it was read
}

// header reads the names of the columns, and returns where the rows begin.
func (s *csvScan) header() int {
	pos := s.blankLines(0)
	if pos >= len(s.text) {
		s.add(api.InvalidCSV, s.place, "The table is empty. Send a header with the names of the columns, then one line for each reading.")
		return -1
	}
	for {
		raw, end, what := csvCell(s.text, pos)
		if what != "" || !utf8.Valid(raw) {
			s.malformed("The header", what)
			return -1
		}
		name := string(raw)
		if len(s.columns) == 0 {
			s.header1 = name
		}
		if len(s.columns) == MaxColumns {
			s.malformed("The header", fmt.Sprintf("has more than %d cells", MaxColumns))
			return -1
		}
		s.columns = append(s.columns, csvColumn{role: s.next(name), name: name})
		if end >= len(s.text) || s.text[end] != ',' {
			return lineEnd(s.text, end)
		}
		pos = end + 1
	}
}

// malformed reports a table that cannot be read on. No more is said than what is certain.
func (s *csvScan) malformed(where, what string) {
	if what == "" {
		what = "is not valid UTF-8. Save the table in UTF-8"
	}
	s.add(api.InvalidCSV, s.place, "%s of the table %s. Nothing after it was read.", where, what)
}

// prepare makes room for the rows: as many as there are lines, but not more than there are bytes for, since every row has
// a byte between cells and one at its end.
func (s *csvScan) prepare(body int) {
	rest := s.text[body:]
	s.room = min(bytes.Count(rest, []byte{'\n'})+1, (len(rest)+1)/len(s.columns), s.plan.rowLimit())
	for i := range s.columns {
		c := &s.columns[i]
		switch c.use {
		case asFactor:
			c.dict = newDictionary()
			c.codes.U8 = make([]uint8, s.room)
		case asResponse:
			c.readings = &readings{name: c.name, index: c.role.index, offsets: make([]float64, s.room)}
		case unused:
		}
	}
}

// rows reads all rows from pos, and returns how many there are; -1 where the table is malformed.
func (s *csvScan) rows(pos int) int {
	row := 0
	for {
		if pos < len(s.text) && s.text[pos] < ' ' {
			pos = s.blankLines(pos)
		}
		if pos >= len(s.text) {
			return row
		}
		if pos = s.row(pos, row); pos < 0 {
			return -1
		}
		row++
	}
}

// blankLines skips empty lines.
func (s *csvScan) blankLines(pos int) int {
	for pos < len(s.text) {
		next := lineEnd(s.text, pos)
		if next == pos {
			break
		}
		pos = next
	}
	return pos
}

// lineEnd returns where the next line begins if one ends at pos, otherwise pos.
func lineEnd(text []byte, pos int) int {
	switch {
	case pos < len(text) && text[pos] == '\n':
		return pos + 1
	case pos+1 < len(text) && text[pos] == '\r' && text[pos+1] == '\n':
		return pos + 2
	case pos+1 == len(text) && text[pos] == '\r':
		return pos + 1
	}
	return pos
}

// row reads the row at pos, and returns where the next one begins; -1 where the table is malformed.
func (s *csvScan) row(pos, row int) int {
	text := s.text
	cells := 0
	for {
		var end int
		if cells < len(s.columns) {
			end = s.cell(&s.columns[cells], pos, row)
		} else {
			_, end = s.anyCell(pos, row)
		}
		if end < 0 {
			return -1
		}
		cells++
		if end < len(text) && text[end] == ',' {
			pos = end + 1
			continue
		}
		if cells != len(s.columns) {
			s.ragged(row, cells)
		}
		return lineEnd(text, end)
	}
}

func (s *csvScan) ragged(row, cells int) {
	if !s.wants(api.RaggedRow, "") {
		return
	}
	hint := ""
	if cells > len(s.columns) {
		hint = " A cell that holds a comma, such as a decimal comma, has to stand in quotation marks; write decimals with a point."
	}
	s.tell(api.RaggedRow, s.place, "Row %d has %s, but the header has %d.%s", row+1, count(cells, "cell", "cells"), len(s.columns), hint)
}

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

// separatorHint returns a sentence if the header looks as if it were separated by something else than commas.
func (s *csvScan) separatorHint() string {
	if len(s.columns) != 1 {
		return ""
	}
	switch {
	case strings.Contains(s.header1, ";"):
		return " The header seems to be separated by semicolons: separate cells by commas, and write decimals with a point."
	case strings.Contains(s.header1, "\t"):
		return " The header seems to be separated by tabs: separate cells by commas."
	}
	return ""
}

// plainAgain prepares a second reading of those columns that need one, and says whether any does.
func (s *csvScan) plainAgain() bool {
	found := false
	for i := range s.columns {
		c := &s.columns[i]
		c.skip = c.readings == nil || !c.again
		if !c.skip {
			c.shift = shifter{plain: true}
			found = true
		}
	}
	s.second = found
	return found
}

// finishAll hands all columns over.
func (s *csvScan) finishAll(rows int) {
	kept := min(rows, s.room)
	s.scan.columns.Rows = kept
	for i := range s.columns {
		c := &s.columns[i]
		switch c.use {
		case asFactor:
			f := &s.scan.columns.Factors[c.role.index]
			f.Codes = c.codes.first(kept)
			f.Labels = c.dict.labels()
		case asResponse:
			c.offsets = c.offsets[:kept]
			s.finish(c.readings)
		case unused:
		}
	}
}
