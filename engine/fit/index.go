package fit

import (
	"encoding/binary"

	"guardrow/engine/data"
)

// cellsOf fills dst with the cell index Σ code·stride of rows first, first+1, … . Axes of narrow codes are taken three at
// a time: then an index is written and read once, not once per axis.
func cellsOf(g *data.Grid, dst []uint32, first int) {
	clear(dst)
	last := first + len(dst)
	var narrow [3][]uint8
	var strides [3]uint32
	n := 0
	for a, axis := range g.Axes {
		switch {
		case axis.U8 != nil:
			narrow[n], strides[n] = axis.U8[first:last], g.Strides[a]
			if n++; n == len(narrow) {
				addThree(dst, narrow, strides)
				n = 0
			}
		case axis.U16 != nil:
			addAxis(dst, axis.U16[first:last], g.Strides[a])
		default:
			addAxis(dst, axis.U32[first:last], g.Strides[a])
		}
	}
	for i := range n {
		addAxis(dst, narrow[i], strides[i])
	}
}

func addAxis[T uint8 | uint16 | uint32](dst []uint32, codes []T, stride uint32) {
	for i, c := range codes {
		dst[i] += uint32(c) * stride
	}
}

func addThree(dst []uint32, codes [3][]uint8, strides [3]uint32) {
	a, b, c := codes[0][:len(dst)], codes[1][:len(dst)], codes[2][:len(dst)]
	u, v, w := strides[0], strides[1], strides[2]
	for i, at := range dst {
		dst[i] = at + uint32(a[i])*u + uint32(b[i])*v + uint32(c[i])*w
	}
}

// short is up to three axes of narrow codes: the indexes along the last two are below 2^16, so that those of four rows fit
// one word and eight rows cost two multiplications per axis. So are those along all three if there are at most 2^16 cells;
// otherwise the grid is wide. A missing axis is any other with stride 0.
type short struct {
	codes   [3][]uint8
	strides [3]uint64
	wide    bool
}

// shortAxes returns the axes of a grid that is small enough for short, and whether it is.
func shortAxes(g *data.Grid, cells int) (short, bool) {
	s := short{wide: cells > 1<<16}
	if len(g.Axes) > len(s.codes) {
		return s, false
	}
	for a := range s.codes {
		axis := g.Axes[min(a, len(g.Axes)-1)]
		if axis.U8 == nil {
			return s, false
		}
		s.codes[a] = axis.U8
		if a < len(g.Axes) {
			s.strides[a] = uint64(g.Strides[a])
		}
	}
	return s, true
}

// even selects the lowest byte of each of four lanes.
const even = 0x00ff_00ff_00ff_00ff

// scan is the function scan for the rowBlock rows from first.
func (s *short) scan(cells []cell, y *[rowBlock]float64, first int, squares pair) pair {
	a, b, c := (*[rowBlock]uint8)(s.codes[0][first:]), (*[rowBlock]uint8)(s.codes[1][first:]), (*[rowBlock]uint8)(s.codes[2][first:])
	u, v, w := s.strides[0], s.strides[1], s.strides[2]
	var p, q float64
	for i := 0; i < rowBlock; i += 8 {
		j, k, l := binary.LittleEndian.Uint64(a[i:i+8]), binary.LittleEndian.Uint64(b[i:i+8]), binary.LittleEndian.Uint64(c[i:i+8])
		e := (j&even)*u + (k&even)*v + (l&even)*w          // rows 0, 2, 4, 6
		f := (j>>8&even)*u + (k>>8&even)*v + (l>>8&even)*w // rows 1, 3, 5, 7
		p += cells[uint16(e)].add(y[i])
		q += cells[uint16(f)].add(y[i+1])
		p += cells[uint16(e>>16)].add(y[i+2])
		q += cells[uint16(f>>16)].add(y[i+3])
		p += cells[uint16(e>>32)].add(y[i+4])
		q += cells[uint16(f>>32)].add(y[i+5])
		p += cells[e>>48].add(y[i+6])
		q += cells[f>>48].add(y[i+7])
		if i%plainTwo == plainTwo-8 {
			squares = squares.add(p + q)
			p, q = 0, 0
		}
	}
	return squares
}

// scanWide is scan for a wide grid.
func (s *short) scanWide(cells []cell, y *[rowBlock]float64, first int, squares pair) pair {
	a, b, c := (*[rowBlock]uint8)(s.codes[0][first:]), (*[rowBlock]uint8)(s.codes[1][first:]), (*[rowBlock]uint8)(s.codes[2][first:])
	u, v, w := s.strides[0], s.strides[1], s.strides[2]
	var p, q float64
	for i := 0; i < rowBlock; i += 8 {
		k, l := binary.LittleEndian.Uint64(b[i:i+8]), binary.LittleEndian.Uint64(c[i:i+8])
		e := (k&even)*v + (l&even)*w       // rows 0, 2, 4, 6
		f := (k>>8&even)*v + (l>>8&even)*w // rows 1, 3, 5, 7
		p += cells[uint64(a[i])*u+e&0xffff].add(y[i])
		q += cells[uint64(a[i+1])*u+f&0xffff].add(y[i+1])
		p += cells[uint64(a[i+2])*u+e>>16&0xffff].add(y[i+2])
		q += cells[uint64(a[i+3])*u+f>>16&0xffff].add(y[i+3])
		p += cells[uint64(a[i+4])*u+e>>32&0xffff].add(y[i+4])
		q += cells[uint64(a[i+5])*u+f>>32&0xffff].add(y[i+5])
		p += cells[uint64(a[i+6])*u+e>>48].add(y[i+6])
		q += cells[uint64(a[i+7])*u+f>>48].add(y[i+7])
		if i%plainTwo == plainTwo-8 {
			squares = squares.add(p + q)
			p, q = 0, 0
		}
	}
	return squares
}
