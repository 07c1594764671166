// Package engine says what a declared design means: its factors, how they are nested, the terms of its model with their
// degrees of freedom, or a list of coded faults. A checked Design is immutable and safe to share.
package engine

import (
	"cmp"
	"math/bits"
	"slices"
)

// observation is the bit of the residual: the observation itself, a random factor nested in all others, with as many
// levels as there are replicates.
const observation Set = 1 << MaxFactors

// Design is a checked design.
//
// A term is a down-closed set of factors: with each factor it holds all that the factor is nested in (Bailey 2008, the
// ideals of the poset). The residual is the set of all factors and the observation. Terms are kept in the contract's
// order: by the number of crossed factors, then by their positions in the declaration, the residual last.
type Design struct {
	title        string
	factors      []Factor
	replicates   int64
	observations int64
	restricted   bool
	maxOrder     int // 0: no bound
	declared     map[Set]bool

	all, random, finite Set
	terms               []Set
	index               []int32 // by set of factors: position in terms, -1 where the set is no term
	negligible          []bool  // by position in terms
	negligibleCount     int
}

// Title returns the caller's title, possibly empty.
func (d *Design) Title() string { return d.title }

// Factors returns the factors in the order of declaration. The slice is not to be changed.
func (d *Design) Factors() []Factor { return d.factors }

// Replicates returns the number of observations per cell.
func (d *Design) Replicates() int64 { return d.replicates }

// Observations returns N, the product of all level counts and the replicates; below 2^53.
func (d *Design) Observations() int64 { return d.observations }

// Cells returns the number of cells, the product of all level counts.
func (d *Design) Cells() int64 { return d.observations / d.replicates }

// Restricted reports whether an interaction's effects sum to zero over its fixed factors.
func (d *Design) Restricted() bool { return d.restricted }

// MaxOrder returns the largest number of crossed factors of a term that is not negligible; 0 if there is no such bound.
func (d *Design) MaxOrder() int { return d.maxOrder }

// Residual returns the residual's set: all factors, and the observation.
func (d *Design) Residual() Set { return d.all | observation }

// All returns the set of all factors.
func (d *Design) All() Set { return d.all }

// Terms returns all terms in the contract's order, negligible ones and the residual included. The slice is not to be
// changed.
func (d *Design) Terms() []Set { return d.terms }

// Index returns the position of term s in Terms, or -1 where s is no term.
func (d *Design) Index(s Set) int {
	if s == d.Residual() {
		return len(d.terms) - 1
	}
	if int(s) >= len(d.index) {
		return -1
	}
	return int(d.index[s])
}

// Negligible reports whether term s was declared null, by name or by max_order.
func (d *Design) Negligible(s Set) bool { return d.negligible[d.Index(s)] }

// NegligibleCount returns how many terms are negligible.
func (d *Design) NegligibleCount() int { return d.negligibleCount }

// AboveOrder reports whether term s has more crossed factors than max_order allows.
func (d *Design) AboveOrder(s Set) bool {
	return d.maxOrder > 0 && s != d.Residual() && d.Order(s) > d.maxOrder
}

// Closure returns s with everything its members are nested in: the smallest term that holds s.
func (d *Design) Closure(s Set) Set {
	closed := s
	for rest := s & d.all; rest != 0; rest &= rest - 1 {
		closed |= d.factors[bits.TrailingZeros32(uint32(rest))].Above
	}
	return closed
}

// Crossed returns the crossed part of term s: its maximal elements. For the residual that is the observation.
func (d *Design) Crossed(s Set) Set {
	if s&observation != 0 {
		return observation
	}
	crossed := s
	for rest := s; rest != 0; rest &= rest - 1 {
		crossed &^= d.factors[bits.TrailingZeros32(uint32(rest))].Above
	}
	return crossed
}

// Order returns the number of crossed factors of term s; 0 for the residual.
func (d *Design) Order(s Set) int { return (d.Crossed(s) &^ observation).Len() }

// IsRandom reports whether term s is random: one of its factors, crossed or bracketed, is, or it is the residual.
func (d *Design) IsRandom(s Set) bool { return s&(d.random|observation) != 0 }

// RandomFactors returns the set of random factors.
func (d *Design) RandomFactors() Set { return d.random }

