package ems_test

import (
	"fmt"
	"math/big"
	"math/rand/v2"
)

// expectations returns, for every line S and component T, the coefficient of T's component in E[MS_S].
//
// For lines with degrees of freedom it is taken from the rows: tr(P_S V_T)/df_S for a random T, with V_T the covariance
// of T's effects over the rows, and the quadratic form e'P_S e/df_S over κ² = Σ(effect²)/df_T for a fixed T, with
// invented effects e that sum to zero over each crossed factor.
//
// A line without degrees of freedom has no rows to take it from. Coefficients are functions of the level counts, linear
// in each (TestCoefficientsAreLinearInLevels): the value at one level continues those at two and three.
func (r *reference) expectations() [][]*big.Rat {
	e := &expecter{reference: r, known: make(map[string][][]*big.Rat)}
	ems := make([][]*big.Rat, len(r.terms))
	for s := range r.terms {
		ems[s] = e.line(s, r.plan)
	}
	return ems
}

type expecter struct {
	*reference
	known map[string][][]*big.Rat // by plan
}

// line returns the coefficients of line s in plan p, by continuation where s has no degrees of freedom.
func (e *expecter) line(s int, p *plan) []*big.Rat {
	for _, i := range e.terms[s].crossed {
		if p.factors[i].levels == 1 {
			return e.continued(s, p.withLevels(i, 2), p.withLevels(i, 3))
		}
	}
	if s == len(e.terms)-1 && p.replicates == 1 {
		two, three := p.clone(), p.clone()
		two.replicates, three.replicates = 2, 3
		return e.continued(s, two, three)
	}
	key := fmt.Sprint(p.replicates, p.factors)
	if _, done := e.known[key]; !done {
		e.known[key] = e.direct(p)
	}
	return e.known[key][s]
}

func (p *plan) withLevels(i int, levels int64) *plan {
	q := p.clone()
	q.factors[i].levels = levels
	return q
}

// continued returns 2·f(2) − f(3) = f(1).
func (e *expecter) continued(s int, two, three *plan) []*big.Rat {
	a, b := e.line(s, two), e.line(s, three)
	c := make([]*big.Rat, len(a))
	for t := range a {
		c[t] = new(big.Rat).Add(a[t], a[t])
		c[t].Sub(c[t], b[t])
	}
	return c
}

// direct returns the coefficients of all lines with degrees of freedom from the rows of plan p.
func (e *expecter) direct(p *plan) [][]*big.Rat {
	t := e.table
	if p != e.plan {
		t = newTable(p)
	}
	df := e.degrees(t)
	ems := make([][]*big.Rat, len(e.terms))
	for s := range ems {
		if df[s] > 0 {
			ems[s] = make([]*big.Rat, len(e.terms))
		}
	}
	for k := range e.terms {
		average, scale := e.quadratic(p, t, k, df[k])
		for s, term := range e.terms {
			if df[s] == 0 {
				continue
			}
			sum, part := new(big.Int), new(big.Int)
			for u, c := range term.project {
				if c != 0 {
					sum.Add(sum, part.Mul(big.NewInt(c), average[u]))
				}
			}
			ems[s][k] = new(big.Rat).SetFrac(sum, part.Mul(scale, big.NewInt(df[s])))
		}
	}
	return ems
}

