package api

// Code is the stable name of a rule that a request can break. Codes are never renamed.
type Code string

// Entry is one rule of the catalogue: its code, the status it is answered with, the rule in a sentence, and a request that
// breaks it. A test posts every example and demands that very code.
type Entry struct {
	Code    Code
	Status  int
	Rule    string
	Example Example
}

// Example is a request: a path, and a body or, for what is not JSON, its media type and text.
type Example struct {
	Method    string // empty for POST
	Path      string
	MediaType string // empty for application/json
	Accept    string // the header of that name; empty for none
	Encoding  string // the header Content-Encoding; empty for none
	Body      string
	Setting   Setting
}

// Setting is what the service must be like, or the way the request must be sent, for an example to break its rule; empty
// where any service will do.
type Setting string

// Settings of examples.
const (
	CutShort      Setting = "the connection ends before the body does"
	StalledBody   Setting = "the body stops coming"
	BodyLimit     Setting = "bodies of at most BodyLimitOfExample bytes"
	EnvelopeLimit Setting = "envelopes of at most EnvelopeLimitOfExample bytes"
	RateLimit     Setting = "the caller has used up its requests"
	Defect        Setting = "the service has a defect"
	Busy          Setting = "the service has no room for another request"
	Draining      Setting = "the service is shutting down"
	NoTime        Setting = "the time limit is over"
)

// Limits of the service to which the examples with those settings are posted.
const (
	BodyLimitOfExample     = 500
	EnvelopeLimitOfExample = 400
)

// Catalogue returns every rule: those on the request's form first, then those on designs, terms and data.
func Catalogue() []Entry {
	var all []Entry
	all = append(all, requestRules()...)
	all = append(all, designRules()...)
	all = append(all, dataRules()...)
	return all
}
