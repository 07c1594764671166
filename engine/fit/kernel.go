package fit

import (
	"context"
	"fmt"
	"math"
	"math/bits"
	"slices"

	"guardrow/engine"
	"guardrow/engine/data"
)

// Kernel turns the responses of one grid into sums of squares without a design matrix (goals: O(rows + cells × factors)):
//
//  1. one pass over the rows to the sum of every cell and the sum of squares within cells (a second one only where the
//     cells explain so much that the difference would lose digits);
//  2. an orthogonal Helmert transform of the centred cell means along every axis, squares, and a fold of every axis to
//     {mean, contrasts}: the sums of squares of all subsets of axes at once, each a sum of squares, with no differences;
//  3. each subset M of axes belongs to one term, its closure: M with all that its members are nested in.
//
// What depends on the codes alone is done once per grid. A Kernel holds scratch memory and is not for concurrent use.
type Kernel struct {
	grid       *data.Grid
	levels     []int
	axes       *axes
	cells      int
	replicates int
	ordered    bool     // the rows stand in the order of the cells
	index      []uint32 // cell of every row; nil where it is found again block by block

	means []float64 // scratch: one per cell
	sums  []cell    // scratch: one per cell, for rows in any order
	carry []pair    // scratch: one per cell, for many rows per cell in any order
	block []float64 // scratch: one per block of a long cell, for rows in cell order
}

// NewKernel prepares the analysis of a grid. It panics if the grid's rows are not its design's cells × replicates: that
// is for the grid's maker to ensure.
func NewKernel(g *data.Grid) *Kernel {
	d := g.Design
	k := &Kernel{grid: g, cells: int(d.Cells()), replicates: int(d.Replicates())}
	for _, f := range d.Factors() {
		k.levels = append(k.levels, int(f.Levels))
	}
	if int64(g.Rows) != d.Observations() || len(g.Axes) != len(k.levels) {
		panic(fmt.Sprintf("fit: a grid of %d rows and %d axes for a design of %d observations and %d factors", g.Rows, len(g.Axes), d.Observations(), len(k.levels)))
	}
	k.axes = newAxes(k.levels)
	k.ordered = inCellOrder(g, k.levels, k.replicates)
	if !k.ordered && len(g.Responses) > 1 {
		k.index = make([]uint32, g.Rows)
		cellsOf(g, k.index, 0)
	}
	return k
}

// Sums decomposes the grid's i-th response. The context is looked at between stages; its error is returned as it is. The
// only other error is ErrNotFinite.
func (k *Kernel) Sums(ctx context.Context, i int) (*Sums, error) {
	r := &k.grid.Responses[i]
	s, err := k.decompose(ctx, r.Offsets)
	if err != nil {
		return nil, err
	}
	if !(s.Total > 0x1p-400 && s.Total < 0x1p+400) {
		s, err = k.scaled(ctx, r.Offsets, s)
		if err != nil {
			return nil, err
		}
	}
	s.Mean += r.Shift
	return s, nil
}

// scaled decomposes y once more, times the power of two that brings its largest reading between 1 and 2.
func (k *Kernel) scaled(ctx context.Context, y []float64, plain *Sums) (*Sums, error) {
	largest := 0.0
	for _, v := range y {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, ErrNotFinite
		}
		largest = max(largest, math.Abs(v))
	}
	if largest == 0 {
		return plain, nil
	}
	exponent := math.Ilogb(largest)
	small := make([]float64, len(y))
	for i, v := range y {
		small[i] = math.Ldexp(v, -exponent)
	}
	s, err := k.decompose(ctx, small)
	if err != nil {
		return nil, err
	}
	if s.Total == 0 {
		return plain, nil
	}
	s.Mean = math.Ldexp(s.Mean, exponent)
	s.Exponent = exponent
	return s, nil
}

// decompose runs the three stages on one column of readings.
func (k *Kernel) decompose(ctx context.Context, y []float64) (*Sums, error) {
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	within, origin := k.cellMeans(y)
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	x := k.means
	mean := sum(x) / float64(len(x))
	for c := range x {
		x[c] -= mean
	}
	subsets := k.effects(x)
	s := &Sums{Mean: origin + mean, Within: within, terms: byTerm(k.grid.Design, subsets)}
	s.Total = pair{hi: sum(subsets)}.add(within).value()
	return s, nil
}

// effects returns the sum of squares of every subset of axes, from the cell means x as distances from about their mean;
// it overwrites x.
func (k *Kernel) effects(x []float64) []float64 {
	subsets := k.axes.sumsOfSquares(x, len(k.levels))
	for m := range subsets {
		subsets[m] *= float64(k.replicates)
	}
	subsets[0] = 0
	return subsets
}

// cellMeans fills k.means with the mean of every cell as its distance from the origin that it returns, beside the sum of
// squares within cells.
func (k *Kernel) cellMeans(y []float64) (within, origin float64) {
	if k.means == nil {
		k.means = make([]float64, k.cells)
	}
	origin = commonPart(y)
	switch {
	case k.ordered:
		return k.orderedMeans(y, origin), origin
	case k.replicates == 1:
		k.placeSingles(y, origin)
		return 0, origin
	}
	return k.scatteredMeans(y, origin), origin
}

// commonPart returns a reading that lies amidst the others if they share leading digits, and 0 if they do not: then
// nothing is gained by subtracting anything, and whole numbers stay whole numbers.
func commonPart(y []float64) float64 {
	const most = 33
	n := min(most, len(y))
	sample := make([]float64, 0, most)
	for i := range n {
		sample = append(sample, y[i*(len(y)-1)/max(n-1, 1)])
	}
	slices.Sort(sample)
	middle := sample[n/2]
	if math.Abs(middle) <= sample[n-1]-sample[0] {
		return 0
	}
	return middle
}

// byTerm adds the sums of squares of the subsets of axes that belong to one term: those with the same closure.
func byTerm(d *engine.Design, subsets []float64) []float64 {
	nested := false
	for _, f := range d.Factors() {
		nested = nested || f.Above != 0
	}
	if !nested {
		return subsets
	}
	factors := d.Factors()
	closure := make([]engine.Set, len(subsets))
	terms := make([]float64, len(subsets))
	for m := 1; m < len(subsets); m++ {
		last := bits.TrailingZeros(uint(m))
		closure[m] = closure[m&(m-1)] | engine.SetOf(last) | factors[last].Above
		terms[closure[m]] += subsets[m]
	}
	return terms
}