// quadratic returns tr(average(U)·V), over a common divisor, for every term U and the grand mean, with V the covariance
// of the effects of a random term k over its component, and e·e'/κ² for a fixed one.
func (e *expecter) quadratic(p *plan, t *table, k int, df int64) (average []*big.Int, scale *big.Int) {
	if e.terms[k].random {
		return e.covariance(p, t, k)
	}
	average = make([]*big.Int, len(e.terms)+1)
	if df == 0 { // no effects but zero
		for u := range average {
			average[u] = new(big.Int)
		}
		return average, big.NewInt(1)
	}
	effect := e.effects(t, k)
	squares, cells := int64(0), t.of(e.terms[k].set)
	seen := make([]bool, cells.cells)
	for row, cell := range cells.cell {
		if !seen[cell] {
			seen[cell] = true
			squares += effect[row] * effect[row]
		}
	}
	for u := range average {
		part := t.of(e.columns(u))
		sums := make([]int64, part.cells)
		for row, cell := range part.cell {
			sums[cell] += effect[row]
		}
		total := int64(0)
		for _, x := range sums {
			total += x * x
		}
		// Each of the part.cells cells has n/part.cells rows. Over κ² = squares/df.
		average[u] = big.NewInt(total)
		average[u].Mul(average[u], big.NewInt(int64(part.cells)*df))
	}
	return average, new(big.Int).Mul(big.NewInt(int64(t.n)), big.NewInt(squares))
}

// covariance is quadratic for a random term. Its effects over the levels of a crossed factor are
//
//	independent:                                        I      unrestricted; or a random factor, infinite population
//	draws from A effects that sum to zero:              I − J/A  with A the population, its divisor A − 1
//	summing to zero over the a levels, variance 1 − 1/a: I − J/a  a fixed factor under the restricted constraint
//
// and independent between the cells of what the term is nested in (Cornfield and Tukey 1956). The entry of V for two rows
// is the product of these where they share all other labels of the term. So V is the sum, over sets K of the constrained
// factors, of Π(−1/A) for pairs of rows that share all labels but those of K.
func (e *expecter) covariance(p *plan, t *table, k int) (average []*big.Int, scale *big.Int) {
	term := e.terms[k]
	var constrained []int
	var size []int64
	if p.restricted {
		for _, i := range term.crossed {
			switch f := p.factors[i]; {
			case !f.random:
				constrained, size = append(constrained, i), append(size, f.levels)
			case f.population > 0:
				constrained, size = append(constrained, i), append(size, f.population)
			}
		}
	}
	all := int64(1)
	for _, a := range size {
		all *= a
	}
	average = make([]*big.Int, len(e.terms)+1)
	for u := range average {
		sum := int64(0)
		for chosen := range 1 << len(constrained) {
			share, sign, weight := term.set, int64(1), all
			for j, i := range constrained {
				if chosen>>j&1 == 1 {
					share &^= 1 << i
					sign, weight = -sign, weight/size[j]
				}
			}
			sum += sign * weight * t.of(e.columns(u)|share).pairs
		}
		average[u] = big.NewInt(sum)
		average[u].Mul(average[u], big.NewInt(int64(t.of(e.columns(u)).cells)))
	}
	return average, new(big.Int).Mul(big.NewInt(int64(t.n)), big.NewInt(all))
}

// effects invents effects of fixed term k, by row: whole numbers that sum to zero over every crossed factor, not all zero.
func (e *expecter) effects(t *table, k int) []int64 {
	random := rand.New(rand.NewPCG(uint64(t.n), uint64(k)))
	cells := t.of(e.terms[k].set)
	effect := make([]int64, t.n)
	for {
		value := make([]int64, cells.cells)
		for c := range value {
			value[c] = random.Int64N(7) - 3
		}
		for row, c := range cells.cell {
			effect[row] = value[c]
		}
		for _, i := range e.terms[k].crossed {
			others := t.of(e.terms[k].set &^ (1 << i))
			sums := make([]int64, others.cells)
			for row, c := range others.cell {
				sums[c] += effect[row]
			}
			behind := int64(t.n / others.cells)
			for row, c := range others.cell {
				effect[row] = behind*effect[row] - sums[c]
			}
			reduce(effect)
		}
		for _, x := range effect {
			if x != 0 {
				return effect
			}
		}
	}
}

// reduce divides by the greatest common divisor.
func reduce(x []int64) {
	g := int64(0)
	for _, v := range x {
		for v != 0 {
			g, v = v, g%v
		}
	}
	if g == 0 {
		return
	}
	for i := range x {
		x[i] /= g
	}
}
