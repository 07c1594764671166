package data

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"guardrow/api"
	"guardrow/engine"
)

// maxExamples is how many faults of one kind are told one by one, and how many things one sentence names.
const maxExamples = 5

// report collects faults: of each kind the first few one by one, and the count.
type report struct {
	place    string // where the data are
	pointers bool   // whether a column and a row of it have places of their own
	kinds    []*kind
}

// kind is what is reported under one code.
type kind struct {
	code    api.Code
	what    string // names several of them, such as "readings are lost"
	faults  []engine.Fault
	count   int
	columns []string // in order of first appearance
	counts  map[string]int
}

// whats names the faults that may come in any number, for a sentence that counts them.
var whats = map[api.Code]string{
	api.LostReading:       "readings are lost",
	api.NonNumericReading: "readings are not numbers",
	api.ReadingOutOfRange: "readings are beyond the range of a double",
	api.MissingLabel:      "labels are missing",
	api.UnusableLabel:     "labels are neither texts nor numbers",
	api.RaggedRow:         "rows have another number of cells than the header",
	api.DuplicateColumn:   "columns have a name that occurred before",
	api.NotAColumn:        "columns are not arrays",
	api.MissingColumn:     "columns are missing",
	api.RepeatedResponse:  "names of responses are repeated",
	api.ResponseIsFactor:  "responses are factors",
}

func (r *report) any() bool { return len(r.kinds) > 0 }

// only reports whether there are no faults of other kinds.
func (r *report) only(codes ...api.Code) bool {
	return !slices.ContainsFunc(r.kinds, func(k *kind) bool { return !slices.Contains(codes, k.code) })
}

func (r *report) kind(code api.Code) *kind {
	for _, k := range r.kinds {
		if k.code == code {
			return k
		}
	}
	k := &kind{code: code, what: whats[code], counts: make(map[string]int)}
	r.kinds = append(r.kinds, k)
	return k
}

// wants counts one more fault of a kind in a column, and says whether it is to be told.
func (r *report) wants(code api.Code, column string) bool {
	k := r.kind(code)
	k.count++
	if k.counts[column]++; k.counts[column] == 1 {
		k.columns = append(k.columns, column)
	}
	return k.count <= maxExamples
}

// tell adds a fault that was counted.
func (r *report) tell(code api.Code, place, format string, args ...any) {
	k := r.kind(code)
	k.faults = append(k.faults, engine.Fault{Code: code, Place: place, Detail: fmt.Sprintf(format, args...)})
}

// add counts and tells a fault that is not of any one column.
func (r *report) add(code api.Code, place, format string, args ...any) {
	r.kind(code).count++
	r.tell(code, place, format, args...)
}

// column returns the place of a column.
func (r *report) column(name string) string {
	if !r.pointers {
		return r.place
	}
	return r.place + "/" + escapePointer(name)
}

// row returns the place of a row, counted from 0, of a column.
func (r *report) row(name string, row int) string {
	if !r.pointers {
		return r.place
	}
	return r.column(name) + "/" + strconv.Itoa(row)
}

var pointerEscapes = strings.NewReplacer("~", "~0", "/", "~1")

// escapePointer returns name as a token of a JSON pointer (RFC 6901).
func escapePointer(name string) string { return pointerEscapes.Replace(name) }

// faults returns all that was told, kind by kind, each kind with a count where not all were told.
func (r *report) faults() []engine.Fault {
	var all []engine.Fault
	for _, k := range r.kinds {
		all = append(all, k.faults...)
		if k.count > len(k.faults) {
			all = append(all, engine.Fault{Code: k.code, Place: r.place, Detail: k.summary()})
		}
	}
	return all
}

func (k *kind) summary() string {
	where := make([]string, 0, maxExamples)
	for _, name := range k.columns[:min(len(k.columns), maxExamples)] {
		if k.counts[name] == k.count {
			where = append(where, "in "+engine.Quote(name))
		} else {
			where = append(where, fmt.Sprintf("%d in %s", k.counts[name], engine.Quote(name)))
		}
	}
	if more := len(k.columns) - maxExamples; more > 0 {
		where = append(where, fmt.Sprintf("the others in %d further columns", more))
	}
	if len(k.columns) == 1 && k.columns[0] == "" {
		return fmt.Sprintf("In all, %d %s; the first %d are listed.", k.count, k.what, len(k.faults))
	}
	return fmt.Sprintf("In all, %d %s: %s; the first %d are listed.", k.count, k.what, join(where), len(k.faults))
}

// join returns parts as a person would list them.
func join(parts []string) string {
	if len(parts) < 2 {
		return strings.Join(parts, "")
	}
	last := len(parts) - 1
	return strings.Join(parts[:last], ", ") + " and " + parts[last]
}

// list returns the first few texts in quotation marks, and how many more there are.
func list(texts []string) string {
	quoted := make([]string, 0, maxExamples+1)
	for _, text := range texts[:min(len(texts), maxExamples)] {
		quoted = append(quoted, engine.Quote(text))
	}
	if more := len(texts) - maxExamples; more > 0 {
		quoted = append(quoted, fmt.Sprintf("%d more", more))
	}
	return join(quoted)
}

// count returns n with a noun in the singular or plural.
func count(n int, one, many string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + many
}
