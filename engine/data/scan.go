package data

import (
	"strconv"

	"guardrow/api"
	"guardrow/engine"
)

// scan is what the two readers have in common: what each column is for, what was read, and what is wrong.
type scan struct {
	report
	plan    *Plan
	columns *Columns
	roles   map[string]role // of the columns that are known to matter
	seen    map[string]bool
	names   []string // of the columns that were seen, in order
	lost    lostTexts
}

// role is what a column is for.
type role struct {
	use   use
	index int // among the factors, or among the responses
}

type use uint8

const (
	unused use = iota
	asFactor
	asResponse
)

// newScan checks what the plan asks for.
func newScan(plan *Plan, place string, pointers bool) *scan {
	if plan.Place != "" {
		place = plan.Place
	}
	s := &scan{
		report:  report{place: place, pointers: pointers},
		plan:    plan,
		columns: &Columns{place: place, pointers: pointers, Factors: make([]LabelColumn, len(plan.Factors)), Responses: make([]Response, len(plan.Responses))},
		roles:   make(map[string]role, len(plan.Factors)+len(plan.Responses)),
		seen:    make(map[string]bool),
		lost:    newLostTexts(plan.Missing),
	}
	for i, name := range plan.Factors {
		s.columns.Factors[i].Name = name
		s.roles[name] = role{asFactor, i}
	}
	for i, name := range plan.Responses {
		s.columns.Responses[i].Name = name
		s.response(i, name)
	}
	if plan.Responses != nil && len(plan.Responses) == 0 {
		s.add(api.NoResponse, "responses", "The list of responses is empty. Name at least one column to analyse, or leave the list out to analyse every column that is not a factor.")
	}
	return s
}

// response notes the role of a response that the plan names.
func (s *scan) response(i int, name string) {
	taken, known := s.roles[name]
	switch {
	case !known:
		s.roles[name] = role{asResponse, i}
	case taken.use == asFactor:
		if s.wants(api.ResponseIsFactor, name) {
			s.tell(api.ResponseIsFactor, s.responsePlace(i), "%s is a factor of the design, so it cannot be a response too. Remove it from the list of responses.", engine.Quote(name))
		}
	default:
		if s.wants(api.RepeatedResponse, name) {
			s.tell(api.RepeatedResponse, s.responsePlace(i), "The response %s is named twice. Name it once.", engine.Quote(name))
		}
	}
}

func (s *scan) responsePlace(i int) string { return "responses/" + strconv.Itoa(i) }

// next returns the role of the column that comes next in the data. The second column of a name is reported, and unused.
func (s *scan) next(name string) role {
	if s.seen[name] {
		if s.wants(api.DuplicateColumn, name) {
			s.tell(api.DuplicateColumn, s.column(name), "The data have more than one column named %s. Give each column a name of its own.", engine.Quote(name))
		}
		return role{}
	}
	s.seen[name] = true
	s.names = append(s.names, name)
	r := s.roles[name]
	switch {
	case r.use != unused:
	case s.plan.Responses == nil:
		r = role{asResponse, len(s.columns.Responses)}
		s.columns.Responses = append(s.columns.Responses, Response{Name: name})
	default:
		s.columns.Ignored = append(s.columns.Ignored, name)
	}
	return r
}

// absent reports the columns that were not there.
func (s *scan) absent(hint string) {
	missing := func(name, use string) {
		if !s.seen[name] && s.wants(api.MissingColumn, name) {
			s.tell(api.MissingColumn, s.place, "The data have no column for the %s %s.%s%s", use, engine.Quote(name), nearest(name, s.names), hint)
		}
	}
	for _, name := range s.plan.Factors {
		missing(name, "factor")
	}
	for _, name := range s.plan.Responses {
		if s.roles[name].use == asResponse {
			missing(name, "response")
		}
	}
	if s.plan.Responses == nil && len(s.columns.Responses) == 0 {
		s.add(api.NoResponse, s.place, "Every column of the data is a factor, so there is nothing to analyse. Add a column with the readings.")
	}
}

