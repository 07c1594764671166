package prob

import "math"

// pair is the unevaluated sum of two float64, about 100 bits of a real number (Dekker 1971). The second part is small beside
// the first.
type pair struct{ high, low float64 }

// twoSum returns a + b exactly.
func twoSum(a, b float64) pair {
	s := a + b
	t := s - a
	return pair{s, (a - (s - t)) + (b - t)}
}

// twoProduct returns a·b exactly, underflow apart.
func twoProduct(a, b float64) pair {
	p := a * b
	return pair{p, math.FMA(a, b, -p)}
}

// settled returns the same sum with the first part rounded from the whole; |p.high| must not be below |p.low|.
func (p pair) settled() pair {
	s := p.high + p.low
	return pair{s, p.low - (s - p.high)}
}

// times returns p·q.
func (p pair) times(q pair) pair {
	r := twoProduct(p.high, q.high)
	r.low += p.high*q.low + p.low*q.high
	return r.settled()
}

// over returns p/q.
func (p pair) over(q pair) pair {
	r := p.high / q.high
	rest := math.FMA(-r, q.high, p.high) + (p.low - r*q.low)
	return pair{r, rest / q.high}.settled()
}

// difference returns n·p − a·q.
func difference(n, p pair, a float64, q pair) pair {
	first, second := twoProduct(n.high, p.high), twoProduct(a, q.high)
	s := twoSum(first.high, -second.high)
	s.low += (first.low + (n.high*p.low + n.low*p.high)) - (second.low + a*q.low)
	return s.settled()
}

// plus returns p + c.
func (p pair) plus(c float64) pair {
	s := twoSum(p.high, c)
	s.low += p.low
	return s.settled()
}

// minus returns p − q.
func (p pair) minus(q pair) pair {
	s := twoSum(p.high, -q.high)
	s.low += p.low - q.low
	return s.settled()
}

// notNegative returns p, or 0 where rounding took a deviance near 0 below it.
func (p pair) notNegative() pair {
	if p.high < 0 {
		return pair{}
	}
	return p
}
