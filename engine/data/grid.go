package data

import "guardrow/engine"

// Codes is one factor's column as numbers: for each row the index of its level. The narrowest of the three widths that
// holds the largest index is used; the other two are nil.
type Codes struct {
	U8  []uint8
	U16 []uint16
	U32 []uint32
}

// Response is one column of readings. The reading of row r is Shift + Offsets[r]: the shift is the decimal number as it
// was written in the first row, subtracted exactly before rounding, so that digits common to all readings cost no
// precision. The shift is 0 where subtracting it gains nothing (see the package's comment).
type Response struct {
	Name    string
	Shift   float64
	Offsets []float64

	exact string // the shift as the decimal it is: digits, then a power of ten
}

// Grid is a complete, balanced set of readings laid onto its design: an array with one axis per factor in the order of
// declaration (the last fastest) and the same number of readings in every cell. A nested factor's code is its level within
// the cell of its parents.
type Grid struct {
	Design    *engine.Design
	Rows      int
	Axes      []Codes // one per declared factor; values below that factor's levels
	Strides   []uint32
	Responses []Response
}

// Cells fills dst with the cell index Σ code·stride of rows first, first+1, … .
func (g *Grid) Cells(dst []uint32, first int) {
	clear(dst)
	for a := range g.Axes {
		g.Axes[a].addTo(dst, first, g.Strides[a])
	}
}

// addTo adds code·stride of rows first, first+1, … to dst.
func (c *Codes) addTo(dst []uint32, first int, stride uint32) {
	switch {
	case c.U8 != nil:
		addCodes(dst, c.U8[first:first+len(dst)], stride)
	case c.U16 != nil:
		addCodes(dst, c.U16[first:first+len(dst)], stride)
	default:
		addCodes(dst, c.U32[first:first+len(dst)], stride)
	}
}

func addCodes[T width](dst []uint32, codes []T, stride uint32) {
	codes = codes[:len(dst)]
	for i := range dst {
		dst[i] += uint32(codes[i]) * stride
	}
}
