package service

import (
	"errors"
	"fmt"
	"runtime"
	"time"

	"go.uber.org/zap"
)

// Options say how a service works. Logger and Version are mandatory; everything else may be zero, which means the default
// that stands beside it.
type Options struct {
	Logger  *zap.Logger // one line a request, and defects; zap.NewNop() for silence
	Version string      // what answers carry as "engine"

	// MaxBody is the largest body taken, in bytes. Default 64 MiB.
	MaxBody int64
	// MaxEnvelope is the largest part of a body that is not readings, in bytes. Default 1 MiB.
	MaxEnvelope int
	// MaxBuffered is how many bytes of bodies may be held at once, over all requests. Default 4 × MaxBody.
	MaxBuffered int64
	// MaxRows is the largest number of rows of readings. Default 2,000,000.
	MaxRows int

	// BodyTime is how long a body may take to arrive. Default one minute.
	BodyTime time.Duration
	// WorkTime is how long an answer may take once the body is here and there is room to work. Default 30 s.
	WorkTime time.Duration
	// MaxWorkers is how many answers are worked on at once. Default twice GOMAXPROCS.
	MaxWorkers int
	// QueueTime is how long a request waits for room to work. Default 10 s.
	QueueTime time.Duration

	// Rate is how many requests a second one client may send on average, /healthz and /readyz apart. A client is the peer's
	// address, the first 64 bits of it for IPv6; no header is believed. Default 0: no limit.
	Rate float64
	// Burst is how many requests a client may send at once. Default 2 × Rate, at least 1. It needs a Rate.
	Burst int

	// Observe, if set, is called once for each request after its answer, beside the log. It is called from many goroutines.
	Observe func(*Observation)
}

const mebibyte = 1 << 20

// Validate reports everything that is wrong with o, in one error.
func (o *Options) Validate() error {
	var faults []error
	wrong := func(bad bool, format string, args ...any) {
		if bad {
			faults = append(faults, fmt.Errorf(format, args...))
		}
	}
	wrong(o.Logger == nil, "a logger is missing")
	wrong(o.Version == "", "the version is missing")
	for _, n := range []struct {
		name  string
		value int64
	}{
		{"MaxBody", o.MaxBody},
		{"MaxEnvelope", int64(o.MaxEnvelope)},
		{"MaxBuffered", o.MaxBuffered},
		{"MaxRows", int64(o.MaxRows)},
		{"BodyTime", int64(o.BodyTime)},
		{"WorkTime", int64(o.WorkTime)},
		{"MaxWorkers", int64(o.MaxWorkers)},
		{"QueueTime", int64(o.QueueTime)},
		{"Burst", int64(o.Burst)},
	} {
		wrong(n.value < 0, "%s is %d; it must not be negative, and 0 stands for the default", n.name, n.value)
	}
	wrong(!(o.Rate >= 0 && o.Rate <= 1e6), "Rate is %v; it must be from 0, for no limit, to 1,000,000", o.Rate)
	wrong(o.Burst > 0 && o.Rate == 0, "Burst is %d without a Rate; give both, or neither", o.Burst)
	wrong(o.MaxBuffered > 0 && o.MaxBuffered < o.withDefaults().MaxBody, "MaxBuffered is %d, less than one body of MaxBody may take (%d)", o.MaxBuffered, o.withDefaults().MaxBody)
	return errors.Join(faults...)
}

func (o *Options) withDefaults() Options {
	d := *o
	orElse(&d.MaxBody, 64*mebibyte)
	orElse(&d.MaxEnvelope, mebibyte)
	orElse(&d.MaxBuffered, 4*d.MaxBody)
	orElse(&d.MaxRows, 2_000_000)
	orElse(&d.BodyTime, time.Minute)
	orElse(&d.WorkTime, 30*time.Second)
	orElse(&d.MaxWorkers, 2*runtime.GOMAXPROCS(0))
	orElse(&d.QueueTime, 10*time.Second)
	orElse(&d.Burst, max(1, int(2*d.Rate)))
	return d
}

func orElse[T comparable](value *T, standard T) {
	var zero T
	if *value == zero {
		*value = standard
	}
}
