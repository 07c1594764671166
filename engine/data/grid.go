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
// was written in some row, subtracted exactly before rounding, so that digits common to all readings cost no precision.
type Response struct {
	Name    string
	Shift   float64
	Offsets []float64
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
	for a, axis := range g.Axes {
		stride := g.Strides[a]
		switch {
		case axis.U8 != nil:
			for i, c := range axis.U8[first : first+len(dst)] {
				dst[i] += uint32(c) * stride
			}
		case axis.U16 != nil:
			for i, c := range axis.U16[first : first+len(dst)] {
				dst[i] += uint32(c) * stride
			}
		default:
			for i, c := range axis.U32[first : first+len(dst)] {
				dst[i] += c * stride
			}
		}
	}
}
