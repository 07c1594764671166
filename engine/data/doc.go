// Package data reads readings as they were sent: JSON columns or CSV, straight from the text into codes and numbers, then
// laid onto a declared design as a complete array; or a list of everything that stands in the way.
//
//	Split      body → envelope (for libraries to validate) and the spans of the bulk members
//	ScanJSON   an object of arrays → Columns
//	ScanCSV    a table in CSV → the same Columns
//	Lay        Columns and a design → Grid
//
// Nothing is guessed, and a lost reading is never a zero: what does not match is a fault with its place and a sentence
// that says how to mend it, all of them at once, each kind capped at a few examples and a count.
//
// # Readings
//
// A reading is taken as the decimal number that was written, m·10^e, not as the double nearest to it. With s the first
// reading of its column, what is kept is
//
//	offset = round(x − s), the difference being exact and rounded once to the nearest double,
//
// and s itself. So an offset errs by at most 2^-53·|x − s|, which is at most 2^-53 of the range of the column
// (|x − s| ≤ max − min), however large the part that all readings share. Reading x as a double first would err by 2^-53·|x|, and
// nothing could bring the lost digits back.
//
// The exact difference needs a common exponent. Where |x| and |s| differ by a factor above 10^19 > 2^63 and their difference
// does not fit 128 bits, or where it is no double at all, the column is read again without a shift, each reading as the double
// nearest to it. That loses nothing against the bound: then max|x| ≤ (max − min)·(1 + 2^-62), so that
// 2^-53·|x| is again at most 2^-53 of the range, to within a part in 2^62.
package data
