package service

import (
	"context"
	"fmt"
	"net/http"
	"strings"
	"sync"
	"sync/atomic"

	"guardrow/api"

	"github.com/labstack/echo/v4"
)

// Service answers requests over HTTP. It is an http.Handler, has no state but its limits, and is safe for concurrent use.
type Service struct {
	options    Options
	echo       *echo.Echo
	patterns   map[string]string // from echo's patterns to the contract's paths
	contract   *contract
	operations []*operation
	workers    *workers
	buffer     *buffer
	rates      *rates
	draining   atomic.Bool
	stopping   context.Context // ends when the service stops
	stop       context.CancelFunc
}

// New returns a service, or everything that is wrong with the options.
func New(options Options) (*Service, error) {
	if err := options.Validate(); err != nil {
		return nil, err
	}
	s := &Service{options: options.withDefaults(), patterns: make(map[string]string)}
	s.workers = newWorkers(s.options.MaxWorkers, s.options.QueueTime)
	s.buffer = &buffer{most: s.options.MaxBuffered}
	s.rates = newRates(s.options.Rate, s.options.Burst)
	s.stopping, s.stop = context.WithCancel(context.Background())
	parts, err := theParts()
	if err != nil {
		return nil, err
	}
	s.contract = &parts.contract
	if s.operations, err = newOperations(parts.compiler); err != nil {
		return nil, err
	}
	s.echo = echo.New()
	s.echo.IPExtractor = echo.ExtractIPDirect()
	s.echo.HTTPErrorHandler = func(error, echo.Context) {} // observed has answered
	s.echo.Use(s.observed)
	for _, r := range s.routes() {
		s.add(r)
	}
	return s, nil
}

// parts are what is made of the contract, which never changes.
type parts struct {
	contract contract
	compiler *compiler
}

// theParts makes them, once for all services of a process.
var theParts = sync.OnceValues(func() (*parts, error) {
	document, asJSON, err := loadDocument(api.OpenAPI)
	if err != nil {
		return nil, err
	}
	p := &parts{compiler: newCompiler(document)}
	if _, err := newOperations(p.compiler); err != nil { // so that the compiler only reads from here on
		return nil, err
	}
	p.contract, err = newContract(asJSON)
	return p, err
})

// ServeHTTP answers one request.
func (s *Service) ServeHTTP(w http.ResponseWriter, r *http.Request) { s.echo.ServeHTTP(w, r) }

// Drain makes /readyz say that no more requests should be sent here. All requests are still answered; the caller closes the
// listener once those who send them had time to notice.
func (s *Service) Drain() { s.draining.Store(true) }

// Stop ends the work on all requests that are still here; they and later ones are answered with a 503. It is for those that
// http.Server.Shutdown has waited for long enough.
func (s *Service) Stop() {
	s.Drain()
	s.stop()
}

func (s *Service) stopped() bool { return s.stopping.Err() != nil }

// route is a line of the table of routes.
type route struct {
	method string
	path   string // as in the contract
	free   bool   // of the limit on each client's requests
	handle func(*exchange) error
}

// routes is the table of everything that is served. A GET serves HEAD too.
func (s *Service) routes() []route {
	table := []route{
		{http.MethodGet, "/healthz", true, s.health},
		{http.MethodGet, "/readyz", true, s.readiness},
		{http.MethodGet, "/v1/openapi.yaml", false, s.contract.yaml},
		{http.MethodGet, "/v1/openapi.json", false, s.contract.json},
		{http.MethodGet, "/docs", false, s.contract.page},
		{http.MethodGet, "/docs/{asset}", false, s.contract.asset},
		{http.MethodGet, api.ProblemRoot, false, s.contract.problems},
		{http.MethodGet, api.ProblemRoot + "/{kind}", false, s.contract.problem},
	}
	for _, o := range s.operations {
		table = append(table, route{http.MethodPost, o.path, false, func(x *exchange) error { return s.post(x, o) }})
	}
	return table
}

// add registers a route.
func (s *Service) add(r route) {
	pattern := strings.NewReplacer("{", ":", "}", "").Replace(r.path)
	s.patterns[pattern] = r.path
	handle := func(c echo.Context) error {
		x, ok := c.(*exchange)
		if !ok {
			return fmt.Errorf("a request that nobody observes")
		}
		if !r.free {
			if err := s.rates.admit(x.RealIP()); err != nil {
				return err
			}
		}
		return r.handle(x)
	}
	s.echo.Add(r.method, pattern, handle)
	if r.method == http.MethodGet {
		s.echo.Add(http.MethodHead, pattern, handle)
	}
}
