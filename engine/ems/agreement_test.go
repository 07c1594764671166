package ems_test

import (
	"flag"
	"math/big"
	"math/rand/v2"
	"os"
	"slices"
	"sort"
	"strconv"
	"testing"

	"guardrow/engine"
	"guardrow/engine/ems"
)

// effort multiplies the number of random designs: GUARDROW_TEST_EFFORT=20 go test ./engine/ems takes minutes.
func effort(t testing.TB, designs int) int {
	t.Helper()
	if text := os.Getenv("GUARDROW_TEST_EFFORT"); text != "" {
		times, err := strconv.Atoi(text)
		if err != nil || times < 1 {
			t.Fatalf("GUARDROW_TEST_EFFORT=%q is not a whole number above 0", text)
		}
		return designs * times
	}
	if testing.Short() {
		return designs / 5
	}
	return designs
}

// seed moves the random designs elsewhere; a run without it is the same everywhere.
var seed = flag.Uint64("ems.seed", 1, "seed of the random designs")

// coverage counts what random designs brought, so that a test over them fails where it looked at nothing.
type coverage map[string]int

func (c coverage) count(what string, times int) { c[what] += times }

func (c coverage) when(condition bool, what string) {
	if condition {
		c[what]++
	}
}

func (c coverage) report(t *testing.T, wanted ...string) {
	t.Helper()
	var names []string
	for name := range c {
		names = append(names, name)
	}
	sort.Strings(names)
	for _, name := range names {
		t.Logf("%8d %s", c[name], name)
	}
	for _, name := range wanted {
		if c[name] == 0 {
			t.Errorf("no random design brought: %s", name)
		}
	}
}

// subject is one plan with what the engine and the reference say of it.
type subject struct {
	*reference
	t      *testing.T
	cover  coverage
	design *engine.Design
	model  *ems.Model
	matrix *matrix
	pooled *pooled

	derived map[string]*subject // changed plans, by plan
}

func newSubject(t *testing.T, cover coverage, p *plan) *subject {
	t.Helper()
	s := &subject{reference: newReference(p), t: t, cover: cover, design: p.check(t), derived: make(map[string]*subject)}
	s.model = ems.New(s.design)
	s.matrix = newMatrix(s.expectations())
	s.pooled = s.matrix.pool(s.df, s.declaredNull())
	return s
}

// declaredNull returns which terms the plan declares null.
func (r *reference) declaredNull() []bool {
	null := make([]bool, len(r.terms))
	for _, named := range r.plan.negligible {
		columns := uint32(0)
		for _, i := range named {
			columns |= 1 << i
		}
		// The term that has the same cells, in a table where terms differ, is the smallest that holds all its labels.
		best := -1
		for k, term := range r.terms[:len(r.terms)-1] {
			if term.set&columns == columns && (best < 0 || r.terms[best].set&term.set == term.set) {
				best = k
			}
		}
		null[best] = true
	}
	for k, term := range r.terms {
		if r.plan.maxOrder > 0 && len(term.crossed) > r.plan.maxOrder {
			null[k] = true
		}
	}
	return null
}

// set returns the engine's name for term k.
func (s *subject) set(k int) engine.Set {
	if k == len(s.terms)-1 {
		return s.design.Residual()
	}
	return engine.Set(s.terms[k].set)
}

func (s *subject) sets(terms []int) []engine.Set {
	var sets []engine.Set
	for _, k := range terms {
		sets = append(sets, s.set(k))
	}
	return sets
}

// position returns the reference's number of the engine's term.
func (s *subject) position(set engine.Set) int {
	for k := range s.terms {
		if s.set(k) == set {
			return k
		}
	}
	return -1
}

func (s *subject) name(k int) string { return s.design.Name(s.set(k)) }

func (s *subject) errorf(format string, arguments ...any) {
	s.t.Helper()
	s.t.Errorf("%v\n\t"+format, append([]any{s.plan}, arguments...)...)
}

