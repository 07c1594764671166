package api

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"strconv"
	"strings"
)

// Words of the contract's enumerations.
const (
	Fixed  = "fixed"
	Random = "random"

	Unrestricted = "unrestricted"
	Restricted   = "restricted"

	Exact       = "exact"
	Approximate = "approximate"
	None        = "none"

	SumForm        = "sum"
	DifferenceForm = "difference"

	// Residual is the name of the last line, reserved for it.
	Residual = "residual"
)

// Design is a declared design: factors, how they are nested, and what is assumed.
type Design struct {
	Title      string    `json:"title,omitempty"`
	Factors    []Factor  `json:"factors"`
	Replicates *Integer  `json:"replicates,omitempty"`
	Constraint string    `json:"constraint,omitempty"`
	Negligible []TermRef `json:"negligible,omitempty"`
	MaxOrder   *Integer  `json:"max_order,omitempty"`
}

// Factor is one classification of the observations.
type Factor struct {
	Name       string   `json:"name"`
	Symbol     string   `json:"symbol,omitempty"`
	Levels     Levels   `json:"levels"`
	Effect     string   `json:"effect"`
	Population *Integer `json:"population,omitempty"`
	Within     []string `json:"within,omitempty"`
}

// Integer is a whole number of a request. 2, 2.0 and 2e0 are the same; one that does not fit an int64 is kept as the
// nearest end of the range, so that the rule on its size reports it.
type Integer int64

// UnmarshalJSON reads any JSON number without a fractional part.
func (i *Integer) UnmarshalJSON(text []byte) error {
	if whole, err := strconv.ParseInt(string(text), 10, 64); err == nil {
		*i = Integer(whole)
		return nil
	}
	x, err := strconv.ParseFloat(string(text), 64)
	switch {
	case err != nil && !math.IsInf(x, 0):
		return errors.New("not a whole number")
	case x >= 1<<63:
		*i = math.MaxInt64
	case x <= -1<<63:
		*i = math.MinInt64
	case x != math.Trunc(x):
		return errors.New("not a whole number")
	default:
		*i = Integer(x)
	}
	return nil
}

// Levels is a factor's levels: a count, or the labels.
type Levels struct {
	Count  int64
	Labels []string // nil where only a count was given
}

// Label is a level's name: a JSON string, or a number as its shortest decimal text.
type Label string

// UnmarshalJSON reads a string, or a number as its shortest decimal text (1, 1.0 and "1" are one label).
func (l *Label) UnmarshalJSON(text []byte) error {
	if len(text) > 0 && text[0] == '"' {
		return unquote(text, (*string)(l))
	}
	x, err := strconv.ParseFloat(string(text), 64)
	if err != nil {
		return errors.New("a label is a text or a number")
	}
	*l = Label(NumberLabel(x))
	return nil
}

// unquote reads a JSON string. Nearly all hold no escapes and are what stands between the quotation marks.
func unquote(text []byte, into *string) error {
	if n := len(text); n >= 2 && text[0] == '"' && bytes.IndexByte(text, '\\') < 0 {
		*into = string(text[1 : n-1])
		return nil
	}
	return json.Unmarshal(text, into)
}

// elements calls read with each element of a JSON array of texts and numbers, which is known to be valid JSON.
func elements(text []byte, read func(element []byte) error) error {
	text = bytes.TrimSpace(text[1 : len(text)-1])
	for len(text) > 0 {
		end, quoted := 0, false
		for ; end < len(text) && (quoted || text[end] != ','); end++ {
			switch text[end] {
			case '"':
				quoted = !quoted
			case '\\':
				end++
			}
		}
		if err := read(bytes.TrimSpace(text[:end])); err != nil {
			return err
		}
		text = bytes.TrimLeft(text[min(end+1, len(text)):], " \t\r\n")
	}
	return nil
}

// NumberLabel returns the label that the number x stands for: its shortest decimal text, so that 1, 1.0 and 1e0 are "1"
// and minus zero is "0".
func NumberLabel(x float64) string {
	if x == 0 {
		return "0"
	}
	return string(appendNumber(nil, x))
}

// UnmarshalJSON reads a count or a list of labels.
func (l *Levels) UnmarshalJSON(text []byte) error {
	if len(text) > 0 && text[0] == '[' {
		labels := []string{}
		err := elements(text, func(element []byte) error {
			var label Label
			err := label.UnmarshalJSON(element)
			labels = append(labels, string(label))
			return err
		})
		l.Labels, l.Count = labels, int64(len(labels))
		return err
	}
	var count Integer
	if err := count.UnmarshalJSON(text); err != nil {
		return err
	}
	*l = Levels{Count: int64(count)}
	return nil
}

// MarshalJSON writes the labels where there are any, otherwise the count.
func (l Levels) MarshalJSON() ([]byte, error) {
	if l.Labels != nil {
		return json.Marshal(l.Labels)
	}
	return strconv.AppendInt(nil, l.Count, 10), nil
}

// TermRef is a caller's way to name a term: the service's own string, a list of factor names, or the machine-readable
// form with crossed and within.
type TermRef struct {
	Text    string   // "box × tube(temperature, freezer)"; empty for the other two forms
	Factors []string // the list form
	Crossed []string // the machine-readable form
	Within  []string
	Parted  bool // the machine-readable form was used
}

// UnmarshalJSON reads any of the three forms.
func (t *TermRef) UnmarshalJSON(text []byte) error {
	switch {
	case len(text) == 0:
		return errors.New("a term is missing")
	case text[0] == '"':
		*t = TermRef{}
		return unquote(text, &t.Text)
	case text[0] == '[':
		*t = TermRef{Factors: []string{}}
		return elements(text, func(element []byte) error {
			var name string
			err := unquote(element, &name)
			t.Factors = append(t.Factors, name)
			return err
		})
	}
	var parts struct {
		Crossed []string `json:"crossed"`
		Within  []string `json:"within"`
	}
	if err := json.Unmarshal(text, &parts); err != nil {
		return err
	}
	*t = TermRef{Crossed: parts.Crossed, Within: parts.Within, Parted: true}
	return nil
}

// MarshalJSON writes the form that was read.
func (t TermRef) MarshalJSON() ([]byte, error) {
	switch {
	case t.Parted:
		return json.Marshal(map[string][]string{"crossed": t.Crossed, "within": t.Within})
	case t.Text != "":
		return json.Marshal(t.Text)
	}
	return json.Marshal(t.Factors)
}

// String returns the reference as a person would read it back, for messages.
func (t TermRef) String() string {
	switch {
	case t.Text != "":
		return t.Text
	case t.Parted:
		return TermName(t.Crossed, t.Within)
	}
	return strings.Join(t.Factors, " × ")
}

// TermName is the one function that makes a term's name: crossed factors joined by " × ", then, if any, the factors they
// are nested in, in brackets.
func TermName(crossed, within []string) string {
	if len(crossed) == 0 {
		return Residual
	}
	name := strings.Join(crossed, " × ")
	if len(within) == 0 {
		return name
	}
	return name + "(" + strings.Join(within, ", ") + ")"
}
