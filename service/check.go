package service

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"unicode/utf8"

	"guardrow/api"

	"github.com/go-json-experiment/json/jsontext"
)

// maxErrors is the largest number of errors that a problem lists.
const maxErrors = 100

// checker holds a request's envelope to the contract's shape in one pass over its text, without building a value. It needs
// memory for what is wrong only, and for no more than maxErrors of it, so that no body can make it dear.
type checker struct {
	decoder *jsontext.Decoder
	text    []byte
	path    []step

	faults []api.ProblemError // what is not of the contract's shape
	count  int                // how many there are, listed or not
	limits []api.ProblemError // values outside the contract's bounds; the engine may have better words for them
	beyond []api.ProblemError // numbers that no double holds
	spans  []span             // where those numbers are
	id     span               // the member "id", with its name; the zero span where there is none
	value  span               // the value of that member
}

// step is a part of a place: a field's name, or a position in a list.
type step struct {
	name  string
	index int // -1 for a field
}

// span is a stretch of the text.
type span struct{ start, end int }

// checked is an envelope that is of the contract's shape.
type checked struct {
	text   []byte             // what is to be decoded: the envelope, with no number that a double cannot hold
	limits []api.ProblemError // 422, unless the engine reports a fault at the same place
	beyond []api.ProblemError // 422
	id     []byte             // the value of "id", nil where there is none
	bare   []byte             // the envelope without "id"
}

// check holds an envelope, an object, to the shape s of the contract. elsewhere are fields that count as given though they
// are not in the envelope. The problem, if any, is that of all faults together; faults found elsewhere in the request join them.
func check(envelope []byte, s *shape, elsewhere []string, others []api.ProblemError) (*checked, error) {
	c := &checker{
		decoder: jsontext.NewDecoder(bytes.NewBuffer(envelope), jsontext.AllowDuplicateNames(true)),
		text:    envelope,
		path:    make([]step, 0, 8),
		faults:  others,
		count:   len(others),
	}
	if err := c.object(s[objectKind], elsewhere); err != nil {
		return nil, refuse(api.NotJSON, "The body is not JSON.")
	}
	if c.count > 0 {
		return nil, refuseAll(c.faults, c.count)
	}
	return &checked{text: c.patched(), limits: c.limits, beyond: c.beyond, id: cut(envelope, c.value), bare: without(envelope, c.id)}, nil
}

func cut(text []byte, s span) []byte {
	if s.end == 0 {
		return nil
	}
	return text[s.start:s.end]
}

// without returns the text of an object without one of its members.
func without(text []byte, s span) []byte {
	if s.end == 0 {
		return text
	}
	before, after := bytes.TrimRight(text[:s.start], " \t\r\n"), bytes.TrimLeft(text[s.end:], " \t\r\n")
	switch {
	case after[0] == ',':
		after = after[1:]
	case before[len(before)-1] == ',':
		before = before[:len(before)-1]
	}
	return slices.Concat(before, after)
}

// patched returns the text with numbers that no double holds replaced by ones of the same sign that it holds. The request is
// refused because of them; so the engine can still be asked what else is wrong.
func (c *checker) patched() []byte {
	if len(c.spans) == 0 {
		return c.text
	}
	var text []byte
	from := 0
	for _, s := range c.spans {
		text = append(text, c.text[from:s.start]...)
		if c.text[s.start] == '-' {
			text = append(text, '-')
		}
		text = append(text, "1e308"...)
		from = s.end
	}
	return append(text, c.text[from:]...)
}

// next checks the value that comes next against s.
func (c *checker) next(s *shape) error {
	kind := kindOf(c.decoder.PeekKind())
	r := s[kind]
	if r == nil {
		raw, err := c.decoder.ReadValue()
		if err != nil {
			return err
		}
		c.fault(api.WrongType, func() string { return wrongType(s, kind, raw) })
		return nil
	}
	switch kind {
	case objectKind:
		return c.object(r, nil)
	case listKind:
		return c.list(r)
	case textKind, numberKind, boolKind, nullKind, kinds:
	}
	raw, err := c.decoder.ReadValue()
	if err != nil {
		return err
	}
	switch kind {
	case textKind:
		c.textValue(r, raw)
	case numberKind:
		c.numberValue(s, r, raw)
	case boolKind, listKind, objectKind, nullKind, kinds:
	}
	return nil
}

func kindOf(k jsontext.Kind) jsonKind {
	switch k {
	case '"':
		return textKind
	case '0':
		return numberKind
	case 't', 'f':
		return boolKind
	case '[':
		return listKind
	case '{':
		return objectKind
	}
	return nullKind
}

func (c *checker) object(r *rule, elsewhere []string) error {
	if _, err := c.decoder.ReadToken(); err != nil {
		return err
	}
	top := len(c.path) == 0
	var seen uint64
	for _, name := range elsewhere {
		if i := r.find(name); i >= 0 {
			seen |= 1 << uint(i)
		}
	}
	for c.decoder.PeekKind() == '"' {
		before := int(c.decoder.InputOffset())
		raw, err := c.decoder.ReadValue()
		if err != nil {
			return err
		}
		i := r.known(raw)
		if i < 0 {
			if err := c.unknown(r, unquote(raw)); err != nil {
				return err
			}
			continue
		}
		f := &r.fields[i]
		c.path = append(c.path, step{f.name, -1})
		if seen&(1<<uint(i)) != 0 {
			c.fault(api.DuplicateKey, func() string {
				return fmt.Sprintf("The field %s stands here twice. Keep one of the two.", f.name)
			})
		}
		seen |= 1 << uint(i)
		if err := c.next(f.shape); err != nil {
			return err
		}
		c.path = c.path[:len(c.path)-1]
		if top && f.name == "id" {
			c.spanID(before)
		}
	}
	if _, err := c.decoder.ReadToken(); err != nil {
		return err
	}
	c.missing(r, seen)
	return nil
}

