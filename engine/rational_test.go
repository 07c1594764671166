package engine_test

import (
	"math"
	"math/big"
	"testing"

	"pgregory.net/rapid"

	"guardrow/engine"
)

// Every operation agrees with math/big, at the edges of int64 and far beyond.
func TestRationalAgainstBig(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		number := func(name string) (engine.Rational, *big.Rat) {
			num := rapid.OneOf(rapid.Int64Range(-20, 20), rapid.Int64(), rapid.SampledFrom([]int64{math.MinInt64, math.MaxInt64, math.MinInt64 + 1})).Draw(t, name)
			den := rapid.OneOf(rapid.Int64Range(1, 20), rapid.Int64Range(1, math.MaxInt64), rapid.Just(int64(math.MaxInt64))).Draw(t, name+" over")
			return engine.Fraction(num, den), big.NewRat(num, den)
		}
		q, x := number("q")
		for range 4 {
			r, y := number("r")
			switch rapid.IntRange(0, 3).Draw(t, "operation") {
			case 0:
				q, x = q.Add(r), new(big.Rat).Add(x, y)
			case 1:
				q, x = q.Sub(r), new(big.Rat).Sub(x, y)
			case 2:
				q, x = q.Mul(r), new(big.Rat).Mul(x, y)
			case 3:
				if y.Sign() != 0 {
					q, x = q.Quo(r), new(big.Rat).Quo(x, y)
				}
			}
			if q.Rat().Cmp(x) != 0 || q.String() != x.RatString() || q.Sign() != x.Sign() {
				t.Fatalf("got %s, want %s", q, x.RatString())
			}
			if f, _ := x.Float64(); q.Float64() != f {
				t.Fatalf("%s as a double: %v, want %v", q, q.Float64(), f)
			}
			if !q.Equal(q.Add(engine.Whole(0))) || q.Equal(q.Add(engine.Whole(1))) {
				t.Fatalf("%s is not equal to itself alone", q)
			}
		}
		if q.Neg().Rat().Cmp(new(big.Rat).Neg(x)) != 0 {
			t.Fatalf("−(%s) is %s", q, q.Neg())
		}
	})
}
