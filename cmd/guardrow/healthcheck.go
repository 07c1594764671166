package main

import (
	"context"
	"io"
	"net"
	"net/http"
	"time"
)

// healthcheck asks the service that listens where --listen or GUARDROW_LISTEN says whether it is alive.
func healthcheck(ctx context.Context, args []string, getenv func(string) string, stdout, stderr io.Writer) int {
	var s settings
	if code, ok := configured(&s, "healthcheck", args, getenv, stdout, stderr); !ok {
		return code
	}
	target := "http://" + reachable(s.listen) + "/healthz"
	ctx, cancel := context.WithTimeout(ctx, 5*time.Second)
	defer cancel()
	request, err := http.NewRequestWithContext(ctx, http.MethodGet, target, http.NoBody)
	if err != nil {
		say(stderr, "%v\n", err)
		return misuse
	}
	// The question is about this very process: no proxy, and no connection that outlives it.
	client := http.Client{Transport: &http.Transport{DisableKeepAlives: true}}
	response, err := client.Do(request)
	if err != nil {
		say(stderr, "The service does not answer: %v\n", err)
		return failure
	}
	if err := response.Body.Close(); err != nil || response.StatusCode != http.StatusOK {
		say(stderr, "The service answers %s at %s.\n", response.Status, target)
		return failure
	}
	say(stdout, "The service is alive.\n")
	return success
}

// reachable returns the address under which a service that listens there can be reached from the same machine.
func reachable(listen string) string {
	host, port, err := net.SplitHostPort(listen)
	if err != nil {
		return listen
	}
	switch host {
	case "", "0.0.0.0":
		host = "127.0.0.1"
	case "::":
		host = "::1"
	}
	return net.JoinHostPort(host, port)
}
