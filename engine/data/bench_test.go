package data

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"testing"
	"time"

	"guardrow/api"
	"guardrow/engine"
)

// study is a made-up balanced study of a million rows in random order, as JSON columns and as CSV.
type study struct {
	design *engine.Design
	plan   Plan
	json   []byte
	csv    []byte
}

const benchRows = 1_000_000

// newStudy returns a study of three factors, batch (100 levels), device (50) and tube (4), 50 replicates.
func newStudy(reading func(r *rand.Rand) string) study {
	declared := &api.Design{Factors: []api.Factor{
		{Name: "batch", Levels: api.Levels{Count: 100}, Effect: api.Random},
		{Name: "device", Levels: api.Levels{Count: 50}, Effect: api.Random},
		{Name: "tube", Levels: api.Levels{Count: 4, Labels: []string{"gel", "plain", "citrate", "heparin"}}, Effect: api.Fixed},
	}, Replicates: new(api.Integer(benchRows / 100 / 50 / 4))}
	design, faults := engine.Check(declared)
	if faults != nil {
		panic(faults)
	}
	rng := rand.New(rand.NewPCG(1, 2))
	var columns [4]bytes.Buffer
	var table bytes.Buffer
	table.WriteString("batch,device,tube,potassium\n")
	for i, row := range rng.Perm(benchRows) {
		cells := [4]string{"b" + strconv.Itoa(row%100), "dev" + strconv.Itoa(row/100%50), declared.Factors[2].Levels.Labels[row/5000%4], reading(rng)}
		for c := range cells {
			if i > 0 {
				columns[c].WriteByte(',')
			}
			if c < 3 {
				columns[c].WriteString(`"` + cells[c] + `"`)
			} else {
				columns[c].WriteString(cells[c])
			}
		}
		fmt.Fprintf(&table, "%s,%s,%s,%s\n", cells[0], cells[1], cells[2], cells[3])
	}
	var body bytes.Buffer
	fmt.Fprintf(&body, `{"batch":[%s],"device":[%s],"tube":[%s],"potassium":[%s]}`, &columns[0], &columns[1], &columns[2], &columns[3])
	return study{design, Plan{Factors: []string{"batch", "device", "tube"}, Responses: []string{"potassium"}}, body.Bytes(), table.Bytes()}
}

func fixedReading(r *rand.Rand) string {
	return strconv.FormatFloat(4.2+0.3*r.NormFloat64(), 'f', 3, 64)
}

func fullReading(r *rand.Rand) string {
	return strconv.FormatFloat(4.2+0.3*r.NormFloat64(), 'g', -1, 64)
}

func offsetReading(r *rand.Rand) string {
	return strconv.FormatFloat(1e12+math.Round(10*r.NormFloat64())/10, 'f', 1, 64)
}

// ratio reports the median over rounds of the time of work over that of yardstick, both run in every round.
func ratio(b *testing.B, size int, work, yardstick func()) {
	b.Helper()
	const rounds = 9
	times := make([]float64, 0, rounds)
	var took, floor []float64
	for range rounds {
		start := time.Now()
		yardstick()
		middle := time.Now()
		work()
		end := time.Now()
		took = append(took, end.Sub(middle).Seconds())
		floor = append(floor, middle.Sub(start).Seconds())
		times = append(times, took[len(took)-1]/floor[len(floor)-1])
	}
	slices.Sort(times)
	slices.Sort(took)
	for b.Loop() {
	}
	b.ReportMetric(times[rounds/2], "ratio")
	b.ReportMetric(took[rounds/2]*1e9/float64(size), "ns/row")
	b.ReportMetric(0, "ns/op")
}

func scanAndLay(b *testing.B, s study) func() {
	return func() {
		columns, faults, err := ScanJSON(s.json, s.plan)
		if faults != nil || err != nil {
			b.Fatal(faults, err)
		}
		if _, faults = Lay(s.design, columns); faults != nil {
			b.Fatal(faults)
		}
	}
}

