package data

// width is the type of a code.
type width interface{ ~uint8 | ~uint16 | ~uint32 }

// widest returns the largest code that a type holds.
func widest[T width]() uint32 {
	var zero T
	return uint32(^zero)
}

// grown returns codes in a slice of n.
func grown[T width](codes []T, n int) []T {
	longer := make([]T, n)
	copy(longer, codes)
	return longer
}

// widened returns the first n codes in a wider type, with as much room as there was.
func widened[T, U width](codes []U, n int) []T {
	wide := make([]T, len(codes))
	for i, c := range codes[:n] {
		wide[i] = T(c)
	}
	return wide
}

// codesOf returns codes as a column.
func codesOf[T width](codes []T) Codes {
	switch c := any(codes).(type) {
	case []uint8:
		return Codes{U8: c}
	case []uint16:
		return Codes{U16: c}
	case []uint32:
		return Codes{U32: c}
	}
	panic("data: codes of an unknown width")
}

// Len returns the number of rows.
func (c *Codes) Len() int { return len(c.U8) + len(c.U16) + len(c.U32) }

// At returns the code of a row.
func (c *Codes) At(row int) uint32 {
	switch {
	case c.U8 != nil:
		return uint32(c.U8[row])
	case c.U16 != nil:
		return uint32(c.U16[row])
	}
	return c.U32[row]
}

// first returns the codes of the first n rows.
func (c *Codes) first(n int) Codes {
	switch {
	case c.U8 != nil:
		return Codes{U8: c.U8[:n]}
	case c.U16 != nil:
		return Codes{U16: c.U16[:n]}
	}
	return Codes{U32: c.U32[:n]}
}
