package fit

// The contrasts along an axis of n levels compare neighbouring halves. Levels are merged in pairs, pairs in fours and so on;
// what is left over is merged at the end, the smaller groups first. Merging a left group of m levels with sum L and a right
// one of p levels with sum R leaves
//
//	in the place of the left group:  L + R
//	in the place of the right group: L − R     if m = p,    a contrast of squared length 2m
//	                                 pL − mR   if m ≠ p,    a contrast of squared length mp(m + p)
//
// so that in the end place 0 holds the sum, of squared length n, and the others n − 1 contrasts, all orthogonal. Every sum
// is a sum of sums of equal size: rounding grows with the logarithm of n only, where a running sum (Helmert's contrasts)
// lets the rounding of a long or drifting axis add up.

// merge merges neighbouring columns of two groups of m and p levels.
func merge(left, right []float64, m, p int) {
	right = right[:len(left)]
	if m == p {
		for i, l := range left {
			r := right[i]
			left[i], right[i] = l+r, l-r
		}
		return
	}
	a, b := float64(p), float64(m)
	for i, l := range left {
		r := right[i]
		left[i], right[i] = l+r, a*l-b*r
	}
}

// leftOver calls f for the merges at the end of an axis of n levels, with the first level and the size of either group.
func leftOver(n int, f func(left, m, right, p int)) {
	size := n & -n
	start := n - size
	for rest := n - size; rest > 0; {
		m := rest & -rest
		f(start-m, m, start, size)
		rest -= m
		start -= m
		size += m
	}
}

// mergeFour merges neighbouring columns of four levels.
func mergeFour(a, b, c, d []float64) {
	b, c, d = b[:len(a)], c[:len(a)], d[:len(a)]
	for i, p := range a {
		q, r, s := b[i], c[i], d[i]
		left, right := p+q, r+s
		a[i], b[i], c[i], d[i] = left+right, p-q, left-right, r-s
	}
}

// contrast transforms a block of n·stride elements along its first axis.
func contrast(x []float64, n, stride int) {
	for low := 0; low < stride; low += strip {
		width := min(strip, stride-low)
		row := func(level int) []float64 { return x[level*stride+low:][:width] }
		for count := 4; count <= n; count += 4 {
			mergeFour(row(count-4), row(count-3), row(count-2), row(count-1))
			for m := 4; count&m == 0; m *= 2 {
				merge(row(count-2*m), row(count-m), m, m)
			}
		}
		if n&2 != 0 {
			merge(row(n&^3), row(n&^3+1), 1, 1)
		}
		leftOver(n, func(left, m, right, p int) { merge(row(left), row(right), m, p) })
	}
}

// contrastRow transforms along one row.
func contrastRow(x []float64) {
	n := len(x)
	for rest := x; len(rest) >= 4; rest = rest[4:] {
		p, q, r, s := rest[0], rest[1], rest[2], rest[3]
		left, right := p+q, r+s
		rest[0], rest[1], rest[2], rest[3] = left+right, p-q, left-right, r-s
	}
	if n&2 != 0 {
		pair := x[n&^3:]
		pair[0], pair[1] = pair[0]+pair[1], pair[0]-pair[1]
	}
	for m := 4; 2*m <= n; m *= 2 {
		for left, right := 0, m; right+m <= n; left, right = left+2*m, right+2*m {
			l, r := x[left], x[right]
			x[left], x[right] = l+r, l-r
		}
	}
	leftOver(n, func(left, m, right, p int) { merge(x[left:left+1], x[right:right+1], m, p) })
}

// inverseLengths returns, for each place of an axis of n levels, 1 / the squared length of the contrast there.
func inverseLengths(n int) []float64 {
	w := make([]float64, n)
	w[0] = 1 / float64(n)
	for m := 1; m < n; m *= 2 {
		for right := m; right+m <= n; right += 2 * m {
			w[right] = 1 / float64(2*m)
		}
	}
	leftOver(n, func(_, m, right, p int) { w[right] = 1 / (float64(m) * float64(p) * float64(m+p)) })
	return w
}
