package ems_test

import (
	"math/big"
	"math/bits"
)

// solveExact solves Σ w[k]·columns[k] = target by Gaussian elimination in exact rationals. It returns nil where there is
// no solution; where there are several, one of them, and unique is false.
func solveExact(columns [][]int64, target []int64) (w []*big.Rat, unique bool) {
	n := len(columns)
	rows := make([][]*big.Rat, len(target))
	for t := range target {
		rows[t] = make([]*big.Rat, n+1)
		for k := range columns {
			rows[t][k] = new(big.Rat).SetInt64(columns[k][t])
		}
		rows[t][n] = new(big.Rat).SetInt64(target[t])
	}
	pivot := make([]int, 0, n)
	factor, part := new(big.Rat), new(big.Rat)
	for k := range n {
		at := -1
		for i := len(pivot); i < len(rows) && at < 0; i++ {
			if rows[i][k].Sign() != 0 {
				at = i
			}
		}
		if at < 0 {
			continue
		}
		top := len(pivot)
		rows[top], rows[at] = rows[at], rows[top]
		for i := range rows {
			if i == top || rows[i][k].Sign() == 0 {
				continue
			}
			factor.Quo(rows[i][k], rows[top][k])
			for j := k; j <= n; j++ {
				if rows[top][j].Sign() != 0 {
					rows[i][j].Sub(rows[i][j], part.Mul(factor, rows[top][j]))
				}
			}
		}
		pivot = append(pivot, k)
	}
	for _, row := range rows[len(pivot):] {
		if row[n].Sign() != 0 {
			return nil, false
		}
	}
	w = make([]*big.Rat, n)
	for k := range w {
		w[k] = new(big.Rat)
	}
	for i, k := range pivot {
		w[k].Quo(rows[i][n], rows[i][k])
	}
	return w, len(pivot) == n
}

// prime is 2^61 − 1.
const prime = 1<<61 - 1

// soluble asks only whether there is a solution, by elimination modulo a prime: many times faster. A determinant of these
// small numbers that is a multiple of the prime, and not 0, would be a coincidence of one in 10^18; TestSolubleIsSolveExact
// compares the two.
func soluble(columns [][]int64, target []int64) bool {
	n := len(columns)
	rows := make([][]uint64, len(target))
	for t := range target {
		rows[t] = make([]uint64, n+1)
		for k := range columns {
			rows[t][k] = residue(columns[k][t])
		}
		rows[t][n] = residue(target[t])
	}
	rank := 0
	for k := 0; k < n && rank < len(rows); k++ {
		at := rank
		for at < len(rows) && rows[at][k] == 0 {
			at++
		}
		if at == len(rows) {
			continue
		}
		rows[rank], rows[at] = rows[at], rows[rank]
		inverse := power(rows[rank][k], prime-2)
		for i := rank + 1; i < len(rows); i++ {
			if rows[i][k] == 0 {
				continue
			}
			factor := times(rows[i][k], inverse)
			for j := k; j <= n; j++ {
				if rows[rank][j] != 0 {
					rows[i][j] = minus(rows[i][j], times(factor, rows[rank][j]))
				}
			}
		}
		rank++
	}
	for _, row := range rows[rank:] {
		if row[n] != 0 {
			return false
		}
	}
	return true
}

func residue(x int64) uint64 {
	x %= prime
	if x < 0 {
		x += prime
	}
	return uint64(x)
}

func minus(a, b uint64) uint64 {
	if a < b {
		a += prime
	}
	return a - b
}

func times(a, b uint64) uint64 {
	hi, lo := bits.Mul64(a, b)
	_, remainder := bits.Div64(hi, lo, prime)
	return remainder
}

func power(a, exponent uint64) uint64 {
	result := uint64(1)
	for ; exponent > 0; exponent >>= 1 {
		if exponent&1 == 1 {
			result = times(result, a)
		}
		a = times(a, a)
	}
	return result
}
