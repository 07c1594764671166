package service

import (
	"context"
	"errors"
	"fmt"
	"net/http"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/answer"
	"guardrow/engine/data"

	"github.com/go-json-experiment/json"
	"github.com/go-json-experiment/json/jsontext"
)

// operation is an endpoint that computes.
type operation struct {
	path   string
	schema string // of its request, in the contract
	forms  string // of its request as a form; empty where it takes none
	run    runner

	shape *shape
	form  *shape
}

// runner decodes a request and computes its answer.
type runner func(ctx context.Context, r *request, head api.Envelope) (reply any, stats answer.Stats, faults []engine.Fault, err error)

// operations is the table of the endpoints that compute.
func operations() []*operation {
	return []*operation{
		{path: "/v1/terms", schema: "TermsRequest", run: terms},
		{path: "/v1/expected-mean-squares", schema: "ExpectedMeanSquaresRequest", run: expectedMeanSquares},
		{path: "/v1/tests", schema: "TestsRequest", run: tests},
		{path: "/v1/anova", schema: "AnovaRequest", forms: "AnovaForm", run: anova},
	}
}

// newOperations returns the operations with their shapes, compiled from the contract.
func newOperations(c *compiler) ([]*operation, error) {
	list := operations()
	for _, o := range list {
		var err error
		if o.shape, err = c.named(o.schema); err != nil {
			return nil, err
		}
		if o.forms != "" {
			if o.form, err = c.named(o.forms); err != nil {
				return nil, err
			}
		}
	}
	return list, nil
}

func terms(_ context.Context, r *request, head api.Envelope) (any, answer.Stats, []engine.Fault, error) {
	var q api.TermsRequest
	if err := decode(r, &q); err != nil {
		return nil, answer.Stats{}, nil, err
	}
	a, faults := answer.Terms(&q)
	if faults != nil {
		return nil, answer.Stats{}, faults, nil
	}
	a.Envelope = head
	return a, answer.Stats{Terms: len(a.Terms), Observations: a.Observations}, nil, nil
}

func expectedMeanSquares(_ context.Context, r *request, head api.Envelope) (any, answer.Stats, []engine.Fault, error) {
	var q api.ExpectedMeanSquaresRequest
	if err := decode(r, &q); err != nil {
		return nil, answer.Stats{}, nil, err
	}
	a, faults := answer.ExpectedMeanSquares(&q)
	if faults != nil {
		return nil, answer.Stats{}, faults, nil
	}
	a.Envelope = head
	return a, answer.Stats{Terms: len(a.ExpectedMeanSquares), Observations: observations(q.Design)}, nil, nil
}

func tests(ctx context.Context, r *request, head api.Envelope) (any, answer.Stats, []engine.Fault, error) {
	var q api.TestsRequest
	if err := decode(r, &q); err != nil {
		return nil, answer.Stats{}, nil, err
	}
	a, faults, err := answer.Tests(ctx, &q)
	if faults != nil || err != nil {
		return nil, answer.Stats{}, faults, err
	}
	a.Envelope = head
	return a, answer.Stats{Terms: len(a.Tests), Observations: observations(q.Design)}, nil, nil
}

func anova(ctx context.Context, r *request, head api.Envelope) (any, answer.Stats, []engine.Fault, error) {
	var q api.AnovaRequest
	if err := decode(r, &q); err != nil {
		return nil, answer.Stats{}, nil, err
	}
	a, stats, faults, err := answer.Anova(ctx, &q, r.readings)
	if faults != nil || err != nil {
		return nil, stats, faults, err
	}
	a.Envelope = head
	return a, stats, nil, nil
}

// observations returns how many observations a design without faults has.
func observations(d *api.Design) int64 {
	n := int64(1)
	if d.Replicates != nil {
		n = int64(*d.Replicates)
	}
	for i := range d.Factors {
		n *= d.Factors[i].Levels.Count
	}
	return n
}

// decode decodes an envelope that is of the contract's shape. That it does not fit the Go type is a defect. The check has
// refused duplicate names already.
func decode(r *request, into any) error {
	if err := json.Unmarshal(r.text, into, jsontext.AllowDuplicateNames(true)); err != nil {
		return fmt.Errorf("a request of the contract's shape does not fit %T", into)
	}
	return nil
}

// post answers a request to an operation.
func (s *Service) post(x *exchange, o *operation) error {
	x.Response().Header()["Cache-Control"] = noStore
	if s.stopped() {
		return shuttingDown()
	}
	if !acceptsJSON(x.Request().Header) {
		return refuse(api.NotAcceptable, "The header Accept admits no media type of this operation's answers. Send application/json in it, or leave it out.")
	}
	in := s.intake(x)
	defer in.close()
	r, err := s.read(x, in, o)
	if err != nil {
		return err
	}
	ctx, done := s.untilStop(x.Request().Context())
	defer done()
	if err := s.workers.enter(ctx); err != nil {
		return ended(ctx, err)
	}
	defer s.workers.leave()
	ctx, limit := context.WithTimeoutCause(ctx, s.options.WorkTime, errTimeLimit)
	defer limit()
	return s.work(ctx, x, o, r)
}

// read reads a request and holds it to the operation's shape.
func (s *Service) read(x *exchange, in *intake, o *operation) (*request, error) {
	media, boundary, err := mediaType(x.Request().Header, o.form != nil)
	if err != nil {
		return nil, err
	}
	if err := in.open(); err != nil {
		return nil, err
	}
	if media == formType {
		return o.splitForm(in, boundary, s.options.MaxEnvelope)
	}
	body, err := in.whole()
	if err != nil {
		return nil, err
	}
	return o.split(body, s.options.MaxEnvelope)
}

// work computes and sends the answer.
func (s *Service) work(ctx context.Context, x *exchange, o *operation, r *request) error {
	head, err := s.head(r)
	if err != nil {
		return err
	}
	r.readings.MaxRows = s.options.MaxRows
	reply, stats, faults, err := o.run(ctx, r, head)
	if ctx.Err() != nil {
		return ended(ctx, ctx.Err())
	}
	var broken *data.SyntaxError
	switch {
	case errors.As(err, &broken):
		return refuseAll([]api.ProblemError{r.bulkFault(broken)}, 1)
	case err != nil:
		return err
	}
	if refused := refuseFaults(faults, &r.checked); refused != nil {
		return refused
	}
	x.Terms, x.Observations = stats.Terms, stats.Observations
	return sendJSON(x, http.StatusOK, jsonType, reply)
}

// head returns what stands at the head of the answer.
func (s *Service) head(r *request) (api.Envelope, error) {
	digest, err := fingerprint(r.bare)
	return api.Envelope{ID: r.id, Fingerprint: digest, Engine: s.options.Version}, err
}
