package main

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"net"
	"net/http"
	"strings"
	"testing"
	"time"
)

// connected sends text on a connection of its own.
func connected(t *testing.T, address, text string) *bufio.Reader {
	t.Helper()
	connection, err := net.Dial("tcp", address)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = connection.Close() })
	if err := connection.SetDeadline(time.Now().Add(20 * time.Second)); err != nil {
		t.Fatal(err)
	}
	if _, err := io.WriteString(connection, text); err != nil {
		t.Fatal(err)
	}
	return bufio.NewReader(connection)
}

func TestReadinessTurnsBeforeTheDoorCloses(t *testing.T) {
	address, _, stop := started(t, "--drain-time", "1s")
	ready := func() int {
		answer, err := http.ReadResponse(connected(t, address, "GET /readyz HTTP/1.1\r\nHost: guardrow\r\nConnection: close\r\n\r\n"), nil)
		if err != nil {
			t.Fatal(err)
		}
		_ = answer.Body.Close()
		return answer.StatusCode
	}
	if status := ready(); status != http.StatusOK {
		t.Errorf("before the stop: %d", status)
	}
	stopped := make(chan int, 1)
	go func() { stopped <- stop() }()
	status := http.StatusOK
	for range 50 {
		if status = ready(); status != http.StatusOK {
			break
		}
		time.Sleep(10 * time.Millisecond)
	}
	if status != http.StatusServiceUnavailable {
		t.Errorf("while draining: %d", status)
	}
	if code := <-stopped; code != success {
		t.Errorf("exit code %d", code)
	}
}

// A body that is announced and never sent holds its connection for a bounded time, on every route: those that read a body, and
// those that do not.
func TestBodiesThatNeverArrive(t *testing.T) {
	address, _, stop := started(t, "--body-time", "200ms")
	for request, status := range map[string]string{
		"GET /healthz":    "200 OK",
		"POST /nowhere":   "404 Not Found",
		"POST /v1/terms":  "408 Request Timeout",
		"DELETE /v1/docs": "404 Not Found",
	} {
		reader := connected(t, address, request+" HTTP/1.1\r\nHost: guardrow\r\nContent-Type: application/json\r\nContent-Length: 100\r\n\r\n")
		if answer, err := io.ReadAll(reader); err != nil || !strings.Contains(string(answer), status) {
			t.Errorf("%s: want %s and the end of the connection, got %.80q %v", request, status, answer, err)
		}
	}
	if code := stop(); code != success {
		t.Errorf("exit code %d", code)
	}
}

// Whoever is still sending a body at the stop time does not keep the process: it ends, and says so if it had to cut somebody off
// without an answer.
func TestTheStopTimeEndsWhatIsStillArriving(t *testing.T) {
	t.Parallel()
	address, log, stop := started(t, "--stop-time", "100ms")
	reader := connected(t, address, "POST /v1/terms HTTP/1.1\r\nHost: guardrow\r\nContent-Type: application/json\r\nContent-Length: 100\r\nExpect: 100-continue\r\n\r\n")
	if line, err := reader.ReadString('\n'); err != nil || !strings.Contains(line, "100 Continue") {
		t.Fatal(line, err)
	}
	code := stop()
	answer, _ := io.ReadAll(reader)
	answered := strings.Contains(string(answer), "503 Service Unavailable")
	cutOff := strings.Contains(log.String(), "their connections were cut off")
	if answered != (code == success) || cutOff != (code == failure) {
		t.Errorf("exit code %d, answer %.80q, log:\n%s", code, answer, log)
	}
}

// unwritable is an output that is full.
type unwritable struct{}

func (unwritable) Write([]byte) (int, error) { return 0, fmt.Errorf("the disk is full") }

func TestDemoFails(t *testing.T) {
	var complaint lockedBuffer
	if code := run(t.Context(), []string{"demo"}, noEnvironment, unwritable{}, &complaint); code != failure || !strings.Contains(complaint.String(), "The demonstration failed: the disk is full") {
		t.Errorf("exit code %d: %s", code, &complaint)
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	var out lockedBuffer
	if code := run(ctx, []string{"demo"}, noEnvironment, &out, &complaint); code != failure || out.String() != "" {
		t.Errorf("exit code %d, printed: %s", code, &out)
	}
}