// FiniteFactors returns the set of factors whose levels came from a finite population.
func (d *Design) FiniteFactors() Set { return d.finite }

// levels returns the number of levels of the i-th factor; of the observation, the replicates.
func (d *Design) levels(i int) int64 {
	if i == MaxFactors {
		return d.replicates
	}
	return d.factors[i].Levels
}

// DF returns the degrees of freedom of term s before anything is pooled:
//
//	df = Π over crossed (levels − 1) × Π over bracketed (levels)
//
// The df of all terms sum to N − 1.
func (d *Design) DF(s Set) int64 {
	crossed := d.Crossed(s)
	df := int64(1)
	for rest := s; rest != 0; rest &= rest - 1 {
		i := bits.TrailingZeros32(uint32(rest))
		n := d.levels(i)
		if crossed.Has(i) {
			n--
		}
		df *= n
	}
	return df
}

// Behind returns the product of the levels of the factors, and of the replicates, that are not in term s: the number of
// observations behind each of its effects.
func (d *Design) Behind(s Set) int64 {
	n := int64(1)
	for rest := d.Residual() &^ s; rest != 0; rest &= rest - 1 {
		n *= d.levels(bits.TrailingZeros32(uint32(rest)))
	}
	return n
}

// arrange computes what follows from the factors: closure, terms in order, and which are negligible.
func (d *Design) arrange() {
	d.all = SetOf(len(d.factors)) - 1
	d.random, d.finite = 0, 0
	d.observations = d.replicates
	for i, f := range d.factors {
		d.observations *= f.Levels
		if f.Random {
			d.random |= SetOf(i)
		}
		if f.Population > 0 {
			d.finite |= SetOf(i)
		}
	}
	d.listTerms()
	d.markNegligible()
}

// listTerms finds all down-closed sets and sorts them.
func (d *Design) listTerms() {
	type entry struct {
		key uint64
		set Set
	}
	var found []entry
	for s := Set(1); s <= d.all; s++ {
		crossed, closed := s, true
		for rest := s; rest != 0 && closed; rest &= rest - 1 {
			above := d.factors[bits.TrailingZeros32(uint32(rest))].Above
			closed = s.Holds(above)
			crossed &^= above
		}
		if closed {
			// Among sets of one size, the one that holds the first factor in which they differ comes first.
			found = append(found, entry{uint64(crossed.Len())<<32 | uint64(^bits.Reverse32(uint32(crossed))), s})
		}
	}
	slices.SortFunc(found, func(a, b entry) int { return cmp.Compare(a.key, b.key) })
	d.terms = make([]Set, 0, len(found)+1)
	d.index = make([]int32, d.all+1)
	for i := range d.index {
		d.index[i] = -1
	}
	for i, e := range found {
		d.terms = append(d.terms, e.set)
		d.index[e.set] = int32(i)
	}
	d.terms = append(d.terms, d.Residual())
}

// markNegligible marks the terms declared null and those above max_order.
func (d *Design) markNegligible() {
	d.negligible = make([]bool, len(d.terms))
	d.negligibleCount = 0
	for i, s := range d.terms {
		if d.declared[s] || d.AboveOrder(s) {
			d.negligible[i] = true
			d.negligibleCount++
		}
	}
}

// WithNegligible returns the design with further terms assumed null.
func (d *Design) WithNegligible(terms ...Set) *Design {
	changed := *d
	changed.declared = make(map[Set]bool, len(d.declared)+len(terms))
	for s := range d.declared {
		changed.declared[s] = true
	}
	for _, s := range terms {
		changed.declared[s] = true
	}
	changed.markNegligible()
	return &changed
}

// WithLevels returns the design with n levels of the i-th factor, unlabelled; i = MaxFactors stands for the replicates.
func (d *Design) WithLevels(i int, n int64) *Design {
	changed := *d
	changed.factors = slices.Clone(d.factors)
	if i == MaxFactors {
		changed.replicates = n
	} else {
		changed.factors[i].Levels, changed.factors[i].Labels = n, nil
	}
	changed.observations = changed.replicates
	for _, f := range changed.factors {
		changed.observations *= f.Levels
	}
	return &changed
}
