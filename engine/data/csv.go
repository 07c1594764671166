package data

import (
	"bytes"
	"fmt"
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
	room    int // rows to make room for
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

// separatorHint returns a sentence if the header looks as if it were separated by something else than commas.
func (s *csvScan) separatorHint() string {
	if len(s.columns) != 1 {
		return ""
	}
	switch {
	case strings.Contains(s.columns[0].name, ";"):
		return " The header seems to be separated by semicolons: separate cells by commas, and write decimals with a point."
	case strings.Contains(s.columns[0].name, "\t"):
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
