package answer

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"math/big"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mathext"

	"guardrow/api"
	"guardrow/engine"
)

// fittedStudy is a random balanced study: its design, and its readings as tenths of a unit, in the order of the cells.
type fittedStudy struct {
	design   *api.Design
	checked  *engine.Design
	readings []int64
	cells    [][]int // of each reading: the level of each factor
}

// newFittedStudy draws a design of one to four factors and readings with effects of any size, some so large that p is far below
// 1e-100.
func newFittedStudy(t *testing.T, r *rand.Rand) *fittedStudy {
	t.Helper()
	k := 1 + r.IntN(4)
	s := &fittedStudy{design: &api.Design{Replicates: new(api.Integer(1 + r.IntN(3))), Constraint: []string{api.Unrestricted, api.Restricted}[r.IntN(2)]}}
	for i := range k {
		f := api.Factor{Name: fmt.Sprintf("f%d", i), Levels: api.Levels{Count: int64(1 + r.IntN(4))}, Effect: []string{api.Fixed, api.Random}[r.IntN(2)]}
		for j := range i {
			if r.IntN(3) == 0 {
				f.Within = append(f.Within, fmt.Sprintf("f%d", j))
			}
		}
		s.design.Factors = append(s.design.Factors, f)
	}
	d, faults := engine.Check(s.design)
	if faults != nil {
		t.Fatal(faults)
	}
	for _, term := range d.Terms()[:len(d.Terms())-1] {
		if r.IntN(4) == 0 {
			s.design.Negligible = append(s.design.Negligible, api.TermRef{Text: d.Name(term)})
		}
	}
	s.checked, _ = engine.Check(s.design)
	effects := map[string]int64{}
	for row := range d.Observations() {
		cell, rest := make([]int, k), row/d.Replicates()
		for i := k - 1; i >= 0; i-- {
			n := d.Factors()[i].Levels
			cell[i], rest = int(rest%n), rest/n
		}
		y := r.Int64N(21) - 10
		for i, level := range cell {
			key := fmt.Sprint(i, level)
			if _, drawn := effects[key]; !drawn {
				effects[key] = int64(math.Pow(10, 7*r.Float64())) * int64(r.IntN(3)-1)
			}
			y += effects[key]
		}
		s.cells, s.readings = append(s.cells, cell), append(s.readings, y)
	}
	return s
}

// sums returns the exact SS of every term: that of the fitted means of the term's factors, less those of all terms below it.
// It looks at groups of rows only.
func (s *fittedStudy) sums() map[engine.Set]*big.Rat {
	d := s.checked
	between := func(set engine.Set) *big.Rat {
		total, count := map[string]int64{}, map[string]int64{}
		for row, cell := range s.cells {
			key := ""
			for _, i := range (set & d.All()).Members() {
				key += fmt.Sprint(cell[i], " ")
			}
			if set == d.Residual() {
				key = fmt.Sprint(row)
			}
			total[key] += s.readings[row]
			count[key]++
		}
		sum := new(big.Rat)
		for key, y := range total {
			square := new(big.Int).Mul(big.NewInt(y), big.NewInt(y))
			sum.Add(sum, new(big.Rat).SetFrac(square, big.NewInt(count[key]*100)))
		}
		return sum
	}
	whole := between(0)
	sums := make(map[engine.Set]*big.Rat)
	terms := slices.Clone(d.Terms())
	slices.SortStableFunc(terms, func(a, b engine.Set) int { return a.Len() - b.Len() })
	for _, term := range terms {
		ss := new(big.Rat).Sub(between(term), whole)
		for below, part := range sums {
			if term.Holds(below) && below != term {
				ss.Sub(ss, part)
			}
		}
		sums[term] = ss
	}
	return sums
}

func (s *fittedStudy) request(t *testing.T, r *rand.Rand, form string) (*api.AnovaRequest, Readings) {
	t.Helper()
	columns := map[string][]any{}
	for _, row := range r.Perm(len(s.readings)) {
		for i, level := range s.cells[row] {
			name := fmt.Sprintf("f%d", i)
			columns[name] = append(columns[name], level)
		}
		columns["y"] = append(columns["y"], json.Number(fmt.Sprintf("%d.%d", s.readings[row]/10, abs(s.readings[row]%10))))
		if s.readings[row] < 0 && s.readings[row] > -10 {
			columns["y"][len(columns["y"])-1] = json.Number(fmt.Sprintf("-0.%d", -s.readings[row]))
		}
	}
	text, err := json.Marshal(columns)
	if err != nil {
		t.Fatal(err)
	}
	return &api.AnovaRequest{Design: s.design, ApproximateForm: form}, Readings{JSON: text}
}

