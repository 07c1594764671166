package prob

import "math"

// polynomial returns Σ c[i]·t^i.
func polynomial(c []float64, t float64) float64 {
	s := t * t
	n := len(c) &^ 1
	even, odd := 0.0, 0.0
	if n < len(c) {
		even = c[n]
	}
	for i := n - 2; i >= 0; i -= 2 {
		even = even*s + c[i]
		odd = odd*s + c[i+1]
	}
	return odd*t + even
}

// scaledGamma returns Γ*(s) = Γ(s)·e^s·s^(½−s)/√(2π) for s > 0, +Inf included: exp of the remainder of Stirling's formula,
// 1 + 1/(12s) + 1/(288s²) − … .
func scaledGamma(s float64) float64 {
	switch {
	case s >= 1024:
		t := 1 / s
		return ((-139.0/51840*t+1.0/288)*t+1.0/12)*t + 1
	case s >= 16:
		return scaledGammaBeyond(32/s - 1)
	case s >= 0.125:
		// The exponent and the first two bits after the point choose the piece.
		key := math.Float64bits(s) >> 50
		low := math.Float64frombits(key << 50)
		width := math.Float64frombits((key>>2 - 2) << 52)
		return scaledGammaPiece(&scaledGammaPieces[key-1020<<2], (s-low)/width*2-1)
	default:
		return polynomial(gammaNearOne[:], 2*s-1) * math.Exp(-s*math.Log(s)) / math.Sqrt(2*math.Pi*s)
	}
}

// scaledGammaPiece is polynomial for one piece of the table.
func scaledGammaPiece(c *[14]float64, t float64) float64 {
	s := t * t
	even := s*c[12] + c[10]
	odd := s*c[13] + c[11]
	even = s*even + c[8]
	odd = s*odd + c[9]
	even = s*even + c[6]
	odd = s*odd + c[7]
	even = s*even + c[4]
	odd = s*odd + c[5]
	even = s*even + c[2]
	odd = s*odd + c[3]
	even = s*even + c[0]
	odd = s*odd + c[1]
	return t*odd + even
}

// scaledGammaBeyond is polynomial for scaledGammaFar.
func scaledGammaBeyond(t float64) float64 {
	c := &scaledGammaFar
	s := t * t
	even := s*c[8] + c[6]
	odd := s*c[9] + c[7]
	even = s*even + c[4]
	odd = s*odd + c[5]
	even = s*even + c[2]
	odd = s*odd + c[3]
	even = s*even + c[0]
	odd = s*odd + c[1]
	return t*odd + even
}

// scaledErfc returns exp(z²)·erfc(z) for z ≥ 0 (the form of Shepherd and Laframboise 1981).
func scaledErfc(z float64) float64 {
	c := &scaledErfcTable
	t := (z - 3.75) / (z + 3.75)
	s := t * t
	s2 := s * s
	p0, p1, p2, p3 := c[24], c[25], c[26], c[27]
	for i := 20; i >= 0; i -= 4 { // four short chains rather than a long one
		p0 = p0*s2 + c[i]
		p1 = p1*s2 + c[i+1]
		p2 = p2*s2 + c[i+2]
		p3 = p3*s2 + c[i+3]
	}
	return ((p3*s+p1)*t + (p2*s + p0)) / (1 + 2*z)
}