// known returns the position of the field with the name that raw, a JSON string, says; -1 if there is none.
func (r *rule) known(raw []byte) int {
	if bytes.IndexByte(raw, '\\') >= 0 {
		return r.find(unquote(raw))
	}
	name := raw[1 : len(raw)-1]
	for i := range r.fields {
		if string(name) == r.fields[i].name {
			return i
		}
	}
	return -1
}

// spanID notes where the member "id" stands, whose name comes after before and whose value was just read.
func (c *checker) spanID(before int) {
	end := int(c.decoder.InputOffset())
	start := before + bytes.IndexByte(c.text[before:], '"')
	value := start + 1 + bytes.IndexByte(c.text[start+1:], '"') + 1 // past the name, which has no quote within
	value += bytes.IndexByte(c.text[value:], ':') + 1
	for c.text[value] == ' ' || c.text[value] == '\t' || c.text[value] == '\n' || c.text[value] == '\r' {
		value++
	}
	c.id, c.value = span{start, end}, span{value, end}
}

func (c *checker) unknown(r *rule, name string) error {
	if err := c.decoder.SkipValue(); err != nil {
		return err
	}
	if r.open {
		return nil
	}
	// A name of any length is not repeated: then the place is that of the object.
	if utf8.RuneCountInString(name) <= maxNameInPlace {
		c.path = append(c.path, step{name, -1})
		defer func() { c.path = c.path[:len(c.path)-1] }()
	}
	c.fault(api.UnknownField, func() string { return unknownField(name, r.names) })
	return nil
}

func (c *checker) missing(r *rule, seen uint64) {
	for i := range r.fields {
		f := &r.fields[i]
		if f.required && seen&(1<<uint(i)) == 0 {
			c.path = append(c.path, step{f.name, -1})
			c.fault(api.MissingField, func() string { return fmt.Sprintf("The field %s is missing. Give it, as %s.", f.name, wanted(f.shape)) })
			c.path = c.path[:len(c.path)-1]
		}
	}
}

func (c *checker) list(r *rule) error {
	if _, err := c.decoder.ReadToken(); err != nil {
		return err
	}
	n := 0
	for ; c.decoder.PeekKind() != ']'; n++ {
		c.path = append(c.path, step{index: n})
		if err := c.next(r.items); err != nil {
			return err
		}
		c.path = c.path[:len(c.path)-1]
	}
	c.size(r, n, "item")
	_, err := c.decoder.ReadToken()
	return err
}

func (c *checker) textValue(r *rule, raw []byte) {
	if r.words != nil {
		if text := unquote(raw); !slices.Contains(r.words, text) {
			c.fault(api.NotInEnumeration, func() string { return notInEnumeration(text, r.words) })
		}
		return
	}
	if r.least == 0 && (r.most < 0 || len(raw)-2 <= r.most) {
		return // there are no more characters than bytes
	}
	n := utf8.RuneCount(raw) - 2
	if bytes.IndexByte(raw, '\\') >= 0 {
		n = utf8.RuneCountInString(unquote(raw))
	}
	c.size(r, n, "character")
}

func (c *checker) numberValue(s *shape, r *rule, raw []byte) {
	x, err := strconv.ParseFloat(string(raw), 64)
	if err != nil && errors.Is(err, strconv.ErrRange) {
		end := int(c.decoder.InputOffset())
		c.spans = append(c.spans, span{end - len(raw), end})
		if len(c.beyond) < maxErrors {
			c.beyond = append(c.beyond, api.ProblemError{Pointer: c.pointer(), Code: api.NumberOutOfRange, Detail: "The number is larger in size than a double can hold, which is 1.8e308. Give it in a larger unit."})
		}
		return
	}
	if r.whole && x != math.Trunc(x) {
		c.fault(api.WrongType, func() string { return fractional(s) })
		return
	}
	if r.min != nil && (x < *r.min || r.above && x == *r.min) || r.max != nil && (x > *r.max || r.below && x == *r.max) {
		c.limit(func() string { return outOfRange(r) })
	}
}

// size holds the length of a text or list to its bounds.
func (c *checker) size(r *rule, n int, unit string) {
	if n < r.least || r.most >= 0 && n > r.most {
		c.limit(func() string { return wrongSize(r, n, unit) })
	}
}

// fault notes what is not of the shape at the present place. The sentence is made only if it will be listed.
func (c *checker) fault(code api.Code, detail func() string) {
	if c.count++; len(c.faults) < maxErrors {
		c.faults = append(c.faults, api.ProblemError{Pointer: c.pointer(), Code: code, Detail: detail()})
	}
}

// limit notes a value outside its bounds.
func (c *checker) limit(detail func() string) {
	if len(c.limits) < maxErrors {
		c.limits = append(c.limits, api.ProblemError{Pointer: c.pointer(), Code: api.OutOfBounds, Detail: detail()})
	}
}

// pointer returns the present place as a JSON pointer (RFC 6901).
func (c *checker) pointer() string {
	var text []byte
	for _, s := range c.path {
		text = append(text, '/')
		if s.index >= 0 {
			text = strconv.AppendInt(text, int64(s.index), 10)
		} else {
			text = append(text, escapePointer(s.name)...)
		}
	}
	return string(text)
}

func unquote(raw []byte) string {
	if bytes.IndexByte(raw, '\\') < 0 {
		return string(raw[1 : len(raw)-1])
	}
	text, err := jsontext.AppendUnquote(nil, raw)
	if err != nil {
		return string(raw[1 : len(raw)-1])
	}
	return string(text)
}