func abs(n int64) int64 { return max(n, -n) }

// Fitted tables of random designs against exact sums of squares: SS to 1e-12 of the total, F and df to 1e-8, p to 1e-7, also
// where it is below 1e-100. The lines that test a term are held to their own reference in engine/ems.
func TestRandomFits(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 3))
	tiny, approximate, ratios := 0, 0, 0
	for n := range 2500 {
		s := newFittedStudy(t, r)
		form := []string{api.SumForm, api.DifferenceForm}[n%2]
		request, readings := s.request(t, r, form)
		answer, _, faults, err := Anova(context.Background(), request, readings)
		if faults != nil || err != nil {
			t.Fatal(faults, err)
		}
		analysis := answer.Analyses[0]
		exact := s.sums()
		df, ss, total := map[string]float64{}, map[string]float64{}, 0.0
		for term, x := range exact {
			f, _ := x.Float64()
			ss[s.checked.Name(term)] = f
			total += f
		}
		// A row's SS is that of its own term and of those pooled into it.
		sumDF := int64(0)
		for _, row := range analysis.Rows {
			want := ss[row.Term.Term]
			for _, p := range row.Pooled {
				want += ss[p.Term]
			}
			if got := value(row.SS); math.Abs(got-want) > 1e-12*total {
				t.Fatalf("%s: SS %v, want %v of %v", row.Term.Term, got, want, total)
			}
			ss[row.Term.Term], df[row.Term.Term] = want, float64(row.DF)
			sumDF += row.DF
		}
		if sumDF != analysis.Total.DF || math.Abs(value(analysis.Total.SS)-total) > 1e-12*total {
			t.Fatalf("total df %d of %d, SS %v of %v", sumDF, analysis.Total.DF, value(analysis.Total.SS), total)
		}
		for _, row := range analysis.Rows {
			f, ok := row.F.Value()
			if !ok {
				continue
			}
			num, dfNum := combine(row.Numerator, ss, df)
			den, dfDen := combine(row.Denominator, ss, df)
			if den < 1e-8*total {
				continue // F is of the size of the rounding of the smallest SS
			}
			ratios++
			near := func(what string, got, want, tolerance float64) {
				if math.Abs(got-want) > tolerance*math.Abs(want) {
					t.Errorf("%s: %s %v, want %v", row.Term.Term, what, got, want)
				}
			}
			if num > 1e-8*total {
				near("F", f, num/den, 1e-8)
			}
			near("numerator df", value(row.DFNumerator), dfNum, 1e-8)
			near("error df", value(row.DFDenominator), dfDen, 1e-8)
			p := mathext.RegIncBeta(dfDen/2, dfNum/2, dfDen/(dfDen+dfNum*f))
			if dfNum == 2 {
				p = math.Exp(-dfDen / 2 * math.Log1p(2*f/dfDen))
			}
			near("p", value(row.P), p, 1e-7)
			if row.Status == api.Approximate {
				approximate++
			}
		}
		for _, row := range analysis.Rows {
			if p, ok := row.P.Value(); ok && p > 1e-300 && p < 1e-100 {
				tiny++
				d1, d2, f := value(row.DFNumerator), value(row.DFDenominator), value(row.F)
				if d1 == 2 && math.Abs(math.Log(p)+d2/2*math.Log1p(2*f/d2)) > 1e-7 {
					t.Errorf("%s: p %v", row.Term.Term, p)
				}
			}
		}
	}
	if tiny < 5 || approximate < 100 || ratios < 1000 {
		t.Errorf("only %d ratios, %d of them approximate; %d p below 1e-100", ratios, approximate, tiny)
	}
}

// combine returns a combination of mean squares and Satterthwaite's df of it.
func combine(weights []api.Weight, ss, df map[string]float64) (sum, nu float64) {
	below := 0.0
	for _, w := range weights {
		part := w.Weight * ss[w.Term.Term] / df[w.Term.Term]
		sum += part
		below += part * part / df[w.Term.Term]
	}
	return sum, sum * sum / below
}
