package service

import (
	"context"
	"errors"
	"math"
	"net/netip"
	"sync"
	"sync/atomic"
	"time"

	"guardrow/api"
)

// workers lets a bounded number of requests work at once; others wait for a bounded time.
type workers struct {
	room chan struct{}
	wait time.Duration
}

func newWorkers(n int, wait time.Duration) *workers {
	return &workers{room: make(chan struct{}, n), wait: wait}
}

// enter returns once there is room. After it leave is to be called.
func (w *workers) enter(ctx context.Context) error {
	select {
	case w.room <- struct{}{}:
		return nil
	default:
	}
	timer := time.NewTimer(w.wait)
	defer timer.Stop()
	select {
	case w.room <- struct{}{}:
		return nil
	case <-ctx.Done():
		return context.Cause(ctx)
	case <-timer.C:
		return overloaded()
	}
}

func (w *workers) leave() { <-w.room }

func overloaded() *refusal {
	r := refuse(api.Overloaded, "The service has more to do than it has room for. Try again in a few seconds.")
	r.after = 5 * time.Second
	return r
}

// buffer bounds the bytes of all bodies that are held at once.
type buffer struct {
	held atomic.Int64
	most int64
}

// take takes n bytes, if they are there.
func (b *buffer) take(n int64) bool {
	if b.held.Add(n) > b.most {
		b.held.Add(-n)
		return false
	}
	return true
}

func (b *buffer) giveBack(n int64) { b.held.Add(-n) }

// rates bounds how many requests each client sends: the generic cell rate algorithm (ITU-T I.371, 1996), one time per client.
type rates struct {
	interval time.Duration // between requests, on average
	slack    time.Duration // how far a client may be ahead
	now      func() time.Time

	mu      sync.Mutex
	next    map[netip.Prefix]time.Time // when a client's requests so far are worked off at the average rate
	cleared time.Time
}

// newRates returns the bound of rate requests a second, burst at once; nil, which admits everything, where the rate is 0.
func newRates(rate float64, burst int) *rates {
	if rate == 0 {
		return nil
	}
	interval := time.Duration(float64(time.Second) / rate)
	return &rates{interval: interval, slack: interval * time.Duration(burst-1), now: time.Now, next: make(map[netip.Prefix]time.Time)}
}

// admit counts a request of the client with the given address, or refuses it.
func (r *rates) admit(address string) error {
	if r == nil {
		return nil
	}
	client := clientOf(address)
	r.mu.Lock()
	defer r.mu.Unlock()
	now := r.now()
	r.forget(now)
	due := r.next[client]
	if due.Before(now) {
		due = now
	}
	if ahead := due.Sub(now) - r.slack; ahead > 0 {
		refused := refuse(api.TooManyRequests, "More requests came from this address than the operator allows. Wait as many seconds as the header Retry-After says.")
		refused.after = ahead
		return refused
	}
	r.next[client] = due.Add(r.interval)
	return nil
}

// forget drops clients whose requests are worked off, from time to time.
func (r *rates) forget(now time.Time) {
	if now.Sub(r.cleared) < time.Minute {
		return
	}
	r.cleared = now
	for client, due := range r.next {
		if due.Before(now) {
			delete(r.next, client)
		}
	}
}

// clientOf returns whom an address belongs to: the address itself, for IPv6 the network that one customer usually has.
func clientOf(address string) netip.Prefix {
	ip, err := netip.ParseAddr(address)
	if err != nil {
		return netip.Prefix{}
	}
	ip = ip.Unmap().WithZone("")
	bits := ip.BitLen()
	if ip.Is6() {
		bits = 64
	}
	return netip.PrefixFrom(ip, bits).Masked()
}

// Why a piece of work was ended.
var (
	errTimeLimit = errors.New("the time limit is over")
	errStopping  = errors.New("the service is stopping")
)

// untilStop returns a context that ends with its parent, and when the service stops.
func (s *Service) untilStop(parent context.Context) (context.Context, func()) {
	ctx, cancel := context.WithCancelCause(parent)
	unhook := context.AfterFunc(s.stopping, func() { cancel(errStopping) })
	return ctx, func() {
		unhook()
		cancel(nil)
	}
}

// ended turns the end of a piece of work into a refusal; other errors stay as they are.
func ended(ctx context.Context, err error) error {
	cause := context.Cause(ctx)
	switch {
	case errors.Is(cause, errTimeLimit):
		r := refuse(api.TimeLimit, "The answer was not ready at the time limit. Ask for fewer lines with \"only\", or send fewer responses or rows at a time.")
		r.after = time.Minute
		return r.because(cause)
	case errors.Is(cause, errStopping):
		return shuttingDown()
	}
	return err
}

func shuttingDown() *refusal {
	r := refuse(api.ShuttingDown, "The service is shutting down. Try again in a few seconds; another one will answer.")
	r.after = 5 * time.Second
	return r
}

// seconds rounds a duration up to whole seconds, at least one.
func seconds(d time.Duration) int { return max(1, int(math.Ceil(d.Seconds()))) }
