package ems_test

import (
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"guardrow/api"
	"guardrow/engine"
)

// plan is a design as the tests invent it. The reference reads it as it is; the engine gets it as an api.Design.
type plan struct {
	factors    []planFactor
	replicates int64
	restricted bool
	negligible [][]int // factors of each term declared null
	maxOrder   int
}

type planFactor struct {
	levels     int64
	random     bool
	population int64 // 0: infinite
	within     []int // direct parents; some of their own parents may be named too
}

func (p *plan) clone() *plan {
	q := *p
	q.factors = slices.Clone(p.factors)
	q.negligible = slices.Clone(p.negligible)
	return &q
}

// rows returns N.
func (p *plan) rows() int64 {
	n := p.replicates
	for _, f := range p.factors {
		n *= f.levels
	}
	return n
}

func planName(i int) string { return fmt.Sprintf("factor %c", 'p'+i) }

// declared returns the plan as a caller would declare it.
func (p *plan) declared() *api.Design {
	replicates := api.Integer(p.replicates)
	d := &api.Design{Replicates: &replicates, Constraint: api.Unrestricted}
	if p.restricted {
		d.Constraint = api.Restricted
	}
	for i, f := range p.factors {
		declared := api.Factor{Name: planName(i), Levels: api.Levels{Count: f.levels}, Effect: api.Fixed}
		if f.random {
			declared.Effect = api.Random
		}
		if f.population > 0 {
			population := api.Integer(f.population)
			declared.Population = &population
		}
		for _, parent := range f.within {
			declared.Within = append(declared.Within, planName(parent))
		}
		d.Factors = append(d.Factors, declared)
	}
	for _, term := range p.negligible {
		var ref api.TermRef
		for _, i := range term {
			ref.Factors = append(ref.Factors, planName(i))
		}
		d.Negligible = append(d.Negligible, ref)
	}
	if p.maxOrder > 0 {
		bound := api.Integer(p.maxOrder)
		d.MaxOrder = &bound
	}
	return d
}

func (p *plan) String() string {
	text, err := json.Marshal(p.declared())
	if err != nil {
		panic(err)
	}
	return string(text)
}

func (p *plan) check(t testing.TB) *engine.Design {
	t.Helper()
	d, faults := engine.Check(p.declared())
	if len(faults) > 0 {
		t.Fatalf("%v is refused: %v", p, faults)
	}
	return d
}

// invention bounds what randomPlan invents.
type invention struct {
	factors    int   // at most
	rows       int64 // at most, with every one-level factor raised to three
	negligible bool  // terms may be declared null
}

// randomPlan invents a design: any nesting, fixed and random factors, one-level factors, one replicate, finite
// populations where the constraint gives them a meaning, terms declared null one by one, all together by what they cross
// or by max_order.
func randomPlan(r *rand.Rand, bound invention) *plan {
	p := &plan{restricted: r.IntN(2) == 0, replicates: 1 + int64(r.IntN(3))}
	n := 1 + r.IntN(bound.factors)
	if r.IntN(3) > 0 {
		n = max(n, 1+r.IntN(bound.factors))
	}
	nesting := []float64{0, 0.1, 0.3, 0.6}[r.IntN(4)]
	randomness := []float64{0.2, 0.5, 0.8}[r.IntN(3)]
	ones := []float64{0, 0.1, 0.4}[r.IntN(3)]
	finite := []float64{0, 0.4, 0.9}[r.IntN(3)]
	p.factors = make([]planFactor, n)
	rank := r.Perm(n) // parents have a lower rank, whatever the order of declaration
	for i := range p.factors {
		f := &p.factors[i]
		f.levels = 2 + int64(r.IntN(3))
		if r.Float64() < ones {
			f.levels = 1
		}
		f.random = r.Float64() < randomness
		for j := range p.factors {
			if rank[j] < rank[i] && r.Float64() < nesting {
				f.within = append(f.within, j)
			}
		}
	}
	p.shrink(r, bound.rows)
	for i := range p.factors {
		f := &p.factors[i]
		if p.restricted && f.random && r.Float64() < finite {
			f.population = f.levels + int64(r.IntN(4))
		}
	}
	if bound.negligible {
		p.declareNull(r)
	}
	return p
}

// shrink lowers levels until the table, with one-level factors raised to three levels, has no more rows than allowed.
func (p *plan) shrink(r *rand.Rand, most int64) {
	for {
		n := max(p.replicates, 2)
		for _, f := range p.factors {
			n *= max(f.levels, 2)
			if f.levels == 1 {
				n = n / 2 * 3
			}
		}
		if n <= most {
			return
		}
		if i := r.IntN(len(p.factors) + 1); i < len(p.factors) {
			if p.factors[i].levels > 2 || p.factors[i].levels == 1 {
				p.factors[i].levels = 2
			}
		} else {
			p.replicates = max(1, p.replicates-1)
		}
	}
}

func (p *plan) declareNull(r *rand.Rand) {
	n := len(p.factors)
	switch r.IntN(6) {
	case 0, 1, 2:
	case 3:
		p.maxOrder = 1 + r.IntN(max(1, n-1))
	case 4: // additivity: no interaction of some factors with the others
		units := 1 + r.IntN(1<<n)
		for s := 1; s < 1<<n; s++ {
			if s&units != 0 && s&^units != 0 {
				p.declareNullTerm(s)
			}
		}
	case 5:
		share := []float64{0.15, 0.4, 0.8}[r.IntN(3)]
		for s := 1; s < 1<<n; s++ {
			if r.Float64() < share {
				p.declareNullTerm(s)
			}
		}
	}
}

// declareNullTerm declares the term of the factors in the bits of s null. What they are nested in is left out or not,
// as it comes, so that one term may be named in several ways.
func (p *plan) declareNullTerm(s int) {
	var term []int
	for i := range p.factors {
		if s>>i&1 == 1 {
			term = append(term, i)
		}
	}
	p.negligible = append(p.negligible, term)
}
