package service

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"net/http"
	"runtime"
	"runtime/debug"
	"time"

	"guardrow/api"

	"github.com/labstack/echo/v4"
	"go.uber.org/zap"
)

// Observation is what is known of a request once it is answered. It holds nothing of what the caller sent but sizes and the
// request's name.
type Observation struct {
	RequestID    string
	Method       string
	Route        string // a path of the contract, such as /v1/problems/{kind}; empty where there is none
	Status       int    // 499 where the client went away before its answer
	Code         api.Code
	Duration     time.Duration
	BytesIn      int64 // of the body, as far as it was read
	BytesOut     int64
	Terms        int   // lines of the answer; of the model, for an analysis
	Observations int64 // of the study

	// Err is why the request failed, for the log; nil where it did not. Stack is where a defect is.
	Err   error
	Stack []byte

	started time.Time
}

// clientGone is the status under which requests are counted whose client did not wait for an answer.
const clientGone = 499

const requestIDHeader = "X-Request-Id"

// maxRequestID is the largest length of a request's name that is taken from a caller.
const maxRequestID = 128

// exchange is a request being answered, with what is observed of it.
type exchange struct {
	echo.Context
	*Observation
}

// observed is the outermost middleware, and the one exit for errors: every request passes here once, whatever becomes of it.
func (s *Service) observed(next echo.HandlerFunc) echo.HandlerFunc {
	return func(c echo.Context) error {
		r := c.Request()
		o := &Observation{Method: r.Method, Route: s.patterns[c.Path()], RequestID: requestID(r.Header.Get(requestIDHeader)), started: time.Now()}
		x := &exchange{c, o}
		header := c.Response().Header()
		header[requestIDHeader] = []string{o.RequestID}
		header["X-Content-Type-Options"] = noSniff
		header["Content-Security-Policy"] = nothingAllowed
		header["Referrer-Policy"] = noReferrer
		if err := s.recovered(next, x); err != nil {
			s.fail(x, err)
		}
		o.Duration = time.Since(o.started)
		o.BytesOut = c.Response().Size
		if o.Status == 0 {
			o.Status = c.Response().Status
		}
		s.log(o)
		if s.options.Observe != nil {
			s.options.Observe(o)
		}
		if o.Status == clientGone {
			panic(http.ErrAbortHandler) // nobody is there to read an answer, and an empty one would be a lie
		}
		return nil
	}
}

// Header values that never change, shared by all answers.
var (
	noSniff        = []string{"nosniff"}
	nothingAllowed = []string{"default-src 'none'; frame-ancestors 'none'"}
	noReferrer     = []string{"no-referrer"}
	noStore        = []string{"no-store"}
)

// recovered calls the handler and turns a panic into an error. Panics of this program carry constant texts, and the
// runtime's carry numbers, so both may be logged; other values may hold a caller's data and are named by their type only.
func (s *Service) recovered(next echo.HandlerFunc, x *exchange) (err error) {
	defer func() {
		switch cause := recover(); cause := cause.(type) {
		case nil:
		case runtime.Error:
			err, x.Stack = fmt.Errorf("panic: %w", cause), debug.Stack()
		case string:
			err, x.Stack = fmt.Errorf("panic: %s", cause), debug.Stack()
		default:
			err, x.Stack = fmt.Errorf("panic with a %T", cause), debug.Stack()
		}
	}()
	return next(x)
}

// fail answers a request that failed. A client that went away gets nothing.
func (s *Service) fail(x *exchange, err error) {
	if x.Response().Committed {
		// Half an answer must not pass for one: the connection ends. Mostly it has ended already, and that is the error.
		x.Status, x.Err = clientGone, err
		if x.Stack != nil {
			x.Code = api.InternalError
		}
		return
	}
	r := s.refusalOf(x, err)
	// A body that stops coming ends the request's context too; that caller may still be there to read why.
	if x.Request().Context().Err() != nil && !s.stopped() && !r.close {
		x.Status, x.Err = clientGone, context.Cause(x.Request().Context())
		return
	}
	x.Code = r.code()
	if r.status() >= http.StatusInternalServerError || r.cause != nil {
		x.Err = r
	}
	s.sendProblem(x, r)
}

// refusalOf finds out what kind of failure an error is.
func (s *Service) refusalOf(x *exchange, err error) *refusal {
	var r *refusal
	var h *echo.HTTPError
	switch {
	case errors.As(err, &r):
		return r
	case errors.As(err, &h) && h.Code == http.StatusNotFound:
		return refuse(api.NotFound, "There is nothing at this path. The contract at /v1/openapi.yaml lists every path.")
	case errors.As(err, &h) && h.Code == http.StatusMethodNotAllowed:
		return refuse(api.MethodNotAllowed, "This path is not there for the method "+shortMethod(x.Method)+"; it is there for "+x.Response().Header().Get(echo.HeaderAllow)+".")
	}
	return refuse(api.InternalError, "The service has a defect, which is now in its log. Report it with the request's name, which is in the header X-Request-Id.").because(err)
}

func shortMethod(method string) string {
	if len(method) > 20 {
		return method[:20] + "…"
	}
	return method
}

// requestID returns the caller's name for the request if it is a sane one, otherwise a new one.
func requestID(given string) string {
	if given != "" && len(given) <= maxRequestID {
		for i := 0; i < len(given); i++ {
			if !sane(given[i]) {
				return newRequestID()
			}
		}
		return given
	}
	return newRequestID()
}

func sane(c byte) bool {
	return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || c == '-' || c == '_' || c == '.' || c == ':'
}

const hexDigits = "0123456789abcdef"

// newRequestID returns 64 random bits in hexadecimal. They tell requests apart in a log and guard nothing.
func newRequestID() string {
	var id [16]byte
	bits := rand.Uint64() //nolint:gosec // it guards nothing
	for i := range id {
		id[i] = hexDigits[bits&15]
		bits >>= 4
	}
	return string(id[:])
}

// log writes one line for a request.
func (s *Service) log(o *Observation) {
	level := zap.InfoLevel
	if o.Status >= http.StatusInternalServerError && o.Code != api.ShuttingDown {
		level = zap.WarnLevel
	}
	if o.Code == api.InternalError {
		level = zap.ErrorLevel
	}
	line := s.options.Logger.Check(level, "request")
	if line == nil {
		return
	}
	fields := make([]zap.Field, 0, 12)
	fields = append(fields,
		zap.String("request_id", o.RequestID), zap.String("method", shortMethod(o.Method)), zap.String("route", o.Route), zap.Int("status", o.Status),
		zap.Duration("duration", o.Duration), zap.Int64("bytes_in", o.BytesIn), zap.Int64("bytes_out", o.BytesOut))
	if o.Terms > 0 {
		fields = append(fields, zap.Int("terms", o.Terms), zap.Int64("observations", o.Observations))
	}
	if o.Code != "" {
		fields = append(fields, zap.String("code", string(o.Code)))
	}
	if o.Err != nil {
		fields = append(fields, zap.String("error", o.Err.Error()))
	}
	if o.Stack != nil {
		fields = append(fields, zap.ByteString("stack", o.Stack))
	}
	line.Write(fields...)
}
