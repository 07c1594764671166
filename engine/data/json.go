package data

import (
	"bytes"
	"fmt"

	"guardrow/api"
	"guardrow/engine"
)

// ScanJSON reads an object with one array per column. The columns of factors hold labels: a text, or a number that stands
// for its shortest decimal text (api.NumberLabel); those of responses hold numbers. All other columns are checked to be JSON
// and named in Ignored.
//
// It returns the columns; or what is wrong with them, all of it; or, where text is not one strict JSON object (see Valid), a
// *SyntaxError, at which it stops. Where only readings are wrong it returns the columns too, so that Lay can say what is
// wrong with the labels; the grid is then of no use.
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
			s.tell(api.NotAColumn, s.column(name), "The column %s is not an array. Send one value per row, in square brackets.", engine.Quote(name))
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
