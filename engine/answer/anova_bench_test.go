package answer

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"slices"
	"strconv"
	"testing"
	"time"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/data"
	"guardrow/engine/fit"
)

// benchStudy returns a made-up study of 100 batches, 50 devices and 4 tube types with n readings in each cell, in random
// order, as a request and the text of its columns.
func benchStudy(n int) (*api.AnovaRequest, []byte) {
	tubes := []string{"gel", "plain", "citrate", "heparin"}
	request := &api.AnovaRequest{Design: &api.Design{Factors: []api.Factor{
		{Name: "batch", Levels: api.Levels{Count: 100}, Effect: api.Random},
		{Name: "device", Levels: api.Levels{Count: 50}, Effect: api.Random},
		{Name: "tube", Levels: api.Levels{Count: 4, Labels: tubes}, Effect: api.Fixed},
	}, Replicates: new(api.Integer(n))}}
	random := rand.New(rand.NewPCG(1, 2))
	var columns [4]bytes.Buffer
	for i, row := range random.Perm(20_000 * n) {
		for c, cell := range [4]string{
			strconv.Quote("b" + strconv.Itoa(row%100)), strconv.Quote("dev" + strconv.Itoa(row/100%50)), strconv.Quote(tubes[row/5000%4]),
			strconv.FormatFloat(4.2+0.3*random.NormFloat64(), 'f', 3, 64),
		} {
			if i > 0 {
				columns[c].WriteByte(',')
			}
			columns[c].WriteString(cell)
		}
	}
	return request, fmt.Appendf(nil, `{"batch":[%s],"device":[%s],"tube":[%s],"potassium":[%s]}`, &columns[0], &columns[1], &columns[2], &columns[3])
}

func fitWhole(tb testing.TB, request *api.AnovaRequest, text []byte) {
	tb.Helper()
	if _, _, faults, err := Anova(context.Background(), request, Readings{JSON: text}); faults != nil || err != nil {
		tb.Fatal(faults, err)
	}
}

// fitOrdinary is the same analysis the ordinary way: encoding/json into a slice for each column, a map for each factor, then
// the same kernel.
func fitOrdinary(tb testing.TB, request *api.AnovaRequest, text []byte) {
	tb.Helper()
	var columns struct {
		Batch, Device, Tube []string
		Potassium           []float64
	}
	if err := json.Unmarshal(text, &columns); err != nil {
		tb.Fatal(err)
	}
	design, faults := engine.Check(request.Design)
	if faults != nil {
		tb.Fatal(faults)
	}
	grid := &data.Grid{Design: design, Rows: len(columns.Potassium), Strides: []uint32{200, 4, 1}, Responses: []data.Response{{Name: "potassium", Offsets: columns.Potassium}}}
	for _, column := range [][]string{columns.Batch, columns.Device, columns.Tube} {
		codes, seen := make([]uint8, len(column)), make(map[string]uint8)
		for row, label := range column {
			code, known := seen[label]
			if !known {
				code = uint8(len(seen))
				seen[label] = code
			}
			codes[row] = code
		}
		grid.Axes = append(grid.Axes, data.Codes{U8: codes})
	}
	if _, err := fit.NewKernel(grid).Sums(context.Background(), 0); err != nil {
		tb.Fatal(err)
	}
}

// reportRatio reports the median over rounds of the time of work over that of the yardstick, on one core.
func reportRatio(b *testing.B, work, yardstick func()) {
	b.Helper()
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	ratios := make([]float64, 9)
	for i := range ratios {
		start := time.Now()
		yardstick()
		middle := time.Now()
		work()
		ratios[i] = float64(time.Since(middle)) / float64(middle.Sub(start))
	}
	slices.Sort(ratios)
	for b.Loop() {
	}
	b.ReportMetric(ratios[len(ratios)/2], "ratio")
	b.ReportMetric(0, "ns/op")
}

// Row 1 of the goals: JSON text of a million rows, three factors and one response to the complete fitted table, against
// encoding/json.Valid of the same text.
func BenchmarkTextToFitOverValid(b *testing.B) {
	request, text := benchStudy(50)
	reportRatio(b, func() { fitWhole(b, request, text) }, func() { json.Valid(text) })
}

// Row 2 of the goals: the same against the ordinary way.
func BenchmarkTextToFitOverOrdinary(b *testing.B) {
	request, text := benchStudy(50)
	reportRatio(b, func() { fitWhole(b, request, text) }, func() { fitOrdinary(b, request, text) })
}

// Row 5 of the goals: what a fit of two factors allocates over the body, by the row, and how often whatever the number of
// rows. Twice the rows tell what grows with them.
func TestMemoryByTheRow(t *testing.T) {
	spent := func(rows int) (size, count float64) {
		var a, b, y bytes.Buffer
		for i := range rows {
			if i > 0 {
				a.WriteByte(',')
				b.WriteByte(',')
				y.WriteByte(',')
			}
			fmt.Fprintf(&a, "%d", i%20)
			fmt.Fprintf(&b, "%d", i/20%10)
			fmt.Fprintf(&y, "%.3f", 4+float64(i*7919%1000)/1000)
		}
		text := fmt.Appendf(nil, `{"a":[%s],"b":[%s],"y":[%s]}`, &a, &b, &y)
		request := &api.AnovaRequest{Design: &api.Design{Factors: []api.Factor{
			{Name: "a", Levels: api.Levels{Count: 20}, Effect: api.Random}, {Name: "b", Levels: api.Levels{Count: 10}, Effect: api.Fixed},
		}, Replicates: new(api.Integer(rows / 200))}}
		// The least of a few runs: the runtime allocates a little for itself now and then.
		size, count = math.Inf(1), math.Inf(1)
		for range 5 {
			var before, after runtime.MemStats
			runtime.GC()
			runtime.ReadMemStats(&before)
			fitWhole(t, request, text)
			runtime.ReadMemStats(&after)
			size = min(size, float64(after.TotalAlloc-before.TotalAlloc))
			count = min(count, float64(after.Mallocs-before.Mallocs))
		}
		return size, count
	}
	spent(2000) // what is allocated once for the process
	size, count := spent(100_000)
	doubled, more := spent(200_000)
	t.Logf("%.1f bytes a row, %.0f allocations", (doubled-size)/100_000, count)
	if byRow := (doubled - size) / 100_000; byRow > 16 {
		t.Errorf("%.1f bytes a row are allocated", byRow)
	}
	if count > 200 || more > count+20 {
		t.Errorf("%.0f allocations for 100,000 rows, %.0f for 200,000", count, more)
	}
}
