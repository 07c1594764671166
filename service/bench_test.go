package service

import (
	"context"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"github.com/labstack/echo/v4"
	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
)

// rounds is how often each subject is measured, in turns with its yardstick.
const rounds = 11

// quietLogger writes lines as in production, to nowhere.
func quietLogger() *zap.Logger {
	return zap.New(zapcore.NewCore(zapcore.NewJSONEncoder(zap.NewProductionEncoderConfig()), zapcore.AddSync(io.Discard), zap.InfoLevel))
}

// bare is an echo with one GET that answers 15 bytes of JSON: the yardstick of goals 10 and 11.
func bare() *echo.Echo {
	e := echo.New()
	text := []byte(`{"status":"ok"}`)
	e.GET("/bare", func(c echo.Context) error { return c.JSONBlob(http.StatusOK, text) })
	return e
}

// sink is a connection's writer without the connection.
type sink struct {
	header http.Header
	n      int
}

func (s *sink) Header() http.Header { return s.header }
func (s *sink) WriteHeader(int)     {}
func (s *sink) Write(p []byte) (int, error) {
	s.n += len(p)
	return len(p), nil
}

// processTime returns the CPU time that this process has used.
func processTime() time.Duration {
	var usage syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &usage); err != nil {
		panic(err)
	}
	return time.Duration(usage.Utime.Nano() + usage.Stime.Nano())
}

func median(list []float64) float64 {
	slices.Sort(list)
	return list[len(list)/2]
}

// oneKilobyte is a request of 1 KB: five factors, three of them labelled.
const oneKilobyte = `{
  "id": "bench-2041",
  "design": {
    "title": "Serum potassium in three kinds of tube at three storage temperatures, two centrifuges, with duplicate aliquots (invented)",
    "factors": [
      {"name": "temperature", "symbol": "A", "levels": ["-80", "-40", "-20"], "effect": "fixed"},
      {"name": "freezer", "symbol": "B", "levels": 2, "effect": "random", "within": ["temperature"]},
      {"name": "box", "symbol": "C", "levels": 4, "effect": "random", "within": ["freezer"]},
      {"name": "tube", "symbol": "D", "levels": ["gel", "plain", "citrate"], "effect": "fixed"},
      {"name": "centrifuge", "symbol": "E", "levels": ["north bench, swing-out", "south bench, fixed angle"], "effect": "fixed"}
    ],
    "replicates": 2,
    "constraint": "unrestricted",
    "max_order": 2,
    "negligible": [["tube", "box"], ["centrifuge", "box"], {"crossed": ["tube", "centrifuge"], "within": []}]
  }
}`

var kilobytePaths = []string{"/v1/terms", "/v1/expected-mean-squares", "/v1/tests"}

// BenchmarkAnswer is row 10 of the goals: the CPU of an answer to a 1 KB design over that of a bare GET. The handler is
// called as the server calls it, without a connection ("handler"), and over loopback from a client in another
// process, so that the CPU of this one is the server's ("loopback").
func BenchmarkAnswer(b *testing.B) {
	service := build(b, func(o *Options) { o.Logger = quietLogger() })
	for _, path := range kilobytePaths {
		name := strings.TrimPrefix(path, "/v1/")
		b.Run("handler/"+name, func(b *testing.B) {
			e := bare()
			ratio, floor := compare(b, 300, func(n int) { call(b, service, path, n) }, func(n int) { callBare(e, n) })
			b.ReportMetric(ratio, "ratio")
			b.ReportMetric(floor*1e6, "floor-µs")
		})
		b.Run("loopback/"+name, func(b *testing.B) {
			answers, floor := httptest.NewServer(service), httptest.NewServer(bare())
			defer answers.Close()
			defer floor.Close()
			ratio, yard := compare(b, 1000, func(n int) { over(b, answers.URL+path, n) }, func(n int) { over(b, floor.URL+"/bare", n) })
			b.ReportMetric(ratio, "ratio")
			b.ReportMetric(yard*1e6, "floor-µs")
		})
	}
}

// compare returns the CPU time of a over that of z, medians of interleaved rounds of n calls, and that of a call of z in seconds.
func compare(b *testing.B, n int, a, z func(n int)) (ratio, floor float64) {
	b.Helper()
	a(n)
	z(n)
	for b.Loop() { // the rounds are the measurement; one pass is enough
		var x, y []float64
		for range rounds {
			start := processTime()
			a(n)
			middle := processTime()
			z(n)
			x = append(x, float64(middle-start))
			y = append(y, float64(processTime()-middle))
		}
		floor = median(y)
		ratio = median(x) / floor
		floor /= float64(n) * float64(time.Second)
	}
	return ratio, floor
}