// size reports a number of rows that cannot be taken.
func (s *scan) size(rows int) {
	if rows == 0 {
		s.add(api.NoRows, s.place, "The data have no rows. Send one row for each reading.")
	}
	if limit := s.plan.rowLimit(); rows > limit {
		s.add(api.TooManyRows, s.place, "The data have %d rows; this service takes at most %d. Leave out rows that are not of this study, or ask its operator for a higher limit.", rows, limit)
	}
}

// result returns the columns, unless more than readings is wrong.
func (s *scan) result() (*Columns, []engine.Fault) {
	if !s.any() {
		return s.columns, nil
	}
	if s.only(api.LostReading, api.NonNumericReading, api.ReadingOutOfRange) {
		return s.columns, s.faults()
	}
	return nil, s.faults()
}

// readings reads one column of readings.
type readings struct {
	name    string
	index   int
	shift   shifter
	offsets []float64
	again   bool // the column has to be read again, plain
	told    int  // faults in rows before this one were told in an earlier reading
}

// take returns the offset of a reading, and reports it if it cannot be taken.
func (s *scan) take(c *readings, x decimal, row int, text []byte) float64 {
	if s.lost.number(&x) {
		s.isLost(c, row, text)
		return 0
	}
	offset, v := c.shift.offset(x)
	switch v {
	case outOfRange:
		if row >= c.told && s.wants(api.ReadingOutOfRange, c.name) {
			s.tell(api.ReadingOutOfRange, s.row(c.name, row), "The reading %s in row %d of %s is beyond the range of a double: above 1.797e308 in size, or nearer to 0 than 5e-324. Check it, or use another unit.", engine.Quote(readable(text)), row+1, engine.Quote(c.name))
		}
	case unshiftable:
		c.again = true
	case taken:
	}
	return offset
}

// isLost reports a reading that was lost, or nothing where text says that it is null or empty.
func (s *scan) isLost(c *readings, row int, text []byte) {
	if row < c.told || !s.wants(api.LostReading, c.name) {
		return
	}
	what := "is " + engine.Quote(readable(text)) + ", one of the texts in missing: it"
	if len(text) == 0 && s.pointers {
		what = "is null: it"
	} else if len(text) == 0 {
		what = "is empty: it"
	}
	s.tell(api.LostReading, s.row(c.name, row), "Row %d of %s %s was lost. A lost reading is never taken as a zero, and equal numbers of readings are needed: send the reading, or declare a design without it.", row+1, engine.Quote(c.name), what)
}

// notNumber reports what stands where a reading belongs.
func (s *scan) notNumber(c *readings, row int, what, hint string) {
	if row < c.told || !s.wants(api.NonNumericReading, c.name) {
		return
	}
	if hint == "" && s.plan.Responses == nil {
		hint = " If this column is not a response, name those that are in \"responses\"."
	}
	s.tell(api.NonNumericReading, s.row(c.name, row), "Row %d of %s holds %s where a reading is expected. Send a number, or null for a reading that was lost.%s", row+1, engine.Quote(c.name), what, hint)
}

// finish hands the column over.
func (s *scan) finish(c *readings) {
	response := &s.columns.Responses[c.index]
	response.Offsets = c.offsets
	response.Shift = c.shift.first.float() + 0
	response.exact = string(c.shift.first.text())
}

// noLabel reports a row without a label.
func (s *scan) noLabel(name string, row int, what string) {
	if s.wants(api.MissingLabel, name) {
		s.tell(api.MissingLabel, s.row(name, row), "Row %d of %s %s, so its level is not known. Send the label of the level that the reading belongs to.", row+1, engine.Quote(name), what)
	}
}

// lostTexts are the texts that stand for a lost reading, and the numbers among them.
type lostTexts struct {
	texts   map[string]bool
	numbers map[float64]bool
}

func newLostTexts(texts []string) lostTexts {
	l := lostTexts{texts: make(map[string]bool, len(texts)), numbers: make(map[float64]bool)}
	for _, text := range texts {
		l.texts[text] = true
		if x, ok := parseDecimal([]byte(text)); ok {
			l.numbers[x.float()+0] = true
		}
	}
	return l
}

// text reports whether a text stands for a lost reading.
func (l *lostTexts) text(text []byte) bool { return l.texts[string(text)] }

// number reports whether a number does.
func (l *lostTexts) number(x *decimal) bool { return len(l.numbers) > 0 && l.numbers[x.float()+0] }
