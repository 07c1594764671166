package fit

import (
	"fmt"
	"math/rand/v2"
	"testing"

	"guardrow/engine/data"
)

// plainCell finds a row's cell axis by axis.
func plainCell(g *data.Grid, i int) int {
	at := 0
	for a := range g.Axes {
		at += code(g, a, i) * int(g.Strides[a])
	}
	return at
}

// TestCellOrder compares the detection of cell order with the definition, on grids in order, shuffled, and in order but for
// two rows or one code.
func TestCellOrder(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 9))
	outcomes := map[bool]int{}
	for round := range 2000 {
		d := randomDesign(rng, 300)
		g := emptyGrid(d)
		switch round % 4 {
		case 1:
			shuffle(g, rng)
		case 2:
			order := make([]int, g.Rows)
			for i := range order {
				order[i] = i
			}
			i, j := rng.IntN(g.Rows), rng.IntN(g.Rows)
			order[i], order[j] = order[j], order[i]
			permute(g, order)
		case 3:
			a := rng.IntN(len(g.Axes))
			g.Axes[a].U8[rng.IntN(g.Rows)] = uint8(rng.IntN(int(d.Factors()[a].Levels)))
		}
		want := true
		for i := range g.Rows {
			want = want && plainCell(g, i) == i/int(d.Replicates())
		}
		outcomes[want]++
		if got := NewKernel(g).ordered; got != want {
			t.Fatalf("round %d: in cell order %v, not %v", round, got, want)
		}
	}
	if outcomes[true] < 500 || outcomes[false] < 500 {
		t.Errorf("outcomes %v", outcomes)
	}
}

// TestWideCodes: axes of every width and number find the same cells, and rows in any order the same sums of squares, as rows
// in cell order.
func TestWideCodes(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 4))
	for _, c := range []struct {
		levels     []int
		replicates int
	}{
		{[]int{256}, 9},
		{[]int{257}, 9},
		{[]int{70000}, 1},
		{[]int{66000}, 2},
		{[]int{3, 400}, 3},
		{[]int{400, 3}, 3},
		{[]int{256, 256}, 1},
		{[]int{256, 257}, 1},
		{[]int{200, 100, 5}, 1},
		{[]int{30, 20, 10}, 3},
		{[]int{9, 100, 90}, 2},
		{[]int{256, 257}, 2},
		{[]int{250, 251, 2}, 2},
		{[]int{2, 3, 4, 5}, 10},
		{[]int{2, 3, 300, 4}, 1},
		{[]int{2, 3, 2, 3, 2, 3, 2}, 4},
		{[]int{7}, 500},
	} {
		t.Run(fmt.Sprint(c.levels, c.replicates), func(t *testing.T) {
			g := emptyGrid(crossed(c.levels, c.replicates))
			y := noise(rng, g.Rows)
			k := NewKernel(g)
			if !k.ordered {
				t.Error("not seen to be in cell order")
			}
			ordered := sumsOf(t, g, y)
			g.Responses = []data.Response{{Offsets: y}}
			shuffle(g, rng)
			cells := make([]uint32, g.Rows-1)
			cellsOf(g, cells, 1)
			for i, cell := range cells {
				if int(cell) != plainCell(g, i+1) {
					t.Fatalf("row %d is in cell %d, not %d", i+1, cell, plainCell(g, i+1))
				}
			}
			shuffled := sumsOf(t, g, g.Responses[0].Offsets)
			if !agree(g.Design, shuffled, ordered, 1) {
				t.Error("SS differ from those in cell order")
			}
		})
	}
}

// TestInverseLengths: the contrasts that the merges make are orthogonal, and their lengths are what inverseLengths says.
func TestInverseLengths(t *testing.T) {
	for n := 3; n <= 70; n++ {
		// The transform of the unit vectors is the matrix of the contrasts.
		rows := make([][]float64, n)
		for level := range rows {
			rows[level] = make([]float64, n)
			rows[level][level] = 1
			contrastRow(rows[level])
		}
		w := inverseLengths(n)
		for p := range n {
			for q := range n {
				product := 0.0
				for level := range n {
					product += rows[level][p] * rows[level][q]
				}
				want := 0.0
				if p == q {
					want = 1
				}
				if got := product * w[p]; got < want-1e-15 || got > want+1e-15 {
					t.Fatalf("%d levels: contrasts %d and %d multiply to %v", n, p, q, got)
				}
			}
		}
	}
}
