package main

import (
	"context"
	"errors"
	"io"
	"net"
	"net/http"
	"time"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"

	"guardrow/service"
)

// serve listens until the context ends, then finishes what is in flight.
func serve(ctx context.Context, args []string, getenv func(string) string, stdout, stderr io.Writer) int {
	var s settings
	if code, ok := configured(&s, "serve", args, getenv, stdout, stderr); !ok {
		return code
	}
	logger := newLogger(stderr, s.logLevel)
	handler, err := service.New(service.Options{
		Logger: logger, Version: version,
		MaxBody: s.maxBody, MaxRows: int(s.maxRows), MaxWorkers: int(s.maxWorkers),
		WorkTime: s.workTime, QueueTime: s.queueTime, BodyTime: s.bodyTime, Rate: s.rate, Burst: int(s.burst),
	})
	if err != nil {
		say(stderr, "The service cannot start: %v\n", err)
		return misuse
	}
	listener, err := (&net.ListenConfig{}).Listen(ctx, "tcp", s.listen)
	if err != nil {
		say(stderr, "The service cannot listen on %s: %v\n", s.listen, err)
		return failure
	}
	logger.Info("listening", zap.String("address", listener.Addr().String()), zap.String("version", version))
	if err := serveOn(ctx, listener, handler, logger, &s); err != nil {
		logger.Error("stopped", zap.Error(err))
		return failure
	}
	logger.Info("stopped")
	return success
}

// configured reads the settings; without them it says why, and returns the exit code.
func configured(s *settings, command string, args []string, getenv func(string) string, stdout, stderr io.Writer) (code int, ok bool) {
	switch err := s.read(command, args, getenv, stdout); {
	case errors.Is(err, errHelp):
		return success, false
	case err != nil:
		say(stderr, "%v\n", err)
		return misuse, false
	}
	return success, true
}

// newLogger writes JSON lines.
func newLogger(w io.Writer, level zapcore.Level) *zap.Logger {
	config := zap.NewProductionEncoderConfig()
	config.EncodeTime = zapcore.RFC3339NanoTimeEncoder
	return zap.New(zapcore.NewCore(zapcore.NewJSONEncoder(config), zapcore.Lock(zapcore.AddSync(w)), level))
}

// Times that are not settings.
const (
	headerTime = 10 * time.Second // for the header of a request to arrive; not longer than the body has
	answerTime = 5 * time.Second  // to send what is answered at the stop time
)

// serveOn serves until the context ends. Then /readyz says so; after the drain time no new connection is taken, and what is in
// flight is finished; work that is not done at the stop time is answered with a 503, and connections that are still open after
// that are cut off, which is an error.
func serveOn(ctx context.Context, listener net.Listener, handler *service.Service, logger *zap.Logger, s *settings) error {
	server := &http.Server{
		Handler:           handler,
		ReadHeaderTimeout: min(headerTime, s.bodyTime),
		// For bodies that nobody reads: without it a GET that announces a body and sends none would hold its connection for good.
		ReadTimeout: min(headerTime, s.bodyTime) + s.bodyTime,
		// The service has limits of its own on a body's time, the queue and the work. Beyond their sum a connection is stuck.
		WriteTimeout:   s.bodyTime + s.queueTime + s.workTime + time.Minute,
		IdleTimeout:    2 * time.Minute,
		MaxHeaderBytes: 64 << 10,
		ErrorLog:       zap.NewStdLog(logger),
	}
	served := make(chan error, 1)
	go func() { served <- server.Serve(listener) }()
	select {
	case err := <-served:
		return err
	case <-ctx.Done():
	}
	logger.Info("stopping")
	handler.Drain()
	time.Sleep(s.drainTime)
	grace, cancel := context.WithTimeout(context.WithoutCancel(ctx), s.stopTime)
	defer cancel()
	if err := server.Shutdown(grace); err == nil {
		return nil
	}
	handler.Stop()
	last, cancelLast := context.WithTimeout(context.WithoutCancel(ctx), answerTime)
	defer cancelLast()
	if err := server.Shutdown(last); err != nil {
		return errors.Join(errors.New("requests were still arriving, or their answers leaving, after the stop time; their connections were cut off"), server.Close())
	}
	return nil
}
