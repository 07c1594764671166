package prob

import "math"

// upperByFraction returns (upper tail)/E by a continued fraction, for f ≥ 1:
//
//	1/(β₀ + α₁/(β₁ + α₂/(β₂ + …))),   with λ = b·x − a·y, N = a + b,
//	αₙ = n·(a − n)·(b + n − 1)·(N + n − 1)·y²/(b + 2n − 1)²,
//	βₙ = n + n·(a − n)·y/(b + 2n − 1) + (b + n)·(λ + 1 + n·(1 + x))/(b + 2n + 1)
//
// (DiDonato and Morris 1992, ACM TOMS 18, the even part of Gauss's fraction; 1 + x is written 2 − y). Everything is divided by b
// where it can be, so that b = +Inf is Legendre's fraction of the incomplete gamma function and a = +Inf that of its
// lower tail. It is summed forwards by Steed's method (Barnett et al. 1974, Comput. Phys. Commun. 8), which, unlike the recurrence
// of numerators and denominators, keeps all digits over a hundred terms, the most that are needed here.
func (fr *frame) upperByFraction() float64 {
	e := 1 / fr.b
	ye := fr.y * e
	dropped := 2 - fr.y
	lambda := fr.lambda + 1
	inverse := 1 / (1 + e)
	d := 1 / (lambda * inverse)
	sum, step := d, d
	for n := 1.0; n < maxTerms; n++ {
		next := 1 / (1 + (2*n+1)*e)
		q := n * (fr.ay - n*fr.y) * inverse
		alpha := q * (1 + (n-1)*e) * (fr.yr + (n-1)*ye) * inverse
		beta := n + q*e + (1+n*e)*(lambda+n*dropped)*next
		inverse = next
		d = 1 / (beta + alpha*d)
		step *= beta*d - 1
		sum += step
		if math.Abs(step) <= settledAt*math.Abs(sum) {
			break
		}
	}
	return sum
}

const (
	// maxTerms ends every loop over terms, should rounding ever keep one from settling.
	maxTerms = 100000
	// settledAt is the relative size of a term, a quarter of a rounding, after which a sum counts as final.
	settledAt = 0x1p-54
)
