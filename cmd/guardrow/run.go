package main

import (
	"context"
	"fmt"
	"io"
)

// Exit codes.
const (
	success = 0
	failure = 1
	misuse  = 2 // the command line or the environment is wrong
)

const usage = `guardrow tells a laboratory what its study can and cannot test, and analyses it afterwards.

    guardrow serve        answer requests over HTTP
    guardrow demo         post a demonstration study to a service of its own and print what comes back
    guardrow healthcheck  ask a running service whether it is alive
    guardrow version      print the version

    guardrow serve -h     shows the settings
`

// run is the whole program as a function of the outside world; it returns the exit code.
func run(ctx context.Context, args []string, getenv func(string) string, stdout, stderr io.Writer) int {
	if len(args) == 0 {
		say(stderr, usage)
		return misuse
	}
	command, rest := args[0], args[1:]
	switch command {
	case "serve":
		return serve(ctx, rest, getenv, stdout, stderr)
	case "healthcheck":
		return healthcheck(ctx, rest, getenv, stdout, stderr)
	case "help", "-h", "-help", "--help":
		say(stdout, usage)
		return success
	case "demo", "version":
		if len(rest) > 0 {
			say(stderr, "guardrow %s takes no arguments, but got %q.\n", command, rest[0])
			return misuse
		}
	default:
		say(stderr, "There is no command %q.\n\n%s", command, usage)
		return misuse
	}
	if command == "version" {
		say(stdout, "%s\n", fullVersion())
		return success
	}
	if err := demonstrate(ctx, stdout); err != nil {
		say(stderr, "The demonstration failed: %v\n", err)
		return failure
	}
	return success
}

// say writes for a person; there is nobody to tell if that fails.
func say(w io.Writer, format string, args ...any) { _, _ = fmt.Fprintf(w, format, args...) }
