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
	Path      string
	MediaType string // empty for application/json
	Body      string
}

// Catalogue returns every rule: those on the request's form first, then those on designs, terms and data.
func Catalogue() []Entry {
	var all []Entry
	all = append(all, requestRules()...)
	all = append(all, designRules()...)
	all = append(all, dataRules()...)
	return all
}