// The part of row 1 of the goals that is this package's: JSON text to a grid, against encoding/json.Valid of the text.
func BenchmarkScanJSONAndLayOverValid(b *testing.B) {
	for _, kind := range []struct {
		name    string
		reading func(*rand.Rand) string
	}{{"3decimals", fixedReading}, {"17digits", fullReading}, {"offset", offsetReading}} {
		b.Run(kind.name, func(b *testing.B) {
			s := newStudy(kind.reading)
			ratio(b, benchRows, scanAndLay(b, s), func() {
				if !json.Valid(s.json) {
					b.Fatal("not valid")
				}
			})
		})
	}
}

func BenchmarkScanJSONOverValid(b *testing.B) {
	s := newStudy(fixedReading)
	ratio(b, benchRows, func() {
		if _, faults, err := ScanJSON(s.json, s.plan); faults != nil || err != nil {
			b.Fatal(faults, err)
		}
	}, func() { json.Valid(s.json) })
}

// The part of row 2 of the goals that is this package's: against encoding/json into a struct of slices, a map for each
// factor, and a count of the cells.
func BenchmarkScanJSONAndLayOverOrdinary(b *testing.B) {
	s := newStudy(fixedReading)
	ratio(b, benchRows, scanAndLay(b, s), func() { ordinaryJSON(b, s.json) })
}

func ordinaryJSON(b *testing.B, text []byte) {
	b.Helper()
	var data struct {
		Batch, Device, Tube []string
		Potassium           []float64
	}
	if err := json.Unmarshal(text, &data); err != nil {
		b.Fatal(err)
	}
	cells := make([]uint32, len(data.Potassium))
	for _, column := range [][]string{data.Batch, data.Device, data.Tube} {
		codes := make(map[string]uint32)
		for row, label := range column {
			code, known := codes[label]
			if !known {
				code = uint32(len(codes))
				codes[label] = code
			}
			cells[row] = cells[row]*256 + code
		}
	}
	counts := make(map[uint32]int)
	for _, cell := range cells {
		counts[cell]++
	}
}

// What Split adds: finding the end of the bulk value, against encoding/json.Valid.
func BenchmarkSplitOverValid(b *testing.B) {
	s := newStudy(fixedReading)
	body := []byte(`{"design": {}, "data": ` + string(s.json) + `}`)
	ratio(b, benchRows, func() {
		if _, err := Split(body, "data"); err != nil {
			b.Fatal(err)
		}
	}, func() { json.Valid(body) })
}

// Row 3 of the goals: CSV text to codes and numbers, against encoding/csv (ReuseRecord), a map for each factor and strconv.
func BenchmarkScanCSVOverOrdinary(b *testing.B) {
	for _, kind := range []struct {
		name    string
		reading func(*rand.Rand) string
	}{{"3decimals", fixedReading}, {"17digits", fullReading}} {
		b.Run(kind.name, func(b *testing.B) {
			s := newStudy(kind.reading)
			ratio(b, benchRows, func() {
				if _, faults := ScanCSV(s.csv, s.plan); faults != nil {
					b.Fatal(faults)
				}
			}, func() { ordinaryCSV(b, s.csv) })
		})
	}
}

func ordinaryCSV(b *testing.B, text []byte) (codes [3][]uint32, readings []float64) {
	b.Helper()
	r := csv.NewReader(bytes.NewReader(text))
	r.ReuseRecord = true
	if _, err := r.Read(); err != nil {
		b.Fatal(err)
	}
	maps := [3]map[string]uint32{{}, {}, {}}
	for {
		record, err := r.Read()
		if errors.Is(err, io.EOF) {
			return codes, readings
		}
		for f := range codes {
			code, known := maps[f][record[f]]
			if !known {
				code = uint32(len(maps[f]))
				maps[f][string([]byte(record[f]))] = code
			}
			codes[f] = append(codes[f], code)
		}
		x, err := strconv.ParseFloat(record[3], 64)
		if err != nil {
			b.Fatal(err)
		}
		readings = append(readings, x)
	}
}
