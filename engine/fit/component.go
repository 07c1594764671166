package fit

import (
	"math"

	"guardrow/engine/ems"
)

// Component is an estimated component of variance, or the sum of several that the study cannot take apart. Estimate, Lower
// and Upper are in the unit of the Sums they came from, NaN where there are none. A variance is not negative, so Lower
// and Upper are at least 0; the estimate is shown as it comes.
type Component struct {
	Estimator ems.Estimator
	Estimate  float64
	Lower     float64
	Upper     float64
	Method    Method
}

// Method is how an interval was made.
type Method int

// Methods of intervals.
const (
	NoInterval          Method = iota
	ChiSquareInterval          // exact: one line alone
	LargeSampleInterval        // modified large-sample: several lines
)

// components equates mean squares to their expectations.
func (p *Plan) components(ms []float64) []Component {
	list := make([]Component, 0, len(p.estimators))
	for _, e := range p.estimators {
		c := Component{Estimator: e, Estimate: math.NaN(), Lower: math.NaN(), Upper: math.NaN()}
		if len(e.Weights) > 0 {
			var room [3][8]float64 // on the stack; nearly every combination fits
			weight, x, df := room[0][:0], room[1][:0], room[2][:0]
			c.Estimate = 0
			for i, w := range e.Weights {
				l := p.Model.Line(w.Set)
				weight, x, df = append(weight, w.Weight.Float64()), append(x, ms[l]), append(df, float64(p.Model.Lines[l].DF))
				c.Estimate += weight[i] * x[i]
			}
			c.interval(weight, x, df, p.Confidence)
		}
		list = append(list, c)
	}
	return list
}

func (c *Component) interval(weight, ms, df []float64, confidence float64) {
	tail := (1 - confidence) / 2
	if len(weight) == 1 {
		c.Method = ChiSquareInterval
		c.Lower, c.Upper = chiSquareInterval(weight[0]*ms[0], df[0], tail)
		return
	}
	c.Method = LargeSampleInterval
	lower, upper := largeSample(weight, ms, df, tail)
	c.Lower, c.Upper = max(lower, 0), max(upper, 0)
}
