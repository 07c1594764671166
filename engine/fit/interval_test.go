package fit

import (
	"math"
	"testing"
)

// The recomputed figures of testdata/cases/mont_128_component_intervals (stand-alone inputs of its worked examples: a
// one-sided modified large-sample limit at 95%).
func TestLargeSampleOneSidedLimit(t *testing.T) {
	lower, _ := largeSample([]float64{1. / 6, -1. / 6}, []float64{134.91, 19.26}, []float64{6, 12}, 0.05)
	if want := 6.9416255600724313; math.Abs(lower-want) > 1e-9*want {
		t.Errorf("lower limit %v, want %v", lower, want)
	}
}

// The recomputed figures of testdata/cases/bbm_gauge_mls_intervals (Burdick, Borror and Montgomery 2003): intervals at 95%
// for the part component, and for the variance of measurement, which is a sum of three mean squares.
func TestLargeSampleGaugeStudy(t *testing.T) {
	const part, operator, both, residual = 437.3283950617284, 19.633333333333333, 2.6950617283950617, 0.51111111111111111
	for _, c := range []struct {
		what         string
		weight, ms   []float64
		df           []float64
		lower, upper float64
	}{
		{"part", []float64{1. / 9, -1. / 9}, []float64{part, both}, []float64{9, 18}, 22.694519080018604, 161.63918415174118},
		{"measurement", []float64{1. / 30, 9. / 30, 2. / 3}, []float64{operator, both, residual}, []float64{2, 18, 60}, 1.2062255740430064, 27.017238837189926},
	} {
		lower, upper := largeSample(c.weight, c.ms, c.df, 0.025)
		if math.Abs(lower-c.lower) > 1e-9*c.lower || math.Abs(upper-c.upper) > 1e-9*c.upper {
			t.Errorf("%s: %v to %v, want %v to %v", c.what, lower, upper, c.lower, c.upper)
		}
	}
}
