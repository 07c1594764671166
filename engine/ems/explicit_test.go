package ems_test

import (
	"math/big"
	"math/rand/v2"
	"testing"
)

// square is an n × n matrix of whole numbers over a common divisor.
type square struct {
	entry [][]int64
	over  int64
}

func newSquare(n int, over int64) square {
	m := square{make([][]int64, n), over}
	for i := range m.entry {
		m.entry[i] = make([]int64, n)
	}
	return m
}

// times returns a·b.
func (a square) times(b square) square {
	n := len(a.entry)
	c := newSquare(n, a.over*b.over)
	for i := range n {
		for k := range n {
			if x := a.entry[i][k]; x != 0 {
				for j := range n {
					c.entry[i][j] += x * b.entry[k][j]
				}
			}
		}
	}
	return c
}

func (a square) trace() *big.Rat {
	sum := int64(0)
	for i := range a.entry {
		sum += a.entry[i][i]
	}
	return big.NewRat(sum, a.over)
}

func (a square) equal(b square) bool {
	for i := range a.entry {
		for j := range a.entry {
			if a.entry[i][j]*b.over != b.entry[i][j]*a.over {
				return false
			}
		}
	}
	return true
}

// projection writes out the projection onto term k's line, N × N.
func (r *reference) projection(k int) square {
	n := r.table.n
	m := newSquare(n, int64(n))
	for u, c := range r.terms[k].project {
		part := r.table.of(r.columns(u))
		for i := range n {
			for j := range n {
				if part.cell[i] == part.cell[j] {
					m.entry[i][j] += c * int64(part.cells)
				}
			}
		}
	}
	return m
}

// variance writes out the covariance of random term k's effects over the rows, over its component: entry by entry the
// product, over the factors that the term crosses, of what two rows that share everything else have in common.
func (r *reference) variance(k int) square {
	n, term := r.table.n, r.terms[k]
	over := int64(1)
	for _, i := range term.crossed {
		_, a := r.constrained(i)
		over *= a
	}
	v := newSquare(n, over)
	rest := term.set
	for _, i := range term.crossed {
		rest &^= 1 << i
	}
	bracketed := r.table.of(rest)
	for row := range n {
		for column := range n {
			if bracketed.cell[row] == bracketed.cell[column] {
				v.entry[row][column] = 1
			}
			for _, i := range term.crossed {
				centred, a := r.constrained(i)
				label := r.table.of(r.single(k, i)).cell
				x := int64(0)
				if label[row] == label[column] {
					x = a
				}
				if centred {
					x--
				}
				v.entry[row][column] *= x
			}
		}
	}
	return v
}

// single returns the columns that a crossed factor of term k and what the term is nested in make up.
func (r *reference) single(k, i int) uint32 {
	set := r.terms[k].set
	for _, other := range r.terms[k].crossed {
		if other != i {
			set &^= 1 << other
		}
	}
	return set
}

// constrained reports whether effects sum to zero over a levels of factor i.
func (r *reference) constrained(i int) (centred bool, a int64) {
	f := r.plan.factors[i]
	switch {
	case !r.plan.restricted, f.random && f.population == 0:
		return false, 1
	case f.random:
		return true, f.population
	}
	return true, f.levels
}

// TestReferenceIsTheExplicitMatrices holds the reference's traces, which it counts from groups of rows, to N × N matrices
// written out entry by entry: the projections are symmetric, idempotent, orthogonal to each other and add to I − J/N, and
// tr(P V)/tr(P) is the coefficient.
func TestReferenceIsTheExplicitMatrices(t *testing.T) {
	random := rand.New(rand.NewPCG(*seed, 2))
	cover := make(coverage)
	for designs := 0; designs < effort(t, 60); {
		p := randomPlan(random, invention{factors: 4, rows: 250})
		if n := p.rows(); n < 2 || n > 48 {
			continue
		}
		designs++
		r := newReference(p)
		ems := r.expectations()
		n := r.table.n
		sum := newSquare(n, int64(n))
		projections := make([]square, len(r.terms))
		for k := range r.terms {
			projections[k] = r.projection(k)
			for i := range n {
				for j := range n {
					sum.entry[i][j] += projections[k].entry[i][j]
					if projections[k].entry[i][j] != projections[k].entry[j][i] {
						t.Fatalf("%v: the projection of term %d is not symmetric", p, k)
					}
				}
			}
		}
		centring := newSquare(n, int64(n))
		for i := range n {
			for j := range n {
				centring.entry[i][j] = -1
			}
			centring.entry[i][i] += int64(n)
		}
		if !sum.equal(centring) {
			t.Fatalf("%v: the projections do not add to I − J/N", p)
		}
		for k, term := range r.terms {
			if got := projections[k].trace(); got.Cmp(big.NewRat(r.df[k], 1)) != 0 {
				t.Fatalf("%v: the projection of term %d has trace %v, %d df", p, k, got, r.df[k])
			}
			for l := range k + 1 {
				product, want := projections[k].times(projections[l]), newSquare(n, 1)
				if k == l {
					want = projections[k]
				}
				if !product.equal(want) {
					t.Fatalf("%v: the projections of terms %d and %d are not orthogonal", p, k, l)
				}
			}
			if !term.random {
				continue
			}
			v := r.variance(k)
			for s := range r.terms {
				if r.df[s] == 0 {
					continue
				}
				want := projections[s].times(v).trace()
				want.Quo(want, big.NewRat(r.df[s], 1))
				if want.Cmp(ems[s][k]) != 0 {
					t.Fatalf("%v: the coefficient of term %d in line %d is %v, from the matrices %v", p, k, s, ems[s][k], want)
				}
				cover.count("coefficients", 1)
				cover.when(!want.IsInt(), "fractions")
				cover.when(p.restricted && want.Sign() == 0, "zeros")
			}
		}
	}
	cover.report(t, "coefficients", "fractions", "zeros")
}

// TestCoefficientsAreLinearInLevels supports the continuation to lines without degrees of freedom: what the rows give at
// two, three, four and five levels of a factor, or replicates, lies on a straight line.
func TestCoefficientsAreLinearInLevels(t *testing.T) {
	random := rand.New(rand.NewPCG(*seed, 3))
	checked := 0
	for range effort(t, 150) {
		p := randomPlan(random, invention{factors: 3, rows: 150})
		for i := range p.factors {
			p.factors[i].levels = max(2, p.factors[i].levels)
			p.factors[i].population = max(p.factors[i].population, min(p.factors[i].population, 1)*p.factors[i].levels)
		}
		vary := random.IntN(len(p.factors) + 1)
		var ems [][][]*big.Rat
		for levels := int64(2); levels <= 5; levels++ {
			q := p.clone()
			if vary == len(p.factors) {
				q.replicates = levels
			} else {
				q.factors[vary].levels = levels
			}
			ems = append(ems, newReference(q).expectations())
		}
		for s := range ems[0] {
			for k := range ems[0][s] {
				step := new(big.Rat).Sub(ems[1][s][k], ems[0][s][k])
				for i := 2; i < len(ems); i++ {
					if next := new(big.Rat).Sub(ems[i][s][k], ems[i-1][s][k]); next.Cmp(step) != 0 {
						t.Fatalf("%v: the coefficient of term %d in line %d is not linear in the levels of factor %d", p, k, s, vary)
					}
				}
				if step.Sign() != 0 {
					checked++
				}
			}
		}
	}
	if checked == 0 {
		t.Error("no coefficient depended on a level count")
	}
}
