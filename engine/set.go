package engine

import "math/bits"

// MaxFactors is the largest number of factors a design may declare.
const MaxFactors = 16

// Set is a set of factors: bit i stands for the i-th factor in the order of declaration.
type Set uint32

// SetOf returns the set that holds factor i alone.
func SetOf(i int) Set { return 1 << uint(i) }

// Has reports whether factor i is in s.
func (s Set) Has(i int) bool { return s>>uint(i)&1 == 1 }

// Holds reports whether t is a subset of s (s ⊇ t).
func (s Set) Holds(t Set) bool { return s&t == t }

// Len returns the number of factors in s.
func (s Set) Len() int { return bits.OnesCount32(uint32(s)) }

// Members returns the factors of s in the order of declaration.
func (s Set) Members() []int {
	members := make([]int, 0, s.Len())
	for rest := s; rest != 0; rest &= rest - 1 {
		members = append(members, bits.TrailingZeros32(uint32(rest)))
	}
	return members
}
