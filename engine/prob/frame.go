package prob

import "math"

// frame is one F variate against its distribution, with all that the methods of this package need of it. Infinite b is the
// limit: x and 1/b vanish, bx = b·x and ay = a·y do not. The density of ln F is that of package prob's comment.
type frame struct {
	a, b     float64 // half the degrees of freedom; b may be +Inf, and a in a mirrored frame
	n        float64 // N = a + b
	x, y     float64 // a·f/(a·f + b), b/(a·f + b)
	bx, ay   float64 // b·x, a·y
	xr, yr   float64 // x/(a/N), y/(b/N): both 1 at f = 1
	lambda   float64 // b·x − a·y = a·b·(f − 1)/(a·f + b), free of cancellation
	m        float64 // M = a·b/N, the precision of ln F near the centre
	deviance pair    // D
}

// set prepares f > 0 for shapes 0 < a < ∞, 0 < b ≤ ∞.
func (fr *frame) set(f scaledF, a, b float64) {
	if math.IsInf(b, 1) {
		fr.setLimit(f, a)
		return
	}
	scale := 1.0
	if f.exponent > 0 {
		scale = math.Ldexp(1, -f.exponent)
	}
	n := twoSum(a, b)
	sum := twoProduct(a, f.high) // a·f + b
	af := sum.high
	rest := a*f.low + sum.low
	sum = twoSum(sum.high, b*scale)
	sum.low += rest
	inverse := 1 / sum.high

	x, y := af*inverse, b*scale*inverse
	fr.a, fr.b, fr.n = a, b, n.high
	fr.x, fr.y = x, y
	fr.bx, fr.ay = b*x, a*y
	fr.xr, fr.yr = f.high*n.high*inverse, scale*n.high*inverse
	excess := f.lessOne()
	fr.lambda = b * (a * inverse) * excess
	fr.m = a * (b / n.high)
	if f.exponent == 0 && near(excess, fr.m) {
		fr.deviance = nearDeviance(math.Log1p(excess), fr.m, fr.skew())
		return
	}

	fr.deviance = logDeviance(f, n, sum, a, b)
}

// setLimit is set for b = +Inf: F is χ²/df1 and a·f half of χ².
func (fr *frame) setLimit(f scaledF, a float64) {
	f = scaledF{pair{math.Ldexp(f.high, f.exponent), math.Ldexp(f.low, f.exponent)}, 0}
	infinite := math.Inf(1)
	*fr = frame{a: a, b: infinite, n: infinite, y: 1, bx: a * f.high, ay: a, xr: f.high, yr: 1, m: a}
	excess := f.lessOne()
	fr.lambda = a * excess
	switch {
	case near(excess, a):
		fr.deviance = nearDeviance(math.Log1p(excess), a, 1)
	case fr.bx > 0x1p200: // far beyond any tail that a float64 holds
		fr.deviance = pair{infinite, 0}
	default:
		d := f.plus(-1).minus(logPair(f.high, f.low/f.high))
		fr.deviance = pair{a, 0}.times(d).notNegative()
	}
}

// skew returns (b − a)/N, 1 or −1 in the limits.
func (fr *frame) skew() float64 {
	switch {
	case math.IsInf(fr.b, 1):
		return 1
	case math.IsInf(fr.a, 1):
		return -1
	}
	return (fr.b - fr.a) / fr.n
}

// mirrored returns the frame of 1/F: both tails change places.
func (fr *frame) mirrored() frame {
	r := *fr
	r.a, r.b, r.x, r.y, r.bx, r.ay, r.xr, r.yr = fr.b, fr.a, fr.y, fr.x, fr.ay, fr.bx, fr.yr, fr.xr
	r.lambda = -fr.lambda
	return r
}

// density returns E, the density of ln F.
func (fr *frame) density() float64 {
	c := scaledGamma(fr.n) / (scaledGamma(fr.a) * scaledGamma(fr.b))
	return expMinus(fr.deviance, c*math.Sqrt(fr.m*(1/(2*math.Pi))))
}
