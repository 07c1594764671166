package service

import (
	"errors"
	"io"
	"mime/multipart"
	"strings"

	"guardrow/api"
	"guardrow/engine/answer"
	"guardrow/engine/data"

	"github.com/go-json-experiment/json/jsontext"
)

// maxParts is the largest number of parts of a form: more than there are fields, so that all superfluous ones are named.
const maxParts = 64

// form is a form being read: its parts become the members of one JSON object, the CSV file apart.
type form struct {
	in       *intake
	envelope []byte
	csv      []byte
	given    []string // parts that are not in the envelope: the file, and those that are not JSON
	faults   []api.ProblemError
}

// splitForm reads a form and holds it to the shape. Each part is a field of the JSON request, except that "data" is a CSV file.
func (o *operation) splitForm(in *intake, boundary string, maxEnvelope int) (*request, error) {
	if boundary == "" {
		return nil, invalidForm("The header Content-Type states no boundary, so the parts cannot be told apart. Let your HTTP library set that header.")
	}
	f := &form{in: in, envelope: []byte{'{'}}
	reader := multipart.NewReader(in, boundary)
	for n := 0; ; n++ {
		part, err := reader.NextPart()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, brokenForm(err)
		}
		if n == maxParts {
			return nil, invalidForm("The form has more than 64 parts. Send one part for each field of the contract.")
		}
		if err := f.part(part, maxEnvelope); err != nil {
			return nil, err
		}
	}
	f.envelope = append(f.envelope, '}')
	c, err := check(f.envelope, o.form, f.given, f.faults)
	if err != nil {
		return nil, err
	}
	return &request{checked: *c, readings: answer.Readings{CSV: f.csv}, place: "data"}, nil
}

// part adds a part to the form.
func (f *form) part(part *multipart.Part, maxEnvelope int) error {
	name := part.FormName()
	if name == "" {
		return invalidForm("A part of the form has no name. Give each part the name of a field of the contract.")
	}
	text, err := f.in.read(part, -1)
	if err != nil {
		return brokenForm(err)
	}
	if name == "data" {
		if f.csv != nil {
			f.faults = append(f.faults, api.ProblemError{Pointer: "/data", Code: api.DuplicateKey, Detail: "The part data stands in the form twice. Keep one of the two."})
		}
		f.csv = text[:len(text):len(text)]
		f.given = append(f.given, name)
		return nil
	}
	if len(f.envelope)+len(name)+len(text) > maxEnvelope {
		return envelopeTooLarge(maxEnvelope)
	}
	if err := data.Valid(text); err != nil {
		fault := syntaxFault(text, err)
		if len(name) <= maxNameInPlace {
			fault.Pointer = "/" + escapePointer(strings.ToValidUTF8(name, "\uFFFD"))
		}
		fault.Detail = "This part of the form is not JSON. " + fault.Detail + " A text stands in quotation marks, such as \"sum\"."
		f.faults = append(f.faults, fault)
		f.given = append(f.given, name)
		return nil
	}
	return f.member(name, text)
}

// member adds a member to the envelope.
func (f *form) member(name string, text []byte) error {
	if len(f.envelope) > 1 {
		f.envelope = append(f.envelope, ',')
	}
	quoted, err := jsontext.AppendQuote(f.envelope, name)
	if err != nil {
		return invalidForm("The name of a part of the form is not UTF-8. Use the names of the contract's fields.")
	}
	f.envelope = append(append(quoted, ':'), text...)
	return nil
}

// brokenForm refuses a form that cannot be read; what stopped the body from arriving keeps its own reason.
func brokenForm(err error) error {
	var r *refusal
	if errors.As(err, &r) {
		return r
	}
	return invalidForm("The form is not multipart/form-data as RFC 7578 has it, or it is cut short. Let your HTTP library write it.")
}

func invalidForm(detail string) *refusal { return refuse(api.InvalidForm, detail) }
