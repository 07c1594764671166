package main

import (
	"errors"
	"flag"
	"fmt"
	"io"
	"net"
	"strconv"
	"strings"
	"time"

	"go.uber.org/zap/zapcore"
)

// settings are what serve and healthcheck can be told. Flags go over the environment, and that over the defaults.
type settings struct {
	listen     string
	maxBody    int64
	maxRows    int64
	maxWorkers int64
	workTime   time.Duration
	queueTime  time.Duration
	bodyTime   time.Duration
	rate       float64
	burst      int64
	drainTime  time.Duration
	stopTime   time.Duration
	logLevel   zapcore.Level
}

// setting is a line of the table of settings.
type setting struct {
	flag     string
	fallback string
	meaning  string
	set      func(text string) error
}

// env returns the name of the environment variable: GUARDROW_ and the flag in capitals.
func (s setting) env() string {
	return "GUARDROW_" + strings.ToUpper(strings.ReplaceAll(s.flag, "-", "_"))
}

// table returns every setting.
func (s *settings) table() []setting {
	return []setting{
		{"listen", "127.0.0.1:8080", "address and port to listen on; 0.0.0.0:8080 for all interfaces", address(&s.listen)},
		{"max-body", "67108864", "largest body of a request, in bytes", whole(&s.maxBody, 1)},
		{"max-rows", "2000000", "largest number of rows of readings in a request", whole(&s.maxRows, 1)},
		{"max-workers", "0", "requests worked on at once; 0 for twice the processors", whole(&s.maxWorkers, 0)},
		{"work-time", "30s", "longest time to work on one request", duration(&s.workTime, time.Millisecond)},
		{"queue-time", "10s", "longest time that a request waits for its turn", duration(&s.queueTime, time.Millisecond)},
		{"body-time", "1m", "longest time for a body to arrive", duration(&s.bodyTime, time.Millisecond)},
		{"rate", "0", "requests a second from one address; 0 for no limit", func(text string) error {
			x, err := strconv.ParseFloat(text, 64)
			if err != nil || !(x >= 0 && x <= 1e6) {
				return errors.New("is not a number from 0 to 1000000")
			}
			s.rate = x
			return nil
		}},
		{"burst", "0", "requests at once from one address, with a rate; 0 for twice the rate", whole(&s.burst, 0)},
		{"drain-time", "0s", "time between saying at /readyz that the service stops and closing the door", duration(&s.drainTime, 0)},
		{"stop-time", "30s", "longest time to finish requests when stopping", duration(&s.stopTime, 0)},
		{"log-level", "info", "least severe log lines to write: debug, info, warn or error", func(text string) error {
			if s.logLevel.UnmarshalText([]byte(text)) != nil || s.logLevel > zapcore.ErrorLevel {
				return errors.New("is not one of debug, info, warn and error")
			}
			return nil
		}},
	}
}

func address(value *string) func(string) error {
	return func(text string) error {
		_, port, err := net.SplitHostPort(text)
		if err != nil {
			return errors.New("is not an address and a port, such as 127.0.0.1:8080")
		}
		if n, err := strconv.Atoi(port); err != nil || n < 0 || n > 65535 {
			return errors.New("has no port from 0 to 65535")
		}
		*value = text
		return nil
	}
}

func whole(value *int64, least int64) func(string) error {
	return func(text string) error {
		n, err := strconv.ParseInt(text, 10, 64)
		if err != nil || n < least || n > 1<<40 {
			return fmt.Errorf("is not a whole number from %d to %d", least, int64(1)<<40)
		}
		*value = n
		return nil
	}
}

func duration(value *time.Duration, least time.Duration) func(string) error {
	return func(text string) error {
		d, err := time.ParseDuration(text)
		if err != nil || d < least || d > 24*time.Hour {
			return fmt.Errorf("is not a time from %v to 24h, such as 30s or 2m", least)
		}
		*value = d
		return nil
	}
}

// errHelp says that the settings were shown because they were asked for.
var errHelp = errors.New("help was asked for")

// read fills the settings, or returns everything that is wrong with them, one line a fault.
func (s *settings) read(command string, args []string, getenv func(string) string, stdout io.Writer) error {
	var faults []error
	flags := flag.NewFlagSet(command, flag.ContinueOnError)
	flags.SetOutput(io.Discard)
	given := map[string]string{}
	for _, line := range s.table() {
		flags.Func(line.flag, line.meaning, func(text string) error {
			given[line.flag] = text
			return nil
		})
	}
	switch err := flags.Parse(args); {
	case errors.Is(err, flag.ErrHelp):
		s.help(command, stdout)
		return errHelp
	case err != nil:
		faults = append(faults, fmt.Errorf("%w; guardrow %s -h shows the settings", err, command))
	case flags.NArg() > 0:
		faults = append(faults, fmt.Errorf("%q is not a setting; guardrow %s -h shows them", flags.Arg(0), command))
	}
	for _, line := range s.table() {
		text, source := line.fallback, "the default of --"+line.flag
		if value := getenv(line.env()); value != "" {
			text, source = value, line.env()
		}
		if value, ok := given[line.flag]; ok {
			text, source = value, "--"+line.flag
		}
		if err := line.set(text); err != nil {
			faults = append(faults, fmt.Errorf("%s: %q %w", source, text, err))
		}
	}
	if s.burst > 0 && s.rate == 0 {
		faults = append(faults, errors.New("--burst: it needs a --rate"))
	}
	return errors.Join(faults...)
}

// help prints the table of settings.
func (s *settings) help(command string, w io.Writer) {
	say(w, "Settings of guardrow %s. A flag goes over the environment variable, and that over the default.\n\n", command)
	for _, line := range s.table() {
		say(w, "  --%-12s %-22s %s (default %s)\n", line.flag, line.env(), line.meaning, line.fallback)
	}
}