// TestRandomDesigns compares terms, df, expectations, pooling and tests of random designs with what their explicit rows
// say, as exact fractions.
func TestRandomDesigns(t *testing.T) {
	cover := make(coverage)
	random := rand.New(rand.NewPCG(*seed, 1))
	for i := range effort(t, 3000) {
		bound := invention{factors: 4, rows: 400, negligible: true}
		if i%10 == 0 {
			bound = invention{factors: 5, rows: 2000, negligible: true}
		}
		s := newSubject(t, cover, randomPlan(random, bound))
		s.compareTerms()
		s.compareExpectations()
		s.comparePooling()
		s.compareTests()
		s.compareGroups()
		s.compareEstimators()
		if t.Failed() {
			return
		}
	}
	cover.report(t,
		"designs", "designs: restricted", "designs: unrestricted", "designs: one replicate", "designs: a factor within several others",
		"designs: finite population", "designs: five factors",
		"terms: random by a bracketed factor alone", "terms: without df",
		"coefficients: fraction", "coefficients: zero", "coefficients: line without df", "coefficients: zero only by the constraint",
		"pooled: with the residual", "pooled: with another line", "pooled: into a line without df of its own", "pooled: apart", "pooled: a fixed term",
		"tests: exact", "tests: approximate", "tests: none", "tests: no df", "tests: negative weight", "tests: fractional weight", "tests: one line, not the residual",
		"tests: several components unmatched", "tests: df by pooling alone",
		"groups", "groups: of three or more", "groups: with a fixed component", "groups: unequal shares", "estimators: of a sum", "estimators: none")
}

func (s *subject) compareTerms() {
	s.t.Helper()
	p, cover := s.plan, s.cover
	cover.count("designs", 1)
	cover.when(p.restricted, "designs: restricted")
	cover.when(!p.restricted, "designs: unrestricted")
	cover.when(p.replicates == 1, "designs: one replicate")
	cover.when(len(p.factors) == 5, "designs: five factors")
	cover.when(slices.ContainsFunc(p.factors, func(f planFactor) bool { return len(f.within) > 1 }), "designs: a factor within several others")
	cover.when(slices.ContainsFunc(p.factors, func(f planFactor) bool { return f.population > 0 }), "designs: finite population")

	d := s.design
	if got, want := len(d.Terms()), len(s.terms); got != want {
		s.errorf("%d terms, the rows have %d", got, want)
		return
	}
	total := int64(0)
	for k, term := range s.terms {
		set := d.Terms()[k]
		if set != s.set(k) {
			s.errorf("term %d is %s, by the rows it is %b", k, d.Name(set), term.set)
			continue
		}
		if got := d.Crossed(set); k < len(s.terms)-1 && !slices.Equal(got.Members(), term.crossed) {
			s.errorf("%s crosses %v, by the rows %v", d.Name(set), got.Members(), term.crossed)
		}
		if got := d.DF(set); got != s.df[k] {
			s.errorf("%s has %d df, by the rows %d", d.Name(set), got, s.df[k])
		}
		if got := d.IsRandom(set); got != term.random {
			s.errorf("%s is random: %v, by its factors %v", d.Name(set), got, term.random)
		}
		if got, want := d.Negligible(set), s.pooled.null[k]; got != want {
			s.errorf("%s is negligible: %v, as declared %v", d.Name(set), got, want)
		}
		total += s.df[k]
		cover.when(s.df[k] == 0, "terms: without df")
		cover.when(term.random && len(term.crossed) > 0 && !slices.ContainsFunc(term.crossed, func(i int) bool { return p.factors[i].random }), "terms: random by a bracketed factor alone")
	}
	if total != p.rows()-1 || d.Observations() != p.rows() {
		s.errorf("df add to %d, N − 1 is %d, the engine's N is %d", total, p.rows()-1, d.Observations())
	}
}

func (s *subject) compareExpectations() {
	s.t.Helper()
	for k := range s.terms {
		got := make([]string, len(s.terms))
		for i := range got {
			got[i] = "0"
		}
		last := len(s.terms)
		components := s.model.Expectation(s.set(k))
		for _, c := range components {
			at := s.position(c.Set)
			if at >= last {
				s.errorf("the components of %s are not in the reverse of the contract's order", s.name(k))
			}
			last = at
			got[at] = c.Coefficient.String()
			if c.Coefficient.Sign() == 0 {
				s.errorf("a component of %s has coefficient 0", s.name(k))
			}
			if direct := s.model.Coefficient(s.set(k), c.Set); !direct.Equal(c.Coefficient) {
				s.errorf("the coefficient of %s in %s is %v or %v", s.name(at), s.name(k), direct, c.Coefficient)
			}
		}
		for i := range s.terms {
			want := s.matrix.rat[k][i]
			if s.pooled.null[i] {
				want = new(big.Rat)
			}
			if got[i] != want.RatString() {
				s.errorf("the coefficient of %s in the line of %s is %s, by the rows %s", s.name(i), s.name(k), got[i], want.RatString())
			}
			s.countCoefficient(k, i, want)
		}
		if limit := s.model.CountComponents([]engine.Set{s.set(k)}, 1000); !s.pooled.null[k] && limit != len(components) {
			s.errorf("%s has %d components and is counted as having %d", s.name(k), len(components), limit)
		}
	}
}

