package ems_test

import (
	"slices"
)

// reference is what the explicit table says of a plan.
type reference struct {
	plan  *plan
	terms []refTerm // in the contract's order, the residual last
	table *table
	df    []int64 // by term
}

// refTerm is a partition of the rows by a set of factors.
type refTerm struct {
	set     uint32 // all factors whose labels the partition fixes; the bit after the last factor for the residual
	crossed []int  // factors without whose labels the partition would be coarser
	random  bool
	// project is the projection onto the term's line as a combination of averages over the cells of terms:
	// P = Σ project[U]·average(U), the last entry for the grand mean.
	project []int64
}

func newReference(p *plan) *reference {
	r := &reference{plan: p, terms: findTerms(p), table: newTable(p)}
	r.df = r.degrees(r.table)
	return r
}

// findTerms tries all subsets of the factors on a table with two levels of each factor and two replicates, in which
// different terms split the rows in different ways, and keeps each partition once.
func findTerms(p *plan) []refTerm {
	generic := p.clone()
	generic.replicates = 2
	for i := range generic.factors {
		generic.factors[i].levels = 2
	}
	t := newTable(generic)
	var terms []refTerm
	var parts []*partition
	for s := uint32(1); s < 1<<len(p.factors); s++ {
		part := t.of(s)
		same := func(q *partition) bool { return slices.Equal(q.cell, part.cell) }
		if k := slices.IndexFunc(parts, same); k >= 0 {
			terms[k].set |= s
			continue
		}
		terms = append(terms, refTerm{set: s})
		parts = append(parts, part)
	}
	for k := range terms {
		for i, f := range p.factors {
			if terms[k].set>>i&1 == 0 {
				continue
			}
			terms[k].random = terms[k].random || f.random
			if !slices.Equal(t.of(terms[k].set&^(1<<i)).cell, parts[k].cell) {
				terms[k].crossed = append(terms[k].crossed, i)
			}
		}
	}
	slices.SortFunc(terms, func(a, b refTerm) int {
		if len(a.crossed) != len(b.crossed) {
			return len(a.crossed) - len(b.crossed)
		}
		return slices.Compare(a.crossed, b.crossed)
	})
	terms = append(terms, refTerm{set: 1 << len(p.factors), random: true})
	orthogonalise(t, terms)
	return terms
}

// orthogonalise finds each term's projection: the average over its cells, less the projections of all coarser partitions
// and of the grand mean.
func orthogonalise(t *table, terms []refTerm) {
	mean := len(terms)
	var project func(k int) []int64
	project = func(k int) []int64 {
		if terms[k].project != nil {
			return terms[k].project
		}
		c := make([]int64, mean+1)
		c[k], c[mean] = 1, -1
		for u := range terms {
			if u != k && finer(t.of(terms[k].set), t.of(terms[u].set)) {
				for v, x := range project(u) {
					c[v] -= x
				}
			}
		}
		terms[k].project = c
		return c
	}
	for k := range terms {
		project(k)
	}
}

// columns returns the columns whose labels the cells of term k share; for k = len(terms), the grand mean, none.
func (r *reference) columns(k int) uint32 {
	if k == len(r.terms) {
		return 0
	}
	return r.terms[k].set
}

// degrees returns the traces of the projections: the trace of an average is its number of cells.
func (r *reference) degrees(t *table) []int64 {
	df := make([]int64, len(r.terms))
	for k, term := range r.terms {
		for u, c := range term.project {
			df[k] += c * int64(t.of(r.columns(u)).cells)
		}
	}
	return df
}
