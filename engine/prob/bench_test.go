package prob

import (
	"slices"
	"testing"
	"time"

	"gonum.org/v1/gonum/mathext"
)

// rounds is the number of interleaved rounds of which a benchmark takes the median.
const rounds = 15

var sink float64

type point struct{ f, df1, df2 float64 }

// grid is a spread of degrees of freedom up to top and of p from 0.99 to 1e-300, every f a normal number.
func grid(top float64) []point {
	dfs := []float64{1, 2, 2.7, 5, 10, 30.4, 100, 1e3, 12345.6, 1e5, 1e6, 1e8}
	var out []point
	for _, df1 := range dfs {
		for _, df2 := range dfs {
			if max(df1, df2) > top {
				continue
			}
			for _, p := range []float64{0.99, 0.5, 0.1, 0.05, 0.01, 1e-3, 1e-6, 1e-12, 1e-30, 1e-100, 1e-300} {
				if f := FUpperQuantile(p, df1, df2); f < 1e100 {
					out = append(out, point{f, df1, df2})
				}
			}
		}
	}
	return out
}

// BenchmarkFUpperTail measures goal 12: the time of the upper tail of F against gonum's incomplete beta function on the same grid, and
// the largest relative error over the reference table (p from 1e-305 to 1).
func BenchmarkFUpperTail(b *testing.B) {
	for _, c := range []struct {
		name string
		top  float64
		keep func(p point) bool
	}{
		{"df to 1e5", 1e5, func(point) bool { return true }},
		{"df to 1e8", 1e8, func(point) bool { return true }},
		{"everyday", 100, func(p point) bool { return FUpperTail(p.f, p.df1, p.df2) > 1e-7 }},
	} {
		b.Run(c.name, func(b *testing.B) {
			points := slices.DeleteFunc(grid(c.top), func(p point) bool { return !c.keep(p) })
			var ours, theirs []float64
			for b.Loop() {
				ours, theirs = ours[:0], theirs[:0]
				for range rounds {
					ours = append(ours, timed(points, func(p point) float64 { return FUpperTail(p.f, p.df1, p.df2) }))
					theirs = append(theirs, timed(points, func(p point) float64 {
						return mathext.RegIncBeta(p.df2/2, p.df1/2, p.df2/(p.df2+p.df1*p.f))
					}))
				}
			}
			slices.Sort(ours)
			slices.Sort(theirs)
			b.ReportMetric(ours[rounds/2]/theirs[rounds/2], "ratio")
			b.ReportMetric(ours[rounds/2]*1e9, "ns/tail")
		})
	}
	b.Run("accuracy", func(b *testing.B) {
		var errors map[string]*worst
		for b.Loop() {
			errors = fErrors(b)
		}
		b.ReportMetric(errors["common upper"].err*1e15, "1e-15-to-df-1e5")
		b.ReportMetric(errors["large upper"].err*1e15, "1e-15-to-df-1e8")
	})
}

// timed returns the seconds per point.
func timed(points []point, tail func(p point) float64) float64 {
	const repeats = 3
	start := time.Now()
	for range repeats {
		for _, p := range points {
			sink += tail(p)
		}
	}
	return time.Since(start).Seconds() / float64(repeats*len(points))
}

// BenchmarkFUpperQuantile shows how many tails a quantile costs.
func BenchmarkFUpperQuantile(b *testing.B) {
	points := grid(1e5)
	var tails, quantiles []float64
	for b.Loop() {
		tails, quantiles = tails[:0], quantiles[:0]
		for range rounds {
			tails = append(tails, timed(points, func(p point) float64 { return FUpperTail(p.f, p.df1, p.df2) }))
			quantiles = append(quantiles, timed(points, func(p point) float64 { return FUpperQuantile(0.05, p.df1, p.df2) }))
		}
	}
	slices.Sort(tails)
	slices.Sort(quantiles)
	b.ReportMetric(quantiles[rounds/2]/tails[rounds/2], "ratio")
}
