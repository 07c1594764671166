package fit

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"runtime"
	"testing"

	"guardrow/engine"
	"guardrow/engine/data"
)

// agree reports whether two decompositions agree: each sum of squares to 1e-13 of the total, as goal 17 has it.
func agree(d *engine.Design, a, b *Sums, scale float64) bool {
	tolerance := 1e-13 * b.Total
	for _, t := range d.Terms() {
		if math.Abs(a.Term(t)*scale-b.Term(t)) > tolerance {
			return false
		}
	}
	return math.Abs(a.Total*scale-b.Total) <= tolerance
}

func noise(rng *rand.Rand, n int) []float64 {
	y := make([]float64, n)
	for i := range y {
		y[i] = rng.NormFloat64()
	}
	return y
}

// TestProperties holds what must be true of every decomposition, on random designs.
func TestProperties(t *testing.T) {
	rng := rand.New(rand.NewPCG(21, 4))
	for round := range 300 {
		d := randomDesign(rng, 400)
		g := emptyGrid(d)
		y := noise(rng, g.Rows)
		s := sumsOf(t, g, y)

		var all float64
		for _, term := range d.Terms() {
			if s.Term(term) < 0 {
				t.Errorf("round %d: SS of %v is %v", round, term, s.Term(term))
			}
			if d.DF(term) == 0 && s.Term(term) != 0 {
				t.Errorf("round %d: SS of %v is %v on 0 df", round, term, s.Term(term))
			}
			all += s.Term(term)
		}
		if math.Abs(all-s.Total) > 1e-14*s.Total {
			t.Errorf("round %d: the terms add up to %v, not %v", round, all, s.Total)
		}
		if s.Exponent != 0 {
			t.Errorf("round %d: exponent %d", round, s.Exponent)
		}
		if s.Term(d.Residual()) != s.Within {
			t.Errorf("round %d: the residual is not what is within cells", round)
		}

		if again := sumsOf(t, g, y); !same(d, s, again) {
			t.Errorf("round %d: the same readings gave other digits", round)
		}
		if scaled := sumsOf(t, g, each(g, func(i int) float64 { return -3.7 * y[i] })); !agree(d, s, scaled, 3.7*3.7) {
			t.Errorf("round %d: SS do not scale with the square", round)
		}
		// A shift of 2^10 rounds each reading by 2^-43 at most, so a SS by less than 2^-40 of the total.
		shifted := sumsOf(t, g, each(g, func(i int) float64 { return 1024 + math.Round(y[i]*0x1p30)/0x1p30 }))
		rounded := sumsOf(t, g, each(g, func(i int) float64 { return math.Round(y[i]*0x1p30) / 0x1p30 }))
		if !agree(d, shifted, rounded, 1) {
			t.Errorf("round %d: SS change when the readings are shifted", round)
		}
		if math.Abs(shifted.Mean-rounded.Mean-1024) > 1e-12 {
			t.Errorf("round %d: the mean moved from %v to %v", round, rounded.Mean, shifted.Mean)
		}

		g.Responses = []data.Response{{Offsets: y}}
		shuffle(g, rng)
		if shuffled := sumsOf(t, g, g.Responses[0].Offsets); !agree(d, shuffled, s, 1) {
			t.Errorf("round %d: SS change when the rows are shuffled", round)
		}
		relabel(g, rng)
		if relabelled := sumsOf(t, g, g.Responses[0].Offsets); !agree(d, relabelled, s, 1) {
			t.Errorf("round %d: SS change when the levels are relabelled", round)
		}
	}
}

// same reports whether two decompositions agree to the last bit.
func same(d *engine.Design, a, b *Sums) bool {
	for _, t := range d.Terms() {
		if a.Term(t) != b.Term(t) {
			return false
		}
	}
	return a.Total == b.Total && a.Mean == b.Mean && a.Exponent == b.Exponent
}

// relabel gives the levels of every factor other numbers; those of a nested factor differently within each of its parents'
// combinations.
func relabel(g *data.Grid, rng *rand.Rand) {
	names := make([]data.Codes, len(g.Axes))
	for a, f := range g.Design.Factors() {
		renamed := map[int][]int{}
		codes := make([]uint32, g.Rows)
		for i := range codes {
			parents := group(g, f.Above, i)
			if renamed[parents] == nil {
				renamed[parents] = rng.Perm(int(f.Levels))
			}
			codes[i] = uint32(renamed[parents][code(g, a, i)])
		}
		names[a] = narrow(codes, int(f.Levels))
	}
	g.Axes = names
}

