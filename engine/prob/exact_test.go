package prob

import (
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"
)

// binomialTail returns P(F > f) for even degrees of freedom 2a and 2b as the finite sum
//
//	Σ_{j<a} C(a+b−1, j)·x^j·y^(a+b−1−j)
//
// in rational steps of 400 bits: an elementary identity of the incomplete beta function (repeated integration by parts).
func binomialTail(f float64, a, b int64) float64 {
	num := func(v float64) *big.Float { return new(big.Float).SetPrec(400).SetFloat64(v) }
	af := num(0).Mul(num(float64(a)), num(f))
	sum := num(0).Add(af, num(float64(b)))
	y := num(0).Quo(num(float64(b)), sum)
	ratio := num(0).Quo(af, num(float64(b))) // x/y
	term := num(1)
	for range a + b - 1 {
		term.Mul(term, y)
	}
	total := num(0)
	for j := range a {
		total.Add(total, term)
		term.Mul(term, ratio)
		term.Mul(term, num(float64(a+b-1-j)))
		term.Quo(term, num(float64(j+1)))
	}
	v, _ := total.Float64()
	return v
}

func TestEvenDegreesOfFreedomAreFiniteSums(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b := rapid.Int64Range(1, 200).Draw(t, "a"), rapid.Int64Range(1, 200).Draw(t, "b")
		f := math.Exp(rapid.Float64Range(-3, 12).Draw(t, "ln f"))
		want := binomialTail(f, a, b)
		if want < leastTail {
			return
		}
		if e := relative(FUpperTail(f, 2*float64(a), 2*float64(b)), want); e > stretch {
			t.Fatalf("relative error %.3g of %g", e, want)
		}
	})
}

// Closed forms: with 2 numerator degrees of freedom the tail is (1 + 2f/n)^(-n/2), with 2 in the denominator 1 − (1 + 2/(m f))^(-m/2),
// with 1 and 1 (2/π)·atan(1/√f), a Cauchy variate squared; χ² with 2 is exponential, with 1 the square of a normal variate.
func TestClosedForms(t *testing.T) {
	// The comparison itself costs up to |ln p| roundings.
	check := func(name string, got, want float64) {
		t.Helper()
		if allowed := 4e-16 * (4 + math.Abs(math.Log(want))); relative(got, want) > allowed {
			t.Errorf("%s: %g, want %g", name, got, want)
		}
	}
	for _, f := range []float64{1e-9, 0.01, 0.5, 1, 1.5, 3, 20, 400, 1e9} {
		check("1, 1", FUpperTail(f, 1, 1), 2/math.Pi*math.Atan(1/math.Sqrt(f)))
		for _, n := range []float64{0.1, 1, 2.5, 30, 4e3, 1e5} {
			if want := math.Exp(-n / 2 * math.Log1p(2*f/n)); want > leastTail {
				check("2, n", FUpperTail(f, 2, n), want)
			}
			check("m, 2", FUpperTail(f, n, 2), -math.Expm1(-n/2*math.Log1p(2/(n*f))))
		}
		if want := math.Exp(-f / 2); want > leastTail {
			check("χ², 2", ChiSquareUpperTail(f, 2), want)
		}
		if want := math.Erfc(math.Sqrt(f / 2)); want > leastTail {
			check("χ², 1", ChiSquareUpperTail(f, 1), want)
			check("t, ∞", TTwoSided(math.Sqrt(f), math.Inf(1)), want)
		}
		check("χ², 2 lower", ChiSquareLowerTail(f, 2), -math.Expm1(-f/2))
		check("t, 1", TTwoSided(f, 1), 2/math.Pi*math.Atan(1/f))
	}
}

// exactLog returns ln v to 200 bits: v = 2^k·m, ln m = 2·artanh((m − 1)/(m + 1)), as is ln 2.
func exactLog(v *big.Float) *big.Float {
	m := new(big.Float).SetPrec(200)
	k := v.MantExp(m)
	if half := new(big.Float).SetFloat64(0.75); m.Cmp(half) < 0 {
		m.Mul(m, big.NewFloat(2))
		k--
	}
	two := new(big.Float).SetPrec(200).SetInt64(2)
	out := artanhSeries(m)
	return out.Add(out, new(big.Float).SetPrec(200).Mul(artanhSeries(two), new(big.Float).SetInt64(int64(k))))
}

// artanhSeries returns 2·artanh((m − 1)/(m + 1)).
func artanhSeries(m *big.Float) *big.Float {
	one := new(big.Float).SetPrec(200).SetInt64(1)
	z := new(big.Float).Quo(new(big.Float).Sub(m, one), new(big.Float).Add(m, one))
	square := new(big.Float).Mul(z, z)
	sum, power := new(big.Float).SetPrec(200), new(big.Float).Set(z)
	for n := int64(1); n < 140; n += 2 {
		sum.Add(sum, new(big.Float).Quo(power, new(big.Float).SetPrec(200).SetInt64(n)))
		power.Mul(power, square)
	}
	return sum.Mul(sum, two200)
}

var two200 = new(big.Float).SetPrec(200).SetInt64(2)

func TestLogPairKeepsItsBits(t *testing.T) {
	check := func(t interface{ Fatalf(string, ...any) }, v, rest float64) {
		arg := new(big.Float).SetPrec(200).SetFloat64(v)
		arg.Add(arg, new(big.Float).SetPrec(200).Mul(arg, new(big.Float).SetFloat64(rest)))
		got := logPair(v, rest)
		want := exactLog(arg)
		diff := new(big.Float).SetPrec(200).Sub(want, new(big.Float).SetFloat64(got.high))
		diff.Sub(diff, new(big.Float).SetFloat64(got.low))
		d, _ := diff.Float64()
		w, _ := want.Float64()
		// The cube of r is rounded, |r| < 1/100 in general and r ≈ ln v near 1.
		r := math.Min(math.Abs(w), 0.01)
		if math.Abs(d) > 0x1p-52*r*r*r+0x1p-96*math.Abs(w)+0x1p-51*math.Abs(rest) {
			t.Fatalf("ln(%g): error %g of %g", v, d, w)
		}
	}
	for i := range logTable {
		// Both ends and the middle of every interval of the table.
		bits := uint64(0x3fe6000000000000) + uint64(i)<<45
		for _, offset := range []uint64{0, 1, 1 << 44, 1<<45 - 1} {
			check(t, math.Float64frombits(bits+offset), 0)
		}
	}
	rapid.Check(t, func(t *rapid.T) {
		v := math.Exp(rapid.Float64Range(-700, 700).Draw(t, "ln v"))
		check(t, v, math.Ldexp(float64(rapid.IntRange(-8, 8).Draw(t, "rest")), -56))
		check(t, 1+math.Ldexp(rapid.Float64Range(-1, 1).Draw(t, "near"), -rapid.IntRange(2, 40).Draw(t, "order")), 0)
	})
}
