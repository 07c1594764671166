package fit

import (
	"fmt"
	"math/rand/v2"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/data"
)

// crossed is a design of crossed fixed factors.
func crossed(levels []int, replicates int) *engine.Design {
	return nested(levels, make([][]int, len(levels)), replicates)
}

// nested is a design in which factor i is directly nested in the factors within[i].
func nested(levels []int, within [][]int, replicates int) *engine.Design {
	n := api.Integer(replicates)
	declared := &api.Design{Replicates: &n}
	for i, a := range levels {
		f := api.Factor{Name: fmt.Sprintf("factor %d", i+1), Levels: api.Levels{Count: int64(a)}, Effect: api.Fixed}
		for _, p := range within[i] {
			f.Within = append(f.Within, fmt.Sprintf("factor %d", p+1))
		}
		declared.Factors = append(declared.Factors, f)
	}
	d, faults := engine.Check(declared)
	if len(faults) > 0 {
		panic(fmt.Sprint(faults))
	}
	return d
}

// emptyGrid is the grid of a design with its rows in cell order and no responses.
func emptyGrid(d *engine.Design) *data.Grid {
	g := &data.Grid{Design: d, Rows: int(d.Observations())}
	run := g.Rows
	for _, f := range d.Factors() {
		run /= int(f.Levels)
		codes := make([]uint32, g.Rows)
		for i := range codes {
			codes[i] = uint32(i / run % int(f.Levels))
		}
		g.Axes = append(g.Axes, narrow(codes, int(f.Levels)))
		g.Strides = append(g.Strides, uint32(run/int(d.Replicates())))
	}
	return g
}

// narrow returns codes in the narrowest width that holds the largest index.
func narrow(codes []uint32, levels int) data.Codes {
	switch {
	case levels <= 1<<8:
		return data.Codes{U8: convert[uint8](codes)}
	case levels <= 1<<16:
		return data.Codes{U16: convert[uint16](codes)}
	}
	return data.Codes{U32: codes}
}

func convert[T uint8 | uint16](codes []uint32) []T {
	to := make([]T, len(codes))
	for i, c := range codes {
		to[i] = T(c)
	}
	return to
}

// permute puts row order[i] at row i.
func permute(g *data.Grid, order []int) {
	for a := range g.Axes {
		g.Axes[a] = data.Codes{U8: permuted(g.Axes[a].U8, order), U16: permuted(g.Axes[a].U16, order), U32: permuted(g.Axes[a].U32, order)}
	}
	for i := range g.Responses {
		g.Responses[i].Offsets = permuted(g.Responses[i].Offsets, order)
	}
}

func permuted[T any](x []T, order []int) []T {
	if x == nil {
		return nil
	}
	to := make([]T, len(x))
	for i, from := range order {
		to[i] = x[from]
	}
	return to
}

// shuffle puts the rows into random order.
func shuffle(g *data.Grid, rng *rand.Rand) { permute(g, rng.Perm(g.Rows)) }