// TestEqualReplicates: what does not vary has a sum of squares of 0 exactly, however many replicates and whatever their
// value.
func TestEqualReplicates(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	for _, replicates := range []int{1, 2, 3, 7, 10, 25, 63, 64, 65, 130, 1000, 1500, 3000} {
		for range 20 {
			g := emptyGrid(crossed([]int{3, 2}, replicates))
			value := noise(rng, 6)
			if rng.IntN(2) == 0 {
				for i := range value {
					value[i] = 1e6 + value[i]/3
				}
			}
			g.Responses = []data.Response{{Offsets: each(g, func(i int) float64 { return value[group(g, 3, i)] })}}
			for range 2 {
				s := sumsOf(t, g, g.Responses[0].Offsets)
				if s.Within != 0 {
					t.Errorf("%d replicates: %v within cells", replicates, s.Within)
				}
				shuffle(g, rng)
			}
			constant := sumsOf(t, g, each(g, func(int) float64 { return value[0] }))
			if constant.Total != 0 || constant.Within != 0 || constant.Exponent != 0 {
				t.Errorf("%d replicates, all readings equal: total %v, within %v", replicates, constant.Total, constant.Within)
			}
			if math.Abs(constant.Mean-value[0]) > 1e-15*math.Abs(value[0]) {
				t.Errorf("the mean of equal readings %v is %v", value[0], constant.Mean)
			}
		}
	}
}

// TestExtremeSizes: readings anywhere in a double's range give the sums of squares of ordinary ones, times a power of four.
func TestExtremeSizes(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	d := crossed([]int{3, 4}, 3)
	for _, shuffled := range []bool{false, true} {
		g := emptyGrid(d)
		// 20 bits each, so that subnormal readings are exact too.
		g.Responses = []data.Response{{Offsets: each(g, func(int) float64 { return math.Round(rng.NormFloat64()*0x1p17) / 0x1p17 })}}
		if shuffled {
			shuffle(g, rng)
		}
		y := g.Responses[0].Offsets
		plain := sumsOf(t, g, y)
		for _, power := range []int{-1040, -1000, -500, -201, 0, 190, 201, 500, 511, 900, 1020} {
			s := sumsOf(t, g, each(g, func(i int) float64 { return math.Ldexp(y[i], power) }))
			for _, term := range d.Terms() {
				ratio := s.Term(term) / s.Total
				if want := plain.Term(term) / plain.Total; math.Abs(ratio-want) > 1e-15 {
					t.Errorf("2^%d: %v has %v of the total, not %v", power, term, ratio, want)
				}
			}
			if want := math.Ldexp(plain.Mean, power); math.Abs(s.Mean-want) > 1e-15*math.Abs(want) {
				t.Errorf("2^%d: mean %v, not %v", power, s.Mean, want)
			}
			if got, want := s.InReadings(s.Total), math.Ldexp(plain.Total, 2*power); math.Abs(got-want) > 1e-14*want {
				t.Errorf("2^%d: total %v, not %v", power, got, want)
			}
			if s.Total < 0x1p-400 || s.Total > 0x1p+400 {
				t.Errorf("2^%d: total %v in units of 4^%d", power, s.Total, s.Exponent)
			}
		}
		for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
			z := each(g, func(i int) float64 { return y[i] })
			z[17] = bad
			g.Responses = []data.Response{{Offsets: z}}
			if _, err := NewKernel(g).Sums(t.Context(), 0); !errors.Is(err, ErrNotFinite) {
				t.Errorf("a reading of %v gave %v", bad, err)
			}
		}
	}
}

