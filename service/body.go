package service

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net/http"
	"os"
	"time"

	"guardrow/api"
)

// firstRead is how much room a body of unknown length gets at first.
const firstRead = 8 << 10

// firstTrust is how much room a body gets because of its announced length alone. More is made once that much has arrived, so
// that a caller who only announces a large body holds little.
const firstTrust = mebibyte

// intake reads a request's body within the service's bounds on size, time and memory.
type intake struct {
	service *Service
	source  io.ReadCloser
	header  *http.ResponseController
	x       *exchange
	left    int64       // bytes that the body may still have
	taken   int64       // bytes taken from the service's buffer
	unhook  func() bool // of the service's stop
	ended   bool        // whether all of the body is here
}

func (s *Service) intake(x *exchange) *intake {
	return &intake{service: s, source: x.Request().Body, header: http.NewResponseController(x.Response().Writer), x: x, left: s.options.MaxBody}
}

// open begins to read. It refuses a body whose announced length is too large, and sets the time by which all must be here.
func (in *intake) open() error {
	if in.x.Request().ContentLength > in.left {
		return in.tooLarge()
	}
	// Not every connection has deadlines (a test's recorder has none); the server's own limits hold there.
	err := in.header.SetReadDeadline(time.Now().Add(in.service.options.BodyTime))
	if err != nil && !errors.Is(err, http.ErrNotSupported) {
		return err
	}
	in.unhook = context.AfterFunc(in.service.stopping, func() { _ = in.header.SetReadDeadline(time.Unix(1, 0)) })
	return nil
}

// arrived gives the connection its time back once all of the body is here; otherwise the deadline would end the request as
// if its client had gone. Where the body did not arrive the deadline stays, so that nobody waits for the rest of it.
func (in *intake) arrived() {
	in.ended = true
	in.unhook()
	_ = in.header.SetReadDeadline(time.Time{}) // as in open; a dead connection shows elsewhere
}

// close gives back what was taken.
func (in *intake) close() {
	if in.unhook != nil {
		in.unhook()
	}
	in.service.buffer.giveBack(in.taken)
}

// whole reads the body as it is.
func (in *intake) whole() ([]byte, error) {
	return in.read(in, in.x.Request().ContentLength)
}

// read reads all of source, which reads from in, into one piece of memory, of the announced size if that is right; a negative
// size is unknown. The memory counts against the service's buffer.
func (in *intake) read(source io.Reader, size int64) ([]byte, error) {
	if size < 0 {
		size = min(firstRead, in.left)
	}
	room := min(size, firstTrust) + 1 // one more, so that the end is found without growing
	if err := in.take(room); err != nil {
		return nil, err
	}
	text := make([]byte, 0, room)
	for {
		n, err := source.Read(text[len(text):cap(text)])
		text = text[:len(text)+n]
		switch {
		case errors.Is(err, io.EOF):
			return text, nil
		case err != nil:
			return nil, err
		case len(text) == cap(text):
			room = max(2*room, size+1)
			if err := in.take(room - int64(cap(text))); err != nil {
				return nil, err
			}
			grown := make([]byte, len(text), room)
			copy(grown, text)
			text = grown
		}
	}
}

func (in *intake) take(n int64) error {
	if !in.service.buffer.take(n) {
		return overloaded()
	}
	in.taken += n
	return nil
}

// Read reads from the body and turns what goes wrong into refusals.
func (in *intake) Read(p []byte) (int, error) {
	n, err := in.source.Read(p)
	in.x.BytesIn += int64(n)
	in.left -= int64(n)
	if in.left < 0 {
		return 0, in.tooLarge()
	}
	switch {
	case err == nil:
		return n, nil
	case errors.Is(err, io.EOF):
		if !in.ended {
			in.arrived()
		}
		return n, err
	case in.service.stopped():
		r := shuttingDown().because(err)
		r.close = true
		return n, r
	case errors.Is(err, os.ErrDeadlineExceeded):
		r := refuse(api.BodyTooSlow, fmt.Sprintf("The body did not arrive within %v. Send it again.", in.service.options.BodyTime)).because(err)
		r.close = true
		return n, r
	}
	r := refuse(api.IncompleteBody, "The body ended before its announced length. Send it again.").because(err)
	r.close = true
	return n, r
}

func (in *intake) tooLarge() error {
	r := refuse(api.BodyTooLarge, fmt.Sprintf("The body is larger than %d bytes, which is the most that this service takes. Send fewer responses at a time.", in.service.options.MaxBody))
	r.close = true
	return r
}
