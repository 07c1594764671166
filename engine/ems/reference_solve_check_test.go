package ems_test

import (
	"math/big"
	"math/rand/v2"
	"testing"
)

// TestSolubleIsSolveExact compares elimination modulo a prime with elimination in rationals, and the latter's solutions
// with the equations.
func TestSolubleIsSolveExact(t *testing.T) {
	random := rand.New(rand.NewPCG(*seed, 4))
	seen := make(map[[2]bool]int)
	for range effort(t, 4000) {
		equations, unknowns := 1+random.IntN(6), random.IntN(6)
		columns := make([][]int64, unknowns)
		for k := range columns {
			columns[k] = make([]int64, equations)
			for i := range columns[k] {
				columns[k][i] = random.Int64N(4) * random.Int64N(2) * (random.Int64N(5) - 1)
			}
		}
		target := make([]int64, equations)
		for i := range target {
			target[i] = random.Int64N(3)
		}
		if random.IntN(2) == 0 { // a target that can be reached
			clear(target)
			for _, column := range columns {
				by := random.Int64N(5) - 2
				for i := range target {
					target[i] += by * column[i]
				}
			}
		}
		w, unique := solveExact(columns, target)
		if soluble(columns, target) != (w != nil) {
			t.Fatalf("columns %v, target %v: soluble %v, solution %v", columns, target, soluble(columns, target), w)
		}
		seen[[2]bool{w != nil, unique}]++
		for i := range target {
			if w != nil && !satisfied(columns, w, target, i) {
				t.Fatalf("columns %v, target %v: %v is no solution", columns, target, w)
			}
		}
	}
	for _, kind := range [][2]bool{{true, true}, {true, false}, {false, false}} {
		if seen[kind] == 0 {
			t.Errorf("no system had a solution: %v, unique: %v", kind[0], kind[1])
		}
	}
}

func satisfied(columns [][]int64, w []*big.Rat, target []int64, i int) bool {
	sum := new(big.Rat)
	for k, column := range columns {
		sum.Add(sum, new(big.Rat).Mul(w[k], new(big.Rat).SetInt64(column[i])))
	}
	return sum.Cmp(new(big.Rat).SetInt64(target[i])) == 0
}
