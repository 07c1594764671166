package fit

import (
	"context"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"guardrow/engine/data"
)

// rounds is the number of interleaved rounds of which a benchmark takes the median.
const rounds = 11

// unrolledSum is the floor: the fastest plain loop over the readings.
func unrolledSum(y []float64) float64 {
	var a, b, c, d float64
	for ; len(y) >= 4; y = y[4:] {
		a += y[0]
		b += y[1]
		c += y[2]
		d += y[3]
	}
	for _, v := range y {
		a += v
	}
	return (a + b) + (c + d)
}

var sink float64

// ratio times work and floor in turn, each often enough to be measured, and returns the ratio of the medians.
func ratio(work, floor func()) (ratio, workSeconds float64) {
	var w, f []float64
	for range rounds {
		f = append(f, timed(floor))
		w = append(w, timed(work))
	}
	slices.Sort(w)
	slices.Sort(f)
	return w[rounds/2] / f[rounds/2], w[rounds/2]
}

// timed returns the seconds that one call of f takes, repeated for at least two milliseconds.
func timed(f func()) float64 {
	f()
	for n := 1; ; n *= 2 {
		start := time.Now()
		for range n {
			f()
		}
		if d := time.Since(start); d > 2*time.Millisecond {
			return d.Seconds() / float64(n)
		}
	}
}

// benchmarkGrid is a grid of crossed factors with cell effects and unit noise.
func benchmarkGrid(levels []int, replicates int, shuffled bool, effect float64) *data.Grid {
	rng := rand.New(rand.NewPCG(1, 2))
	g := emptyGrid(crossed(levels, replicates))
	y := make([]float64, g.Rows)
	cells := make([]float64, g.Rows/replicates)
	for c := range cells {
		cells[c] = effect * rng.NormFloat64()
	}
	for i := range y {
		y[i] = 40 + cells[i/replicates] + rng.NormFloat64()
	}
	g.Responses = []data.Response{{Offsets: y}}
	if shuffled {
		shuffle(g, rng)
	}
	return g
}

// BenchmarkKernel measures goal 6: rows to sums of squares, looking at the codes included, against the unrolled sum.
func BenchmarkKernel(b *testing.B) {
	for _, c := range []struct {
		name       string
		levels     []int
		replicates int
		shuffled   bool
		effect     float64
	}{
		{"ordered/100cells", []int{5, 5, 4}, 10000, false, 1},
		{"ordered/1000cells", []int{10, 10, 10}, 1000, false, 1},
		{"ordered/10000cells", []int{20, 25, 20}, 100, false, 1},
		{"ordered/100000cells", []int{50, 50, 40}, 10, false, 1},
		{"ordered/500000cells", []int{100, 100, 50}, 2, false, 1},
		{"ordered/1000000cells", []int{100, 100, 100}, 1, false, 1},
		{"random/100cells", []int{5, 5, 4}, 10000, true, 1},
		{"random/1000cells", []int{10, 10, 10}, 1000, true, 1},
		{"random/10000cells", []int{20, 25, 20}, 100, true, 1},
		{"random/10000cells/steep", []int{20, 25, 20}, 100, true, 5},
		{"random/100000cells", []int{50, 50, 40}, 10, true, 1},
		{"random/500000cells", []int{100, 100, 50}, 2, true, 1},
		{"random/1000000cells", []int{100, 100, 100}, 1, true, 1},
	} {
		b.Run(c.name, func(b *testing.B) {
			g := benchmarkGrid(c.levels, c.replicates, c.shuffled, c.effect)
			y := g.Responses[0].Offsets
			for b.Loop() {
				r, t := ratio(func() {
					s, err := NewKernel(g).Sums(context.Background(), 0)
					if err != nil {
						b.Fatal(err)
					}
					sink += s.Total
				}, func() { sink += unrolledSum(y) })
				b.ReportMetric(r, "ratio")
				b.ReportMetric(t*1e9/float64(g.Rows), "ns/row")
			}
		})
	}
}

// BenchmarkEffects measures goal 7: cell means of 2^12 to all 4,095 sums of squares, against their unrolled sum.
func BenchmarkEffects(b *testing.B) {
	levels := slices.Repeat([]int{2}, 12)
	g := benchmarkGrid(levels, 1, false, 1)
	k := NewKernel(g)
	means := slices.Clone(g.Responses[0].Offsets)
	x := make([]float64, len(means))
	for b.Loop() {
		r, t := ratio(func() {
			copy(x, means)
			sink += k.effects(x)[1]
		}, func() { sink += unrolledSum(means) })
		b.ReportMetric(r, "ratio")
		b.ReportMetric(t*1e6, "µs")
	}
}