func call(b *testing.B, h http.Handler, path string, n int) {
	b.Helper()
	for range n {
		r := httptest.NewRequestWithContext(context.Background(), http.MethodPost, path, strings.NewReader(oneKilobyte))
		r.Header.Set("Content-Type", jsonType)
		w := &sink{header: make(http.Header)}
		h.ServeHTTP(w, r)
		if w.n < 1000 {
			b.Fatalf("%s: no answer", path)
		}
	}
}

func callBare(h http.Handler, n int) {
	for range n {
		r := httptest.NewRequestWithContext(context.Background(), http.MethodGet, "/bare", nil)
		h.ServeHTTP(&sink{header: make(http.Header)}, r)
	}
}

// clientVariable and countVariable tell a process of this test binary that it is the client of a benchmark.
const (
	clientVariable = "GUARDROW_BENCHMARK_CLIENT"
	countVariable  = "GUARDROW_BENCHMARK_COUNT"
)

// over lets another process send n requests to an address, one after another: a GET where it is the yardstick's.
func over(b *testing.B, address string, n int) {
	b.Helper()
	command := exec.CommandContext(context.Background(), os.Args[0])
	command.Env = append(os.Environ(), clientVariable+"="+address, countVariable+"="+strconv.Itoa(n))
	if out, err := command.CombinedOutput(); err != nil {
		b.Fatalf("the client: %v %s", err, out)
	}
}

// beClient is what that process does.
func beClient(address string) error {
	n, err := strconv.Atoi(os.Getenv(countVariable))
	if err != nil {
		return err
	}
	method, body := http.MethodPost, oneKilobyte
	if strings.HasSuffix(address, "/bare") {
		method, body = http.MethodGet, ""
	}
	for range n {
		r, err := http.NewRequestWithContext(context.Background(), method, address, strings.NewReader(body))
		if err != nil {
			return err
		}
		r.Header.Set("Content-Type", jsonType)
		response, err := http.DefaultClient.Do(r)
		if err != nil {
			return err
		}
		if _, err := io.Copy(io.Discard, response.Body); err != nil {
			return err
		}
		if err := response.Body.Close(); err != nil {
			return err
		}
		if response.StatusCode != http.StatusOK {
			return fmt.Errorf("got %s", response.Status)
		}
	}
	return nil
}

// BenchmarkMiddleware is row 11 of the goals: what log, request id and recovery add to the bare echo.
func BenchmarkMiddleware(b *testing.B) {
	service := build(b, func(o *Options) { o.Logger = quietLogger() })
	e := bare()
	text := []byte(`{"status":"ok"}`)
	dressed := echo.New()
	dressed.Use(service.observed)
	dressed.GET("/bare", func(c echo.Context) error { return c.JSONBlob(http.StatusOK, text) })
	ratio, floor := compare(b, 20000, func(n int) { callBare(dressed, n) }, func(n int) { callBare(e, n) })
	b.ReportMetric(ratio, "ratio")
	b.ReportMetric((ratio-1)*floor*1e6, "added-µs")
}

// BenchmarkStages shows where the time of an answer goes.
func BenchmarkStages(b *testing.B) {
	service := build(b, nil)
	o := service.operations[2]
	body := []byte(oneKilobyte)
	b.Run("split", func(b *testing.B) {
		for b.Loop() {
			if _, err := o.split(body, mebibyte); err != nil {
				b.Fatal(err)
			}
		}
	})
	r, err := o.split(body, mebibyte)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("fingerprint", func(b *testing.B) {
		for b.Loop() {
			if _, err := fingerprint(r.bare); err != nil {
				b.Fatal(err)
			}
		}
	})
	head, err := service.head(r)
	if err != nil {
		b.Fatal(err)
	}
	for _, o := range service.operations[:3] {
		b.Run("decode-and-run"+o.path, func(b *testing.B) {
			for b.Loop() {
				if _, _, _, err := o.run(context.Background(), r, head); err != nil {
					b.Fatal(err)
				}
			}
		})
		reply, _, _, err := o.run(context.Background(), r, head)
		if err != nil {
			b.Fatal(err)
		}
		b.Run("encode"+o.path, func(b *testing.B) {
			for b.Loop() {
				text, err := encode(reply)
				if err != nil {
					b.Fatal(err)
				}
				b.SetBytes(int64(len(text)))
			}
		})
	}
}
