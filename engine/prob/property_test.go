package prob

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// drawDF draws degrees of freedom between 0.01 and 1e8, log-uniform, whole, or infinite.
func drawDF(t *rapid.T, label string) float64 {
	switch rapid.IntRange(0, 9).Draw(t, label+" kind") {
	case 0:
		return math.Inf(1)
	case 1, 2, 3:
		return float64(rapid.IntRange(1, 200).Draw(t, label))
	default:
		return math.Exp(rapid.Float64Range(-4.6, 18.4).Draw(t, label+" log"))
	}
}

// drawTail draws a probability between 1e-300 and 1, often from the middle.
func drawTail(t *rapid.T) float64 {
	if rapid.Bool().Draw(t, "middle") {
		return rapid.Float64Range(1e-6, 1-1e-6).Draw(t, "p")
	}
	return math.Exp(rapid.Float64Range(-690, -1e-3).Draw(t, "ln p"))
}

func TestQuantileAndTailAreInverse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		df1, df2, p := drawDF(t, "df1"), drawDF(t, "df2"), drawTail(t)
		if min(df1, df2) > 1e300 {
			return
		}
		f := FUpperQuantile(p, df1, df2)
		if math.IsInf(f, 1) || f < 1e-290 {
			return
		}
		// f is right to a rounding, which the slope of ln p in ln f magnifies.
		_, upper, density := bothTails(scaled(f), df1, df2)
		if allowed := stretch + 4e-16*density/upper; relative(upper, p) > allowed {
			t.Fatalf("P(F > %g) = %g, want %g: %.3g", f, upper, p, relative(upper, p))
		}
	})
}

func TestTailsFallAndRise(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		df1, df2, p := drawDF(t, "df1"), drawDF(t, "df2"), drawTail(t)
		f := FUpperQuantile(p, df1, df2)
		step := math.Exp2(rapid.Float64Range(-30, 0).Draw(t, "step"))
		g := f * (1 + step)
		if math.IsInf(g, 1) {
			return
		}
		if up, down := FUpperTail(f, df1, df2), FUpperTail(g, df1, df2); down > up*(1+stretch) {
			t.Fatalf("upper tail rises from %g at %g to %g at %g", up, f, down, g)
		}
		if up, down := FLowerTail(g, df1, df2), FLowerTail(f, df1, df2); down > up*(1+stretch) {
			t.Fatalf("lower tail falls from %g at %g to %g at %g", down, f, up, g)
		}
	})
}

func TestTailsSumToOne(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		df1, df2 := drawDF(t, "df1"), drawDF(t, "df2")
		f := math.Exp(rapid.Float64Range(-20, 20).Draw(t, "ln f"))
		if sum := FUpperTail(f, df1, df2) + FLowerTail(f, df1, df2); math.Abs(sum-1) > stretch {
			t.Fatalf("sum 1 %+g", sum-1)
		}
		x := df1 * f
		if sum := ChiSquareUpperTail(x, df1) + ChiSquareLowerTail(x, df1); math.Abs(sum-1) > stretch {
			t.Fatalf("χ²: sum 1 %+g", sum-1)
		}
	})
}

// 1/F has the degrees of freedom exchanged. A power of two has an exact inverse, so that nothing is forgiven but the tail's own error.
func TestInverseExchangesDegreesOfFreedom(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		df1, df2 := drawDF(t, "df1"), drawDF(t, "df2")
		if min(df1, df2) > 1e300 {
			return // F is 1, and not above 1
		}
		f := math.Ldexp(1, rapid.IntRange(-900, 900).Draw(t, "log2 f"))
		a, b := FUpperTail(f, df1, df2), FLowerTail(1/f, df2, df1)
		if a < leastTail && b < leastTail {
			return
		}
		if relative(a, b) > stretch {
			t.Fatalf("P(F > %g) = %g, P(1/F < %g) = %g", f, a, 1/f, b)
		}
	})
}

func TestMethodsAgreeWhereTheyMeet(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := math.Exp(rapid.Float64Range(math.Log(centralPrecision), 9).Draw(t, "ln a"))
		b := math.Exp(rapid.Float64Range(math.Log(centralPrecision), 14).Draw(t, "ln b"))
		zeta := rapid.Float64Range(0.2, centralReach).Draw(t, "ζ")
		var fr frame
		fr.set(scaled(math.Exp(zeta)), a, b)
		if !fr.inCentre() || fr.density() < leastTail {
			return
		}
		_, expansion, density := fr.centralTails()
		if relative(density, fr.density()) > stretch {
			t.Fatalf("density %g, or %g", density, fr.density())
		}
		if fraction := fr.density() * fr.upperByFraction(); fraction > leastTail && relative(expansion, fraction) > stretch {
			t.Fatalf("expansion %g, fraction %g", expansion, fraction)
		}
	})
}

// With few degrees of freedom the series about the origin meets the fraction.
func TestOriginMeetsFraction(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a := rapid.Float64Range(0.02, 0.999).Draw(t, "a")
		b := math.Exp(rapid.Float64Range(0.01, 14).Draw(t, "ln b"))
		bx := rapid.Float64Range(1, originReach(a)).Draw(t, "bx")
		var fr frame
		fr.set(scaled(bx*b/(b-bx)/a), a, b)
		if b <= bx || fr.x > 0.5 || fr.lambda < 0 {
			return
		}
		_, origin := fr.nearOrigin(fr.density())
		if fraction := fr.density() * fr.upperByFraction(); relative(origin, fraction) > 2*stretch { // a hundred terms cost the fraction digits
			t.Fatalf("series %g, fraction %g: %g", origin, fraction, relative(origin, fraction))
		}
	})
}

func TestScaledGammaSteps(t *testing.T) {
	// Γ(s+1) = s·Γ(s) in terms of Γ*: Γ*(s+1)/Γ*(s) = e·(s/(s+1))^(s+½).
	rapid.Check(t, func(t *rapid.T) {
		s := math.Exp(rapid.Float64Range(-5, 12).Draw(t, "ln s"))
		want := math.Exp(1 - (s+0.5)*math.Log1p(1/s))
		if e := relative(scaledGamma(s+1)/scaledGamma(s), want); e > 2e-15 {
			t.Fatalf("s = %g: %g", s, e)
		}
	})
	for n := 1.0; n <= 20; n++ { // factorials
		want := math.Gamma(n) * math.Exp(n-(n-0.5)*math.Log(n)) / math.Sqrt(2*math.Pi)
		if e := relative(scaledGamma(n), want); e > 1e-14 {
			t.Errorf("Γ*(%g): %g", n, e)
		}
	}
}

// About f = 1 the density of ln F is flat, and the tail a straight line in ln f: a test of the deviance where it is next to nothing.
func TestTailIsStraightAtOne(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		df1, df2 := drawDF(t, "df1"), drawDF(t, "df2")
		if min(df1, df2) > 1e300 || max(df1, df2) < 1 {
			return
		}
		_, middle, density := bothTails(scaled(1), df1, df2)
		w := rapid.Float64Range(-1, 1).Draw(t, "w") * 1e-5 / (1 + density) * math.Ldexp(1, -rapid.IntRange(0, 30).Draw(t, "order"))
		f := 1 + w
		w = math.Log1p(f - 1)
		if got, want := FUpperTail(f, df1, df2), middle-density*w; relative(got, want) > stretch {
			t.Fatalf("P(F > 1 %+g) = %.17g, want %.17g", w, got, want)
		}
	})
}
