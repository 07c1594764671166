package prob

import (
	"math"
	"testing"
)

var (
	inf = math.Inf(1)
	nan = math.NaN()
)

func TestSpecialCases(t *testing.T) {
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"f = 0", FUpperTail(0, 3, 5), 1},
		{"f < 0", FUpperTail(-2, 3, 5), 1},
		{"f = -0", FUpperTail(math.Copysign(0, -1), 3, 5), 1},
		{"f = ∞", FUpperTail(inf, 3, 5), 0},
		{"f NaN", FUpperTail(nan, 3, 5), nan},
		{"df1 = 0", FUpperTail(1, 0, 5), nan},
		{"df1 < 0", FUpperTail(1, -1, 5), nan},
		{"df2 = 0", FUpperTail(1, 3, 0), nan},
		{"df2 NaN", FUpperTail(1, 3, nan), nan},
		{"df1 NaN, f = ∞", FUpperTail(inf, nan, 3), nan},
		{"both infinite, f < 1", FUpperTail(0.999, inf, inf), 1},
		{"both infinite, f = 1", FUpperTail(1, inf, inf), 0},
		{"both infinite, f > 1", FUpperTail(1.001, inf, inf), 0},
		{"lower, f = 0", FLowerTail(0, 3, 5), 0},
		{"lower, f = ∞", FLowerTail(inf, 3, 5), 1},
		{"lower, NaN", FLowerTail(nan, 3, 5), nan},
		{"lower, df", FLowerTail(1, 3, -5), nan},
		{"lower, both infinite", FLowerTail(1, inf, inf), 1},
		{"very many", FUpperTail(1, 1e290, 1e300), 0.5},
		{"very many, lower", FLowerTail(1, 1e290, 1e300), 0.5},
		{"quantile of 0", FUpperQuantile(0, 3, 5), inf},
		{"quantile of 1", FUpperQuantile(1, 3, 5), 0},
		{"quantile below 0", FUpperQuantile(-0.1, 3, 5), nan},
		{"quantile above 1", FUpperQuantile(1.1, 3, 5), nan},
		{"quantile of NaN", FUpperQuantile(nan, 3, 5), nan},
		{"quantile, df", FUpperQuantile(0.1, 0, 5), nan},
		{"quantile, both infinite", FUpperQuantile(0.1, inf, inf), 1},
		{"quantile too large", FUpperQuantile(1e-300, 3, 0.1), inf},
		{"quantile too small", 1 / FUpperQuantile(1-1e-15, 0.01, 3), inf},
		{"χ² at 0", ChiSquareUpperTail(0, 3), 1},
		{"χ² at ∞", ChiSquareUpperTail(inf, 3), 0},
		{"χ², df", ChiSquareUpperTail(1, -3), nan},
		{"χ², x NaN", ChiSquareUpperTail(nan, 3), nan},
		{"χ², df infinite", ChiSquareUpperTail(1e10, inf), 1},
		{"χ², huge", ChiSquareUpperTail(1e300, 5), 0},
		{"χ² lower at 0", ChiSquareLowerTail(-1, 3), 0},
		{"χ² lower at ∞", ChiSquareLowerTail(inf, 3), 1},
		{"χ² lower, df infinite", ChiSquareLowerTail(1e10, inf), 0},
		{"χ² lower, huge", ChiSquareLowerTail(1e300, 5), 1},
		{"χ² lower, NaN", ChiSquareLowerTail(1, nan), nan},
		{"χ² quantile of 0", ChiSquareUpperQuantile(0, 3), inf},
		{"χ² quantile of 1", ChiSquareUpperQuantile(1, 3), 0},
		{"χ² quantile, df infinite", ChiSquareUpperQuantile(0.5, inf), inf},
		{"χ² quantile, NaN", ChiSquareUpperQuantile(nan, 3), nan},
		{"χ² lower quantile of 0", ChiSquareLowerQuantile(0, 3), 0},
		{"χ² lower quantile of 1", ChiSquareLowerQuantile(1, 3), inf},
		{"χ² lower quantile, df", ChiSquareLowerQuantile(0.5, 0), nan},
		{"t = 0", TTwoSided(0, 3), 1},
		{"t = ∞", TTwoSided(-inf, 3), 0},
		{"t NaN", TTwoSided(nan, 3), nan},
		{"t, df", TTwoSided(1, 0), nan},
		{"t quantile of 0", TUpperQuantile(0, 3), inf},
		{"t quantile of ½", TUpperQuantile(0.5, 3), 0},
		{"t quantile of 1", TUpperQuantile(1, 3), -inf},
		{"t quantile, NaN", TUpperQuantile(2, 3), nan},
	} {
		if c.got != c.want && !(math.IsNaN(c.got) && math.IsNaN(c.want)) {
			t.Errorf("%s: %g, want %g", c.name, c.got, c.want)
		}
	}
}

