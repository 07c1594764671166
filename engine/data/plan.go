package data

// Plan says what the columns of the data are.
type Plan struct {
	// Factors are the names of the declared factors, in the order of declaration.
	Factors []string
	// Responses are the names of the columns to analyse; nil for every column that is not a factor, in the data's order.
	Responses []string
	// Missing are texts that stand for a lost reading. One that is a number stands for every reading of that value.
	Missing []string
	// MaxRows is the largest number of rows; 0 for no limit beyond 2^30 − 2.
	MaxRows int
	// Place is where the data stand in the request; empty for "data" in ScanJSON and "csv" in ScanCSV.
	Place string
}

// Columns are readings as sent, decoded: a code per row and factor, a number per row and response.
type Columns struct {
	Rows      int
	Factors   []LabelColumn // in the order of Plan.Factors
	Responses []Response    // in the order of Plan.Responses, or of the data
	Ignored   []string      // names of the columns that are neither, in the order of the data

	place    string // where faults in the data are
	pointers bool   // whether a column has a place of its own within it
	laid     bool
}

// LabelColumn is a factor's column: for each row the index of its label, labels being numbered as they first appear.
type LabelColumn struct {
	Name   string
	Codes  Codes
	Labels []string
}

// MaxColumns is the largest number of columns that are read. More are refused as JSON nested too deeply is: what each
// column costs besides its rows must not add up to many times what was sent.
const MaxColumns = 100_000

// maxRows is the largest number of rows that codes can address.
const maxRows = 1<<30 - 2

func (p *Plan) rowLimit() int {
	if p.MaxRows > 0 && p.MaxRows < maxRows {
		return p.MaxRows
	}
	return maxRows
}
