package service

import (
	"cmp"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"time"

	"guardrow/api"
	"guardrow/engine"
)

// refusal is a request that gets a problem. As an error it has two texts: its errors are sent, its cause is logged.
type refusal struct {
	errors []api.ProblemError
	count  int // how many errors there are, listed or not
	cause  error
	after  time.Duration // when it is worth trying again; 0 for no statement
	close  bool          // whether the connection cannot be used again
}

// Error returns the text for the log. It holds nothing of the caller's.
func (r *refusal) Error() string {
	if r.cause != nil {
		return fmt.Sprintf("%s: %v", r.code(), r.cause)
	}
	return string(r.code())
}

func (r *refusal) Unwrap() error { return r.cause }

// code returns the first error's code, which tells the kind of problem.
func (r *refusal) code() api.Code { return r.errors[0].Code }

// refuse returns a refusal with one error, which is of the request as a whole.
func refuse(code api.Code, detail string) *refusal {
	return &refusal{errors: []api.ProblemError{{Code: code, Detail: detail}}, count: 1}
}

// because adds what is to be logged.
func (r *refusal) because(cause error) *refusal {
	r.cause = cause
	return r
}

// refuseAll returns a refusal with all errors, by their places. count is how many there are, listed or not.
func refuseAll(list []api.ProblemError, count int) *refusal {
	slices.SortStableFunc(list, func(a, b api.ProblemError) int {
		return cmp.Or(comparePointers(a.Pointer, b.Pointer), cmp.Compare(a.Code, b.Code))
	})
	distinct := slices.Compact(list)
	count -= len(list) - len(distinct)
	return &refusal{errors: distinct[:min(len(distinct), maxErrors)], count: count}
}

// refuseFaults returns a refusal with the engine's faults, and with those of the contract's bounds that the engine does not
// report.
func refuseFaults(faults []engine.Fault, c *checked) *refusal {
	reported := make(map[string]bool, len(faults))
	list := make([]api.ProblemError, 0, len(faults)+len(c.limits)+len(c.beyond))
	for _, f := range faults {
		pointer := f.Place
		if pointer != "" {
			pointer = "/" + pointer
		}
		reported[pointer] = true
		list = append(list, api.ProblemError{Pointer: pointer, Code: f.Code, Detail: f.Detail})
	}
	for _, e := range c.limits {
		if !reported[e.Pointer] {
			list = append(list, e)
		}
	}
	list = append(list, c.beyond...)
	if len(list) == 0 {
		return nil
	}
	return refuseAll(list, len(list))
}

// comparePointers orders JSON pointers part by part, positions in lists as numbers.
func comparePointers(a, b string) int {
	for a != "" && b != "" {
		var x, y string
		x, a = firstPart(a)
		y, b = firstPart(b)
		if x == y {
			continue
		}
		i, errX := strconv.Atoi(x)
		j, errY := strconv.Atoi(y)
		if errX == nil && errY == nil && i != j {
			return cmp.Compare(i, j)
		}
		return cmp.Compare(x, y)
	}
	return cmp.Compare(len(a), len(b))
}

func firstPart(pointer string) (part, rest string) {
	part = pointer[1:]
	if i := strings.IndexByte(part, '/'); i >= 0 {
		return part[:i], part[i:]
	}
	return part, ""
}

// kindsOfProblem maps every code to its kind of problem, and so to its status.
var kindsOfProblem = func() map[api.Code]api.ProblemType {
	m := make(map[api.Code]api.ProblemType)
	for _, kind := range api.ProblemTypes() {
		for _, rule := range kind.Codes {
			m[rule.Code] = kind
		}
	}
	return m
}()

// problem returns what is sent.
func (r *refusal) problem(path string) *api.Problem {
	kind, known := kindsOfProblem[r.code()]
	if !known {
		kind = kindsOfProblem[api.InternalError]
	}
	p := &api.Problem{Type: kind.Type, Title: kind.Title, Status: kind.Status, Instance: path, Errors: r.errors}
	switch {
	case r.count == 1:
		p.Detail = r.errors[0].Detail
	case r.count > len(r.errors):
		p.Detail = fmt.Sprintf("%d things are wrong with the request; the first %d are listed in errors, each with its place.", r.count, len(r.errors))
	default:
		p.Detail = fmt.Sprintf("%d things are wrong with the request; all are listed in errors, each with its place.", r.count)
	}
	return p
}

// status returns the status that the refusal is answered with.
func (r *refusal) status() int {
	if kind, known := kindsOfProblem[r.code()]; known {
		return kind.Status
	}
	return kindsOfProblem[api.InternalError].Status
}
