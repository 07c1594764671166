package prob

import "math"

// The range of ln f for float64 f.
const (
	leastLog = -744.4
	mostLog  = 709.78
)

// upperQuantile returns f with P(F > f) = p for 0 < p < 1, by Newton's method on the logarithm of a tail as a function of w = ln f.
//
// The density of w is log-concave, so the logarithm of either tail is concave in w, and Newton's method converges from either side;
// a bracket catches steps that leave the range of numbers. The tail that is at most a half is matched, so that p near 1 loses
// nothing.
func upperQuantile(p, df1, df2 float64) float64 { return quantile(p, 1-p, df1, df2) }

// quantile returns f with P(F > f) = above and P(F ≤ f) = below, which sum to 1; the smaller one is believed.
func quantile(above, below, df1, df2 float64) float64 {
	if min(df1, df2) >= 2*manyDF {
		return 1
	}
	q := search{df1: df1, df2: df2, target: above, sign: 1}
	if below < above {
		q.target, q.sign = below, -1
	}
	if edge, outside := q.outside(); outside {
		return edge
	}
	return q.run(above, below)
}

// search is a quantile in the making: the f at which the upper (sign 1) or lower (−1) tail is target.
type search struct {
	df1, df2, target, sign float64
}

// at returns ln(tail/target) and its slope in w, both with the sign that makes the first fall as f rises.
func (q *search) at(f float64) (excess, slope float64) {
	lower, upper, density := bothTails(scaled(f), q.df1, q.df2)
	if q.sign > 0 {
		return math.Log(upper / q.target), -density / upper
	}
	return -math.Log(lower / q.target), -density / lower
}

// outside reports whether the quantile is too large or too small for a float64, and returns +Inf or 0 then.
func (q *search) outside() (edge float64, is bool) {
	if excess, _ := q.at(math.MaxFloat64); excess > 0 {
		return math.Inf(1), true
	}
	if excess, _ := q.at(math.SmallestNonzeroFloat64); excess < 0 {
		return 0, true
	}
	return 0, false
}

// run narrows the bracket from the point where the deviance alone would put the quantile.
func (q *search) run(above, below float64) float64 {
	low, high := leastLog, mostLog
	w := q.start(above, below)
	f := math.Exp(w)
	for range 200 {
		excess, slope := q.at(f)
		if excess > 0 {
			low = w
		} else {
			high = w
		}
		step := -excess / slope
		// Small steps change f, of which w keeps only the first digits.
		if next := w + step; !(math.Abs(step) < 1e-6 || next > low && next < high) {
			w = (low + high) / 2
			f = math.Exp(w)
			continue
		}
		w += step
		f += f * math.Expm1(step)
		// The next step would be of the order of the slope times this one's square.
		if math.Abs(step) <= 0x1p-53 || step*step*(1-2*slope) <= 0x1p-56 {
			break
		}
	}
	return f
}

// start returns ln f at which the deviance accounts for the tail: D = ln(tail at 1/tail wanted).
func (q *search) start(above, below float64) float64 {
	lower, upper, _ := bothTails(scaled(1), q.df1, q.df2)
	side, wanted := 1.0, math.Log(upper/above)
	if upper < above {
		side, wanted = -1, math.Log(lower/below)
	}
	near, far := 0.0, mostLog
	if side < 0 {
		far = -leastLog
	}
	for range 40 {
		middle := (near + far) / 2
		if roughDeviance(side*middle, q.df1/2, q.df2/2) < wanted {
			near = middle
		} else {
			far = middle
		}
	}
	return side * (near + far) / 2
}

// roughDeviance returns D at f = e^w as ordinary arithmetic has it.
func roughDeviance(w, a, b float64) float64 {
	switch {
	case a >= manyDF:
		return roughDeviance(-w, b, a)
	case b >= manyDF:
		return a * (math.Expm1(w) - w)
	}
	return (a+b)*math.Log1p(a/(a+b)*math.Expm1(w)) - a*w
}
