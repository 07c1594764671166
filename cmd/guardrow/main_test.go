package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"flag"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/goleak"

	"guardrow/testdata/demo"
)

var update = flag.Bool("update", false, "write the golden files anew")

func TestMain(m *testing.M) {
	flag.Parse()
	goleak.VerifyTestMain(m, goleak.Cleanup(func(code int) {
		http.DefaultClient.CloseIdleConnections()
		os.Exit(code)
	}))
}

func noEnvironment(string) string { return "" }

// command runs the program to its end.
func command(t *testing.T, getenv func(string) string, args ...string) (code int, stdout, stderr string) {
	t.Helper()
	var out, err bytes.Buffer
	code = run(t.Context(), args, getenv, &out, &err)
	return code, out.String(), err.String()
}

const golden = "../../testdata/demo/demo.golden"

func TestDemo(t *testing.T) {
	code, out, complaint := command(t, noEnvironment, "demo")
	if code != success || complaint != "" {
		t.Fatalf("exit code %d: %s", code, complaint)
	}
	if *update {
		if err := os.WriteFile(golden, []byte(out), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if out != string(want) {
		t.Errorf("the demonstration changed; look at it, and run the test with -update:\n%s", out)
	}
	for number, line := range strings.Split(out, "\n") {
		if n := len([]rune(line)); n > 110 {
			t.Errorf("line %d is %d characters wide", number+1, n)
		}
	}
}

func TestDemoReadingsAreWhatTheSeedMakes(t *testing.T) {
	if demo.Readings != demo.Generate() {
		t.Error("testdata/demo/readings.csv is not what demo.Generate makes")
	}
}

func TestCommandLine(t *testing.T) {
	for _, c := range []struct {
		args string
		code int
		says string // on either output
	}{
		{"", misuse, "guardrow serve"},
		{"help", success, "guardrow serve"},
		{"version", success, "guardrow 0."},
		{"version now", misuse, "takes no arguments"},
		{"dmeo", misuse, "no command \"dmeo\""},
		{"serve -h", success, "GUARDROW_MAX_BODY"},
		{"serve --lisen x", misuse, "-lisen"},
		{"serve x", misuse, "\"x\" is not a setting"},
		{"serve --listen nowhere", misuse, "is not an address and a port"},
		{"serve --listen 127.0.0.1:99999", misuse, "no port from 0 to 65535"},
		{"serve --max-body 0", misuse, "whole number from 1"},
		{"serve --work-time soon", misuse, "such as 30s"},
		{"serve --queue-time 0s", misuse, "from 1ms"},
		{"serve --rate -1", misuse, "from 0 to"},
		{"serve --burst 3", misuse, "needs a --rate"},
		{"serve --log-level loud", misuse, "debug, info"},
		{"serve --log-level fatal", misuse, "debug, info"},
		{"healthcheck --listen 127.0.0.1:1", failure, "does not answer"},
	} {
		code, out, complaint := command(t, noEnvironment, strings.Fields(c.args)...)
		if code != c.code || !strings.Contains(out+complaint, c.says) {
			t.Errorf("guardrow %s: exit code %d, want %d with %q:\n%s%s", c.args, code, c.code, c.says, out, complaint)
		}
	}
}

func TestAllFaultsOfSettingsAtOnce(t *testing.T) {
	getenv := func(name string) string { return map[string]string{"GUARDROW_MAX_ROWS": "many"}[name] }
	code, _, complaint := command(t, getenv, "serve", "--listen", "x", "--work-time", "y")
	for _, says := range []string{"--listen: \"x\"", "--work-time: \"y\"", "GUARDROW_MAX_ROWS: \"many\""} {
		if code != misuse || !strings.Contains(complaint, says) {
			t.Errorf("exit code %d, want a line with %s:\n%s", code, says, complaint)
		}
	}
}

func TestFlagsOverEnvironmentOverDefaults(t *testing.T) {
	getenv := func(name string) string {
		return map[string]string{"GUARDROW_MAX_ROWS": "7", "GUARDROW_WORK_TIME": "3s"}[name]
	}
	var s settings
	if err := s.read("serve", []string{"--max-rows", "9"}, getenv, io.Discard); err != nil {
		t.Fatal(err)
	}
	if s.maxRows != 9 || s.workTime != 3*time.Second || s.listen != "127.0.0.1:8080" {
		t.Errorf("got %+v", s)
	}
}

// lockedBuffer is a log that is read while it is written.
type lockedBuffer struct {
	mutex sync.Mutex
	text  bytes.Buffer
}

func (b *lockedBuffer) Write(p []byte) (int, error) {
	b.mutex.Lock()
	defer b.mutex.Unlock()
	return b.text.Write(p)
}

func (b *lockedBuffer) String() string {
	b.mutex.Lock()
	defer b.mutex.Unlock()
	return b.text.String()
}

// started runs serve on a free port and returns its address; stop ends it and returns its exit code.
func started(t *testing.T, args ...string) (address string, log *lockedBuffer, stop func() int) {
	t.Helper()
	ctx, cancel := context.WithCancel(t.Context())
	log = new(lockedBuffer)
	done := make(chan int, 1)
	go func() {
		done <- run(ctx, append([]string{"serve", "--listen", "127.0.0.1:0"}, args...), noEnvironment, io.Discard, log)
	}()
	for range 500 {
		for line := range strings.Lines(log.String()) {
			var entry struct{ Msg, Address string }
			if json.Unmarshal([]byte(line), &entry) == nil && entry.Msg == "listening" {
				return entry.Address, log, func() int { cancel(); return <-done }
			}
		}
		time.Sleep(10 * time.Millisecond)
	}
	t.Fatalf("the service did not start:\n%s", log)
	return "", nil, nil
}

func TestServeAnswersAndStops(t *testing.T) {
	address, log, stop := started(t)
	if code, out, complaint := command(t, noEnvironment, "healthcheck", "--listen", address); code != success {
		t.Errorf("healthcheck: exit code %d: %s%s", code, out, complaint)
	}
	response, err := http.Post("http://"+address+"/v1/terms", "application/json", strings.NewReader(`{"design": {"factors": [{"name": "secret rack", "levels": 2, "effect": "fixed"}]}}`))
	if err != nil {
		t.Fatal(err)
	}
	body, err := io.ReadAll(response.Body)
	if err != nil || response.StatusCode != http.StatusOK || !strings.Contains(string(body), "secret rack") {
		t.Errorf("%s %s %v", response.Status, body, err)
	}
	if err := response.Body.Close(); err != nil {
		t.Error(err)
	}
	if code := stop(); code != success {
		t.Errorf("exit code %d", code)
	}
	if text := log.String(); !strings.Contains(text, `"route":"/v1/terms"`) || strings.Contains(text, "secret") {
		t.Errorf("the log is not one line a request without names:\n%s", text)
	}
}

// A request whose body is still arriving when the service is told to stop is answered. That the service has begun to read it
// shows in its asking for the rest.
func TestStoppingFinishesWhatIsInFlight(t *testing.T) {
	address, _, stop := started(t)
	connection, err := net.Dial("tcp", address)
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = connection.Close() }()
	body := `{"design": {"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}]}}`
	if _, err := fmt.Fprintf(connection, "POST /v1/terms HTTP/1.1\r\nHost: guardrow\r\nContent-Type: application/json\r\nContent-Length: %d\r\nExpect: 100-continue\r\n\r\n", len(body)); err != nil {
		t.Fatal(err)
	}
	reader := bufio.NewReader(connection)
	if line, err := reader.ReadString('\n'); err != nil || !strings.Contains(line, "100 Continue") {
		t.Fatal(line, err)
	}
	stopped := make(chan int, 1)
	go func() { stopped <- stop() }()
	time.Sleep(100 * time.Millisecond) // the stop is under way, or comes still: both are to end well
	if _, err := io.WriteString(connection, body); err != nil {
		t.Fatal(err)
	}
	if answer, err := io.ReadAll(reader); err != nil || !strings.Contains(string(answer), "200 OK") || !strings.Contains(string(answer), `"df_formula"`) {
		t.Errorf("%s %v", answer, err)
	}
	if code := <-stopped; code != success {
		t.Errorf("exit code %d", code)
	}
}

func TestListenOnATakenPort(t *testing.T) {
	listener, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = listener.Close() }()
	code, _, complaint := command(t, noEnvironment, "serve", "--listen", listener.Addr().String())
	if code != failure || !strings.Contains(complaint, "cannot listen on") {
		t.Errorf("exit code %d: %s", code, complaint)
	}
}

func TestReachable(t *testing.T) {
	for listen, want := range map[string]string{"0.0.0.0:80": "127.0.0.1:80", ":80": "127.0.0.1:80", "[::]:80": "[::1]:80", "10.1.2.3:80": "10.1.2.3:80"} {
		if got := reachable(listen); got != want {
			t.Errorf("%s: %s, want %s", listen, got, want)
		}
	}
}
