package engine

import "guardrow/api"

// Fault is one thing that is wrong with what was declared or sent: which rule it breaks, where, and a sentence that
// says how to mend it.
//
// Place is a JSON pointer without its leading slash, relative to the value that was checked, such as
// "factors/2/within/0" for a design; empty for the value as a whole. The caller that knows where the value stood in the
// request completes it.
type Fault struct {
	Code   api.Code
	Place  string
	Detail string
}
