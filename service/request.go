package service

import (
	"bytes"
	"encoding/json"
	"errors"
	"fmt"
	"slices"
	"unicode/utf8"

	"guardrow/api"
	"guardrow/engine/answer"
	"guardrow/engine/data"
)

// bulkNames are the members that hold readings. They are cut out of a request before anything else reads it.
var bulkNames = []string{"data", "csv"}

// request is a request taken apart: what describes it, and the readings.
type request struct {
	checked
	readings answer.Readings
	offset   int    // where the readings' text begins in the body
	body     []byte // for the line and column of what is no JSON
	place    string // the readings' field
}

// split takes a body of JSON apart and holds it to the shape.
func (o *operation) split(body []byte, maxEnvelope int) (*request, error) {
	var names []string
	if o.form != nil {
		names = bulkNames
	}
	parts, err := data.Split(body, names...)
	if err != nil {
		return nil, syntax(body, err)
	}
	if len(parts.Envelope) > maxEnvelope {
		return nil, envelopeTooLarge(maxEnvelope)
	}
	r := &request{body: body}
	var faults []api.ProblemError
	var given []string
	for i, name := range names {
		bulk := parts.Bulk[i]
		if bulk.Text == nil {
			continue
		}
		given = append(given, name)
		r.offset, r.place = bulk.Offset, name
		if fault := r.take(name, bulk); fault != nil {
			faults = append(faults, *fault)
		}
	}
	for _, d := range parts.Duplicates {
		if slices.Contains(names, d.Name) {
			faults = append(faults, api.ProblemError{Pointer: "/" + d.Name, Code: api.DuplicateKey, Detail: fmt.Sprintf("The field %s stands here twice. Keep one of the two.", d.Name)})
		}
	}
	switch {
	case len(given) == 2:
		faults = append(faults, api.ProblemError{Pointer: "/csv", Code: api.ConflictingFields, Detail: "The readings are given twice, in data and in csv. Keep one of the two."})
	case len(given) == 0 && names != nil:
		faults = append(faults, api.ProblemError{Pointer: "/data", Code: api.MissingField, Detail: "The readings are missing. Give them in the field data, as an object with one list per column, or in the field csv, as a text."})
	}
	c, err := check(parts.Envelope, o.shape, given, faults)
	if err != nil {
		return nil, r.withBulk(err)
	}
	r.checked = *c
	return r, nil
}

// take notes the text of a bulk member, or says what is wrong with it as far as its first byte tells.
func (r *request) take(name string, bulk data.Bulk) *api.ProblemError {
	wanted := byte('{')
	if name == "csv" {
		wanted = '"'
	}
	if bulk.Text[0] == wanted {
		if name == "csv" {
			r.readings.CSVString = bulk.Text
		} else {
			r.readings.JSON = bulk.Text
		}
		return nil
	}
	if err := data.Valid(bulk.Text); err != nil {
		fault := r.bulkFault(err)
		return &fault
	}
	detail := "This is not an object; wanted is an object with one list per column, such as {\"box\": [1, 2], \"height\": [0.3, 0.4]}."
	if name == "csv" {
		detail = "This is not a text; wanted is CSV as one text. Readings as lists go into the field data."
	}
	return &api.ProblemError{Pointer: "/" + name, Code: api.WrongType, Detail: detail}
}

// withBulk adds to a refusal because of the envelope that the readings are not JSON either, if so.
func (r *request) withBulk(err error) error {
	var refused *refusal
	text := r.readings.JSON
	if text == nil {
		text = r.readings.CSVString
	}
	if text == nil || !errors.As(err, &refused) {
		return err
	}
	if broken := data.Valid(text); broken != nil {
		return refuseAll(append(refused.errors, r.bulkFault(broken)), refused.count+1)
	}
	return err
}

// bulkFault says where the readings stop being JSON.
func (r *request) bulkFault(err error) api.ProblemError {
	fault := syntaxFault(r.body, shifted(err, r.offset))
	fault.Pointer = "/" + r.place
	return fault
}

// shifted moves a syntax error from a part of the body to the body.
func shifted(err error, offset int) error {
	var s *data.SyntaxError
	if errors.As(err, &s) {
		return &data.SyntaxError{Offset: s.Offset + offset, Message: s.Message}
	}
	return err
}

func envelopeTooLarge(most int) *refusal {
	return refuse(api.EnvelopeTooLarge, fmt.Sprintf("What of the request is not readings is larger than %d bytes, which is the most that this service takes. Declare levels by their number instead of by labels.", most))
}

// syntax refuses a body that is not JSON.
func syntax(body []byte, err error) *refusal {
	fault := syntaxFault(body, err)
	return &refusal{errors: []api.ProblemError{fault}, count: 1}
}

// syntaxFault says which rule of JSON a text breaks, and where.
func syntaxFault(text []byte, err error) api.ProblemError {
	var s *data.SyntaxError
	if !errors.As(err, &s) {
		return api.ProblemError{Code: api.NotJSON, Detail: "The body is not JSON."}
	}
	code := syntaxCode(text, s)
	if code == api.EmptyBody {
		return api.ProblemError{Code: code, Detail: "The body is empty. Send a JSON object, such as {\"design\": …}."}
	}
	line, column := position(text, s.Offset)
	return api.ProblemError{Code: code, Detail: fmt.Sprintf("%s This is at line %d, column %d.", s.Message, line, column)}
}

func syntaxCode(text []byte, s *data.SyntaxError) api.Code {
	before := text[:min(s.Offset, len(text))]
	switch {
	case len(bytes.TrimSpace(text)) == 0:
		return api.EmptyBody
	case !utf8.Valid(text):
		return api.InvalidUTF8
	case depth(before) >= data.MaxDepth:
		return api.TooDeep
	case json.Valid(before):
		return api.TrailingText
	case len(bytes.TrimSpace(before)) == 0 && json.Valid(text):
		return api.NotAnObject
	}
	return api.NotJSON
}

// depth returns how many arrays and objects are open at the end of a text that is JSON so far.
func depth(text []byte) int {
	open := 0
	for i := 0; i < len(text); i++ {
		switch text[i] {
		case '[', '{':
			open++
		case ']', '}':
			open--
		case '"':
			for i++; i < len(text) && text[i] != '"'; i++ {
				if text[i] == '\\' {
					i++
				}
			}
		}
	}
	return open
}

// position returns the line and the column, in characters, of a byte; both count from 1.
func position(text []byte, offset int) (line, column int) {
	before := text[:min(offset, len(text))]
	start := bytes.LastIndexByte(before, '\n') + 1
	return bytes.Count(before, []byte{'\n'}) + 1, utf8.RuneCount(before[start:]) + 1
}
