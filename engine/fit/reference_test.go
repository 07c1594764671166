package fit

import (
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"guardrow/engine"
	"guardrow/engine/data"
)

// randomDesign is a design of one to five factors of one to four levels, each nested in some of the others, with at most
// the given number of observations.
func randomDesign(rng *rand.Rand, observations int) *engine.Design {
	for {
		k := 1 + rng.IntN(5)
		levels, within := make([]int, k), make([][]int, k)
		replicates := 1 + rng.IntN(4)
		n := replicates
		rank := rng.Perm(k) // a factor may be declared before those it is nested in
		for i := range k {
			levels[i] = 1 + rng.IntN(4)
			n *= levels[i]
			for j := range k {
				if rank[j] < rank[i] && rng.IntN(3) == 0 {
					within[i] = append(within[i], j)
				}
			}
		}
		if n <= observations {
			return nested(levels, within, replicates)
		}
	}
}

// code returns the level of factor a in row i.
func code(g *data.Grid, a, i int) int {
	switch axis := g.Axes[a]; {
	case axis.U8 != nil:
		return int(axis.U8[i])
	case axis.U16 != nil:
		return int(axis.U16[i])
	default:
		return int(axis.U32[i])
	}
}

// group returns which combination of the levels of the factors in t row i has.
func group(g *data.Grid, t engine.Set, i int) int {
	at := 0
	for a, f := range g.Design.Factors() {
		if t.Has(a) {
			at = at*int(f.Levels) + code(g, a, i)
		}
	}
	return at
}

// projectedSS returns, by position in the design's terms, the dimension of each term's space and the length squared of y's
// projection onto it, by modified Gram–Schmidt (applied twice) on indicator columns: the space of a term is spanned by the
// indicators of the combinations of its factors, less the spaces of the terms it contains and of the mean.
func projectedSS(g *data.Grid, y []float64) (dims []int, ss []float64) {
	n := len(y)
	terms := g.Design.Terms()
	constant := make([]float64, n)
	for i := range constant {
		constant[i] = 1 / math.Sqrt(float64(n))
	}
	bases := map[engine.Set][][]float64{0: {constant}}
	bySize := slices.Clone(terms) // a term after those it contains
	slices.SortStableFunc(bySize, func(a, b engine.Set) int { return a.Len() - b.Len() })
	for _, t := range bySize {
		columns := map[int][]float64{}
		var order []int
		for i := range y {
			at := i
			if t != g.Design.Residual() {
				at = group(g, t, i)
			}
			if columns[at] == nil {
				columns[at] = make([]float64, n)
				order = append(order, at)
			}
			columns[at][i] = 1
		}
		var basis [][]float64
		for _, at := range order {
			v := columns[at]
			before := math.Sqrt(dot(v, v))
			for range 2 {
				sweep(v, bases[0])
				for _, s := range bySize {
					if t.Holds(s) {
						sweep(v, bases[s])
					}
				}
				sweep(v, basis)
			}
			if length := math.Sqrt(dot(v, v)); length > 1e-7*before {
				for i := range v {
					v[i] /= length
				}
				basis = append(basis, v)
			}
		}
		bases[t] = basis
	}
	for _, t := range terms {
		part := 0.0
		for _, q := range bases[t] {
			part += dot(q, y) * dot(q, y)
		}
		dims, ss = append(dims, len(bases[t])), append(ss, part)
	}
	return dims, ss
}

func dot(a, b []float64) float64 {
	s := 0.0
	for i, v := range a {
		s += v * b[i]
	}
	return s
}

// sweep takes from v its projections onto the orthonormal vectors of basis.
func sweep(v []float64, basis [][]float64) {
	for _, q := range basis {
		c := dot(q, v)
		for i, u := range q {
			v[i] -= c * u
		}
	}
}

// exactSS returns, by position in the design's terms, the sum of squares of each term as a rational:
//
//	Σ over cells of t of (sum of y)² / (readings behind it)  =  mean's + Σ over terms s ⊆ t of SS(s)
//
// solved for SS(t) from the smallest terms up; there is nothing to lose in exact arithmetic.
func exactSS(g *data.Grid, y []*big.Rat) []*big.Rat {
	uncorrected := func(t engine.Set) *big.Rat {
		sums := map[int]*big.Rat{}
		for i, v := range y {
			at := i
			if t != g.Design.Residual() {
				at = group(g, t, i)
			}
			if sums[at] == nil {
				sums[at] = new(big.Rat)
			}
			sums[at].Add(sums[at], v)
		}
		total := new(big.Rat)
		for _, s := range sums {
			total.Add(total, new(big.Rat).Mul(s, s))
		}
		behind := new(big.Rat).SetFrac64(int64(len(sums)), int64(len(y)))
		return total.Mul(total, behind)
	}
	terms := g.Design.Terms()
	mean := uncorrected(0)
	ss := make([]*big.Rat, len(terms))
	for size := 1; size <= len(g.Design.Factors())+1; size++ {
		for j, t := range terms {
			if t.Len() != size {
				continue
			}
			ss[j] = uncorrected(t)
			ss[j].Sub(ss[j], mean)
			for i, s := range terms {
				if s != t && t.Holds(s) {
					ss[j].Sub(ss[j], ss[i])
				}
			}
		}
	}
	return ss
}

// rationals returns y as rationals.
func rationals(y []float64) []*big.Rat {
	r := make([]*big.Rat, len(y))
	for i, v := range y {
		r[i] = new(big.Rat).SetFloat64(v)
	}
	return r
}

// sumsOf decomposes y laid onto the grid g.
func sumsOf(t *testing.T, g *data.Grid, y []float64) *Sums {
	t.Helper()
	g.Responses = []data.Response{{Offsets: y}}
	s, err := NewKernel(g).Sums(t.Context(), 0)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// TestAgainstProjection compares sums of squares and df with an explicit projection that knows nothing of axes, folds or
// closures. Tolerance: Gram–Schmidt on up to 60 columns loses a few dozen units in the last place of the total.
func TestAgainstProjection(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 11))
	for round := range 400 {
		d := randomDesign(rng, 60)
		g := emptyGrid(d)
		if round%2 == 0 {
			shuffle(g, rng)
		}
		y := make([]float64, g.Rows)
		for i := range y {
			y[i] = rng.NormFloat64()
		}
		s := sumsOf(t, g, y)
		dims, ss := projectedSS(g, y)
		all := 0.0
		for j, term := range d.Terms() {
			if int64(dims[j]) != d.DF(term) {
				t.Fatalf("round %d: %v has %d dimensions but %d df", round, term, dims[j], d.DF(term))
			}
			if math.Abs(s.Term(term)-ss[j]) > 1e-12*s.Total {
				t.Errorf("round %d: SS of %v is %v, by projection %v", round, term, s.Term(term), ss[j])
			}
			if dims[j] == 0 && s.Term(term) != 0 {
				t.Errorf("round %d: SS of %v is %v on 0 df", round, term, s.Term(term))
			}
			all += ss[j]
		}
		if math.Abs(s.Total-all) > 1e-12*all {
			t.Errorf("round %d: total %v, by projection %v", round, s.Total, all)
		}
	}
}