func (s *subject) countCoefficient(k, i int, want *big.Rat) {
	s.cover.count("coefficients", 1)
	s.cover.when(!want.IsInt(), "coefficients: fraction")
	s.cover.when(want.Sign() == 0, "coefficients: zero")
	s.cover.when(s.df[k] == 0, "coefficients: line without df")
	inside := s.terms[i].set&s.terms[k].set == s.terms[k].set || i == len(s.terms)-1
	s.cover.when(want.Sign() == 0 && !s.pooled.null[i] && s.terms[i].random && inside && k != i && s.df[k] > 0 && s.df[i] > 0, "coefficients: zero only by the constraint")
}

func (s *subject) comparePooling() {
	s.t.Helper()
	m, p := s.model, s.pooled
	var apart []int
	pools := make(map[int][]int)
	var lines []int
	for k := range s.terms {
		switch {
		case !p.null[k]:
			lines = append(lines, k)
		case p.into[k] < 0:
			apart = append(apart, k)
		default:
			pools[p.into[k]] = append(pools[p.into[k]], k)
		}
	}
	if !slices.Equal(m.Apart, s.sets(apart)) {
		s.errorf("apart stay %v, by the expectations %v", m.Apart, s.sets(apart))
	}
	if len(m.Lines) != len(lines) {
		s.errorf("%d lines, %d terms are not null", len(m.Lines), len(lines))
		return
	}
	for i, k := range lines {
		l := m.Lines[i]
		if l.Set != s.set(k) || l.Own != s.df[k] || l.DF != p.df[k] || !slices.Equal(l.Pooled, s.sets(pools[k])) {
			s.errorf("line %s is %+v, by the expectations it has %d df, %d with those of %v", s.name(k), l, s.df[k], p.df[k], s.sets(pools[k]))
		}
		if m.Line(l.Set) != i {
			s.errorf("line %s is number %d, found at %d", s.name(k), i, m.Line(l.Set))
		}
	}
	s.countPooling()
}

func (s *subject) countPooling() {
	for k, into := range s.pooled.into {
		if !s.pooled.null[k] {
			continue
		}
		if s.model.Line(s.set(k)) != -1 {
			s.errorf("%s is negligible and has a line", s.name(k))
		}
		s.cover.when(into < 0, "pooled: apart")
		s.cover.when(into == len(s.terms)-1, "pooled: with the residual")
		s.cover.when(into >= 0 && into < len(s.terms)-1, "pooled: with another line")
		s.cover.when(into >= 0 && into < len(s.terms)-1 && s.df[into] == 0 && s.df[k] > 0, "pooled: into a line without df of its own")
		s.cover.when(into >= 0 && !s.terms[k].random, "pooled: a fixed term")
	}
}

func (s *subject) compareTests() {
	s.t.Helper()
	solver := s.model.NewSolver()
	for k := range s.terms[:len(s.terms)-1] {
		if s.pooled.null[k] {
			continue
		}
		s.compareTest(k, solver.Test(s.set(k)))
	}
}