// A lower tail can be matched although 1 − p is all that float64 knows of the upper one, and the reverse.
func TestQuantilesAtTheEnds(t *testing.T) {
	for _, df := range []float64{0.3, 1, 2, 7.5, 100, 1e6} {
		for _, p := range []float64{1e-300, 1e-100, 1e-17, 1e-3} {
			// Rounding x moves p by |d ln p/d ln x| roundings, up to √(df·|ln p|).
			allowed := stretch + 1e-15*math.Sqrt(df*-math.Log(p))
			if x := ChiSquareUpperQuantile(p, df); relative(ChiSquareUpperTail(x, df), p) > allowed {
				t.Errorf("χ² upper %g, df %g: x = %g has tail %g", p, df, x, ChiSquareUpperTail(x, df))
			}
			if x := ChiSquareLowerQuantile(p, df); x > 1e-300 && relative(ChiSquareLowerTail(x, df), p) > allowed {
				t.Errorf("χ² lower %g, df %g: x = %g has tail %g", p, df, x, ChiSquareLowerTail(x, df))
			}
			if x := TUpperQuantile(p, df); x < 1e308 && relative(TTwoSided(x, df), 2*p) > allowed {
				t.Errorf("t %g, df %g: t = %g has tails %g", p, df, x, TTwoSided(x, df))
			}
		}
	}
}

// Beyond the smallest normal number a tail fades into subnormal numbers and 0, and never turns back.
func TestTailsFadeGracefully(t *testing.T) {
	last := 1.0
	for f := 90.0; f < 120; f += 0.01 {
		p := FUpperTail(f, 15, 1e7)
		if p > last || p < 0 {
			t.Fatalf("tail %g after %g at %g", p, last, f)
		}
		last = p
	}
	if last != 0 {
		t.Errorf("tail %g far out", last)
	}
}

// FuzzFTails: any numbers whatever give NaN exactly where the arguments are invalid, and a probability or a quantile elsewhere.
func FuzzFTails(f *testing.F) {
	for _, seed := range [][3]float64{
		{1, 3, 5},
		{0, 1, 1},
		{inf, 2, 2},
		{1, inf, 4},
		{1, 4, inf},
		{1, inf, inf},
		{nan, 1, 1},
		{1, -1, 1},
		{5e-324, 5e-324, 5e-324},
		{math.MaxFloat64, math.MaxFloat64, math.MaxFloat64},
		{math.MaxFloat64, 0.3, 0.3},
		{5e-324, 1e-3, 1e8},
		{1, 1e17, 1e-17},
		{0.999, 1e200, 3},
		{0.5, 1e8, 1e8},
		{0x1p401, 0x1p140, 0.1},
		{1e-200, 0.1, 0x1p140},
		{2, 40, 41},
		{0.3, 1e-3, 4},
	} {
		f.Add(seed[0], seed[1], seed[2])
	}
	f.Fuzz(func(t *testing.T, f, df1, df2 float64) {
		valid := df1 > 0 && df2 > 0
		probability := func(name string, p float64, defined bool) {
			if math.IsNaN(p) == defined || defined && !(p >= 0 && p <= 1) {
				t.Errorf("%s(%g, %g, %g) = %g", name, f, df1, df2, p)
			}
		}
		probability("FUpperTail", FUpperTail(f, df1, df2), valid && !math.IsNaN(f))
		probability("FLowerTail", FLowerTail(f, df1, df2), valid && !math.IsNaN(f))
		probability("ChiSquareUpperTail", ChiSquareUpperTail(f, df1), df1 > 0 && !math.IsNaN(f))
		probability("ChiSquareLowerTail", ChiSquareLowerTail(f, df1), df1 > 0 && !math.IsNaN(f))
		probability("TTwoSided", TTwoSided(f, df1), df1 > 0 && !math.IsNaN(f))
		_, p := math.Modf(math.Abs(f))
		if math.IsNaN(p) || !valid {
			return
		}
		for name, q := range map[string]float64{
			"FUpperQuantile":         FUpperQuantile(p, df1, df2),
			"ChiSquareUpperQuantile": ChiSquareUpperQuantile(p, df1),
			"ChiSquareLowerQuantile": ChiSquareLowerQuantile(p, df1),
			"TUpperQuantile":         math.Abs(TUpperQuantile(p, df1)),
		} {
			if !(q >= 0) {
				t.Errorf("%s(%g, %g, %g) = %g", name, p, df1, df2, q)
			}
		}
	})
}
