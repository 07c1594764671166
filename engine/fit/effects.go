package fit

const (
	// strip is the number of neighbouring columns that are transformed or folded together: they stay in the nearest cache.
	strip = 256
	// cacheful is the number of elements that are taken through all their inner axes before the next are looked at.
	cacheful = 1 << 13
)

// axes describes the array of cell means: one axis per factor of at least two levels, the last fastest. (Along an axis of
// one level there are no contrasts.)
type axes struct {
	levels  []int
	weights [][]float64 // by axis: see inverseLengths; nil for two levels, where both are 1/2
	scale   float64     // product of the halves left out of weights
	subset  []uint32    // by element of the folded array: the set of factors it belongs to
}

// newAxes describes the array of the cells of factors with the given levels.
func newAxes(levels []int) *axes {
	a := &axes{scale: 1, subset: []uint32{0}}
	for i := len(levels) - 1; i >= 0; i-- {
		if levels[i] == 1 {
			continue
		}
		for _, s := range a.subset {
			a.subset = append(a.subset, s|1<<i)
		}
	}
	for _, n := range levels {
		switch n {
		case 1:
			continue
		case 2:
			a.scale /= 2
			a.weights = append(a.weights, nil)
		default:
			a.weights = append(a.weights, inverseLengths(n))
		}
		a.levels = append(a.levels, n)
	}
	return a
}

// sumsOfSquares returns the sum of squares, over the cells x, of every subset of k factors, indexed by the set (bit i for
// factor i): the squares of orthonormal contrasts of x along every axis, added up over those that are not the mean along
// exactly these axes. Subsets that hold a factor of one level are 0 exactly; that of the empty set is the mean's. It
// overwrites x.
func (a *axes) sumsOfSquares(x []float64, k int) []float64 {
	subsets := make([]float64, 1<<k)
	if len(a.levels) == 0 {
		subsets[0] = x[0] * x[0]
		return subsets
	}
	n := a.levels[0]
	stride := len(x) / n
	transform(x, stride, a.levels[1:])
	if n == 2 {
		squareTwos(x[:stride], x[stride:])
	} else {
		for low := 0; low < stride; low += strip {
			squareStrip(x[low:], min(strip, stride-low), stride, a.weights[0])
		}
		x = x[:2*stride]
	}
	for i, n := range a.levels[1:] {
		stride /= n
		if n > 2 {
			foldAxis(x, stride, a.weights[i+1])
			x = x[:len(x)/n*2]
		}
	}
	for i, v := range x {
		subsets[a.subset[i]] = v * a.scale
	}
	return subsets
}

// transform replaces each block of the given size in x, an array with one axis per entry of levels, by its contrasts along
// every axis (see merge).
func transform(x []float64, size int, levels []int) {
	if len(levels) == 0 {
		return
	}
	// As many blocks at once as stay in the cache; a larger block first by its parts.
	if size > cacheful {
		n := levels[0]
		for ; len(x) > 0; x = x[size:] {
			transform(x[:size], size/n, levels[1:])
			along(x[:size], size, levels[:1])
		}
		return
	}
	for together := cacheful / size * size; len(x) > 0; {
		part := x[:min(together, len(x))]
		along(part, size, levels)
		x = x[len(part):]
	}
}

// along transforms blocks of the given size along the axes of levels, the slowest first.
func along(x []float64, size int, levels []int) {
	stride := size
	for len(levels) > 0 {
		n := levels[0]
		pairs := 0 // axes of two levels from here on
		for pairs < len(levels) && levels[pairs] == 2 {
			pairs++
		}
		levels = levels[1:]
		stride /= n
		switch {
		case pairs > 0 && pairs%2 == 0:
			levels = levels[1:]
			stride /= 2
			fours(x, stride)
		case pairs > 0:
			twos(x, stride)
		case stride == 1:
			for first := 0; first < len(x); first += n {
				contrastRow(x[first : first+n])
			}
		default:
			for first := 0; first < len(x); first += n * stride {
				contrast(x[first:first+n*stride], n, stride)
			}
		}
	}
}

// twos transforms along an axis of two levels.
func twos(x []float64, stride int) {
	for ; len(x) >= 2*stride; x = x[2*stride:] {
		a, b := x[:stride], x[stride:2*stride]
		b = b[:len(a)]
		for i, v := range a {
			w := b[i]
			a[i], b[i] = v+w, v-w
		}
	}
}

// fours transforms along two neighbouring axes of two levels each.
func fours(x []float64, stride int) {
	if stride == 1 {
		for ; len(x) >= 4; x = x[4:] {
			p, q, r, s := x[0], x[1], x[2], x[3]
			x[0], x[1], x[2], x[3] = (p+q)+(r+s), (p-q)+(r-s), (p+q)-(r+s), (p-q)-(r-s)
		}
		return
	}
	for ; len(x) >= 4*stride; x = x[4*stride:] {
		a, b, c, d := x[:stride], x[stride:2*stride], x[2*stride:3*stride], x[3*stride:4*stride]
		b, c, d = b[:len(a)], c[:len(a)], d[:len(a)]
		for i, p := range a {
			q, r, s := b[i], c[i], d[i]
			a[i], b[i], c[i], d[i] = (p+q)+(r+s), (p-q)+(r-s), (p+q)-(r+s), (p-q)-(r-s)
		}
	}
}
