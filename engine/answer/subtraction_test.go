package answer

import (
	"math/rand/v2"
	"testing"

	"guardrow/engine/ems"
	"guardrow/engine/prob"
)

// Supports the threshold largeSubtraction by simulation: data without an effect of A, from crossed random factors A, B and
// C, tested at 5% in the difference form MS(A) / (MS(AB) + MS(AC) − MS(ABC)). Where the part subtracted is up to half of
// the rest, the test rejects in 1.5 to 4% of the studies. Above 0.6 it hardly ever rejects any more: its df have collapsed, and
// with them its power.
func TestDifferenceFormLosesItsLevelAboveTheThreshold(t *testing.T) {
	random := rand.New(rand.NewPCG(20, 26))
	var below, above struct{ studies, rejected int }
	for _, levels := range [][3]int{{3, 3, 3}, {4, 3, 3}, {3, 5, 4}, {5, 5, 5}, {2, 4, 4}, {6, 3, 2}, {4, 8, 8}} {
		a, b, c := float64(levels[0]-1), float64(levels[1]-1), float64(levels[2]-1)
		df := []float64{a * b, a * c, a * b * c}
		for _, ratio := range [][2]float64{{1, 1}, {1.2, 1.2}, {1.5, 1.5}, {2, 1}, {2, 2}, {4, 4}, {10, 1}} {
			for range 3000 {
				ms := []float64{ratio[0] * meanSquare(random, df[0]), ratio[1] * meanSquare(random, df[1]), meanSquare(random, df[2])}
				numerator := (ratio[0] + ratio[1] - 1) * meanSquare(random, a)
				share, denominator := ms[2]/(ms[0]+ms[1]), ms[0]+ms[1]-ms[2]
				if denominator <= 0 {
					continue
				}
				p := prob.FUpperTail(numerator/denominator, a, ems.Satterthwaite([]float64{1, 1, -1}, ms, df))
				count := &below
				switch {
				case share > 0.6:
					count = &above
				case share > largeSubtraction:
					continue
				}
				count.studies++
				if p < 0.05 {
					count.rejected++
				}
			}
		}
	}
	if level := float64(below.rejected) / float64(below.studies); level < 0.015 || level > 0.04 {
		t.Errorf("up to the threshold the level is %.4f in %d studies", level, below.studies)
	}
	if level := float64(above.rejected) / float64(above.studies); level > 0.005 || above.studies < 1000 {
		t.Errorf("far above the threshold the level is %.4f in %d studies", level, above.studies)
	}
}

// meanSquare draws a mean square of expectation 1 with whole df.
func meanSquare(random *rand.Rand, df float64) float64 {
	sum := 0.0
	for range int(df) {
		z := random.NormFloat64()
		sum += z * z
	}
	return sum / df
}