// TestSpreadOfReadings: the largest distance that readings can have does not overflow on the way.
func TestSpreadOfReadings(t *testing.T) {
	g := emptyGrid(crossed([]int{2}, 2))
	s := sumsOf(t, g, []float64{-math.MaxFloat64, -math.MaxFloat64, math.MaxFloat64, math.MaxFloat64})
	if s.Term(1) != s.Total || s.Within != 0 || s.Mean != 0 || !math.IsInf(s.InReadings(s.Total), 1) {
		t.Errorf("total %v, between %v, within %v, mean %v", s.Total, s.Term(1), s.Within, s.Mean)
	}
}

// TestContext: a context that has ended stops the work with its own error.
func TestContext(t *testing.T) {
	g := emptyGrid(crossed([]int{2, 3}, 2))
	g.Responses = []data.Response{{Offsets: make([]float64, g.Rows)}}
	cause := errors.New("gone away")
	ctx, cancel := context.WithCancelCause(t.Context())
	cancel(cause)
	if _, err := NewKernel(g).Sums(ctx, 0); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v", err)
	}
}

// TestManyResponses: a kernel that goes from response to response gives each what one of its own would.
func TestManyResponses(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	for _, shuffled := range []bool{false, true} {
		for _, replicates := range []int{1, 2, 5, 100} {
			d := nested([]int{3, 2, 4}, [][]int{nil, {0}, nil}, replicates)
			g := emptyGrid(d)
			for range 4 {
				g.Responses = append(g.Responses, data.Response{Shift: 7, Offsets: noise(rng, g.Rows)})
			}
			if shuffled {
				shuffle(g, rng)
			}
			k := NewKernel(g)
			for i := range g.Responses {
				s, err := k.Sums(t.Context(), i)
				if err != nil {
					t.Fatal(err)
				}
				alone := *g
				alone.Responses = g.Responses[i : i+1]
				own, err := NewKernel(&alone).Sums(t.Context(), 0)
				if err != nil {
					t.Fatal(err)
				}
				if !same(d, s, own) {
					t.Errorf("%d replicates, response %d: not as alone", replicates, i)
				}
			}
		}
	}
}

// TestNoFactorVaries: factors of one level leave only the replicates.
func TestNoFactorVaries(t *testing.T) {
	g := emptyGrid(crossed([]int{1, 1}, 5))
	s := sumsOf(t, g, []float64{1, 2, 3, 4, 5})
	if s.Within != 10 || s.Total != 10 || s.Mean != 3 || s.Term(1) != 0 || s.Term(3) != 0 {
		t.Errorf("%+v", s)
	}
	if s.Term(1<<9) != 0 {
		t.Errorf("a set of factors that the design has not got has SS %v", s.Term(1<<9))
	}
}

// TestMismatchedGrid: a grid that is not its design's is a broken invariant.
func TestMismatchedGrid(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("no panic")
		}
	}()
	g := emptyGrid(crossed([]int{2, 3}, 2))
	g.Rows--
	NewKernel(g)
}

// TestMemory: the kernel's memory grows with the cells, not with the rows, and the number of its allocations with neither.
func TestMemory(t *testing.T) {
	const most = 40 // allocations
	for _, c := range []struct {
		levels       []int
		replicates   int
		bytesPerCell float64
	}{
		// One double per cell in cell order; two more in any order, and two again where long sums are carried over.
		{[]int{100, 50}, 40, 8},
		{[]int{100, 50}, 40, 24},
		{[]int{10, 50}, 400, 40},
	} {
		g := emptyGrid(crossed(c.levels, c.replicates))
		g.Responses = []data.Response{{Offsets: noise(rand.New(rand.NewPCG(1, 1)), g.Rows)}}
		if c.bytesPerCell > 8 {
			shuffle(g, rand.New(rand.NewPCG(1, 1)))
		}
		run := func() {
			if _, err := NewKernel(g).Sums(t.Context(), 0); err != nil {
				t.Fatal(err)
			}
		}
		if got := testing.AllocsPerRun(10, run); got > most {
			t.Errorf("%v: %v allocations", c.levels, got)
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		run()
		runtime.ReadMemStats(&after)
		cells := g.Rows / c.replicates
		// 16 kB for what depends on the factors alone.
		if got, limit := float64(after.TotalAlloc-before.TotalAlloc), 1.1*c.bytesPerCell*float64(cells)+16e3; got > limit {
			t.Errorf("%v: %v bytes, more than %v", c.levels, got, limit)
		}
	}
}
