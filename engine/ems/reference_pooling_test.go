package ems_test

import "math/big"

// matrix is a table of expectations in whole numbers: each column, a component, is scaled by what makes it so. Equations
// between expectations hold in it just as in the original.
type matrix struct {
	row  [][]int64
	rat  [][]*big.Rat // unscaled
	unit []int64      // by column: the scale
}

func newMatrix(ems [][]*big.Rat) *matrix {
	m := &matrix{rat: ems, row: make([][]int64, len(ems)), unit: make([]int64, len(ems))}
	for s := range ems {
		m.row[s] = make([]int64, len(ems))
	}
	for t := range ems {
		common := big.NewInt(1)
		for s := range ems {
			d := ems[s][t].Denom()
			g := new(big.Int).GCD(nil, nil, common, d)
			common.Mul(common, new(big.Int).Quo(d, g))
		}
		m.unit[t] = common.Int64()
		scale := new(big.Rat).SetInt(common)
		for s := range ems {
			x := new(big.Rat).Mul(ems[s][t], scale)
			if !x.IsInt() || !x.Num().IsInt64() {
				panic("the reference's expectations are not small fractions")
			}
			m.row[s][t] = x.Num().Int64()
		}
	}
	return m
}

// pooled is a reference with some terms assumed null.
type pooled struct {
	null []bool
	df   []int64 // by line, with what pools into it
	into []int   // by null term: the line it pools with, -1 where there is none
}

// pool puts each null line with the line that then has the same expectation.
func (m *matrix) pool(df []int64, null []bool) *pooled {
	p := &pooled{null: null, df: make([]int64, len(df)), into: make([]int, len(df))}
	for s := range df {
		p.into[s] = -1
		if !null[s] {
			p.df[s] += df[s]
			continue
		}
		for l := range df {
			if !null[l] && m.equal(s, l, null) {
				if p.into[s] >= 0 {
					panic("two lines have one expectation")
				}
				p.into[s] = l
				p.df[l] += df[s]
			}
		}
	}
	return p
}

// equal reports whether lines a and b have one expectation.
func (m *matrix) equal(a, b int, null []bool) bool {
	x, y := m.row[a], m.row[b]
	for t, zero := range null {
		if !zero && x[t] != y[t] {
			return false
		}
	}
	return true
}

// errorLines returns the lines that may stand in a combination that tests line s: others with degrees of freedom whose
// expectation holds no fixed component.
func (r *reference) errorLines(m *matrix, p *pooled, s int) []int {
	var lines []int
	for l := range r.terms {
		if l != s && !p.null[l] && p.df[l] > 0 && !r.holdsFixed(m, p, l) {
			lines = append(lines, l)
		}
	}
	return lines
}

func (r *reference) holdsFixed(m *matrix, p *pooled, l int) bool {
	for t, term := range r.terms {
		if !p.null[t] && !term.random && m.row[l][t] != 0 {
			return true
		}
	}
	return false
}

// target returns E[MS_s] less the component of s itself, in the scaled numbers.
func (m *matrix) target(p *pooled, s int) []int64 {
	target := make([]int64, len(m.row))
	for t := range target {
		if t != s && !p.null[t] {
			target[t] = m.row[s][t]
		}
	}
	return target
}

// columns returns the expectations of lines, as the columns of a system of equations, one for each component.
func (m *matrix) columns(p *pooled, lines []int) [][]int64 {
	columns := make([][]int64, len(lines))
	for k, l := range lines {
		columns[k] = make([]int64, len(m.row))
		for t := range m.row {
			if !p.null[t] {
				columns[k][t] = m.row[l][t]
			}
		}
	}
	return columns
}

// test returns the weights of the lines, by line, of a combination whose expectation is the target of line s; nil where
// there is none. unique reports whether it is the only one.
func (r *reference) test(m *matrix, p *pooled, s int) (weights []*big.Rat, unique bool) {
	lines := r.errorLines(m, p, s)
	w, unique := solveExact(m.columns(p, lines), m.target(p, s))
	if w == nil {
		return nil, false
	}
	weights = make([]*big.Rat, len(r.terms))
	for k, l := range lines {
		weights[l] = w[k]
	}
	return weights, unique
}

// testable reports whether there is such a combination.
func (r *reference) testable(m *matrix, p *pooled, s int) bool {
	return p.df[s] > 0 && soluble(m.columns(p, r.errorLines(m, p, s)), m.target(p, s))
}