func (s *subject) compareTest(k int, test ems.Test) {
	s.t.Helper()
	if test.Set != s.set(k) {
		s.errorf("the test of %s is one of %v", s.name(k), test.Set)
	}
	if s.pooled.df[k] == 0 {
		s.cover.count("tests: no df", 1)
		if !test.NoDF || test.Testable() || len(test.Unmatched) > 0 {
			s.errorf("%s has no df, the engine answers %+v", s.name(k), test)
		}
		return
	}
	weights, unique := s.test(s.matrix, s.pooled, k)
	if weights == nil {
		s.cover.count("tests: none", 1)
		s.compareUnmatched(k, test)
		return
	}
	if !unique {
		s.errorf("%s is tested by several combinations", s.name(k))
	}
	want := make(map[engine.Set]string)
	sum := new(big.Rat)
	for l, w := range weights {
		if w == nil || w.Sign() == 0 {
			continue
		}
		want[s.set(l)] = w.RatString()
		sum.Add(sum, w)
		s.cover.when(w.Sign() < 0, "tests: negative weight")
		s.cover.when(!w.IsInt(), "tests: fractional weight")
		s.cover.when(s.pooled.df[l] > 0 && s.df[l] == 0, "tests: df by pooling alone")
	}
	s.cover.when(len(want) == 1, "tests: exact")
	s.cover.when(len(want) == 1 && want[s.design.Residual()] == "", "tests: one line, not the residual")
	s.cover.when(len(want) > 1, "tests: approximate")
	if sum.RatString() != "1" {
		s.errorf("the weights for %s add to %s", s.name(k), sum.RatString())
	}
	last := -1
	for _, w := range test.Solution {
		at := s.position(w.Set)
		if want[w.Set] != w.Weight.String() || at <= last {
			s.errorf("%s has weight %v in the test of %s, by elimination %s; or stands out of order", s.name(at), w.Weight, s.name(k), want[w.Set])
		}
		last = at
	}
	s.compareForms(k, test)
	if len(test.Solution) != len(want) || test.NoDF || len(test.Unmatched) > 0 || !test.Testable() || test.Exact() != (len(want) == 1) {
		s.errorf("the test of %s is %+v, by elimination %v", s.name(k), test, want)
	}
}

// compareForms holds both forms of F to what they are for: with the component of s zero, numerator and denominator expect
// the same; and in the sum form nothing is subtracted.
func (s *subject) compareForms(k int, test ems.Test) {
	s.t.Helper()
	for _, difference := range []bool{false, true} {
		left := make([]*big.Rat, len(s.terms))
		for t := range left {
			left[t] = new(big.Rat)
		}
		add := func(side []ems.Weight, sign int64) {
			for _, w := range side {
				if w.Weight.Sign() <= 0 && !difference {
					s.errorf("the sum form for %s subtracts %s", s.name(k), s.design.Name(w.Set))
				}
				for t := range left {
					part := new(big.Rat).Mul(w.Weight.Rat(), s.matrix.rat[s.position(w.Set)][t])
					left[t].Add(left[t], part.Mul(part, big.NewRat(sign, 1)))
				}
			}
		}
		add(test.Numerator(difference), 1)
		add(test.Denominator(difference), -1)
		for t, x := range left {
			if x.Sign() != 0 && t != k && !s.pooled.null[t] || t == k && x.Sign() <= 0 {
				s.errorf("in F of %s, numerator less denominator holds %s of %s", s.name(k), x.RatString(), s.name(t))
			}
		}
	}
}

// compareUnmatched holds the components that no line can match to what they mean: with these taken out of the target, in
// suitable amounts, there is a combination, and with one of them left in there is none.
func (s *subject) compareUnmatched(k int, test ems.Test) {
	s.t.Helper()
	if test.NoDF || test.Testable() || len(test.Unmatched) == 0 {
		s.errorf("no combination tests %s, the engine answers %+v", s.name(k), test)
		return
	}
	s.cover.when(len(test.Unmatched) > 1, "tests: several components unmatched")
	lines := s.matrix.columns(s.pooled, s.errorLines(s.matrix, s.pooled, k))
	target := s.matrix.target(s.pooled, k)
	var free [][]int64
	for i, u := range test.Unmatched {
		at := s.position(u)
		if at < 0 || s.pooled.null[at] || i > 0 && at <= s.position(test.Unmatched[i-1]) {
			s.errorf("unmatched in the target of %s: %v", s.name(k), test.Unmatched)
			return
		}
		column := make([]int64, len(s.terms))
		column[at] = 1
		free = append(free, column)
	}
	if !soluble(append(slices.Clone(lines), free...), target) {
		s.errorf("%s has no test even with all of %v taken out", s.name(k), test.Unmatched)
	}
	for i := range free {
		if soluble(append(slices.Clone(lines), slices.Delete(slices.Clone(free), i, i+1)...), target) {
			s.errorf("%s has a test with %s left in", s.name(k), s.design.Name(test.Unmatched[i]))
		}
	}
}
