package api

import (
	"strconv"
	"strings"
)

// Rules on the data. All are answered with 422.
const (
	// RepeatedResponse: a list of responses names each once.
	RepeatedResponse Code = "repeated_response"
	// ResponseIsFactor: a column is a response or a factor, not both.
	ResponseIsFactor Code = "response_is_factor"
	// NoResponse: there is at least one response.
	NoResponse Code = "no_response"
	// DuplicateColumn: no two columns have the same name.
	DuplicateColumn Code = "duplicate_column"
	// MissingColumn: the data have a column for every factor and every response.
	MissingColumn Code = "missing_column"
	// NotAColumn: a column is an array.
	NotAColumn Code = "not_a_column"
	// UnequalColumns: all columns are of one length.
	UnequalColumns Code = "unequal_columns"
	// NoRows: there is at least one row.
	NoRows Code = "no_rows"
	// TooManyRows: the data have at most as many rows as the service takes.
	TooManyRows Code = "too_many_rows"
	// InvalidCSV: a CSV text is UTF-8, has a header, and its quotes are as RFC 4180 has them.
	InvalidCSV Code = "invalid_csv"
	// RaggedRow: every row of a CSV text has as many cells as its header.
	RaggedRow Code = "ragged_row"
	// LostReading: no reading is null, empty, or one of the texts in missing.
	LostReading Code = "lost_reading"
	// NonNumericReading: a reading is a number.
	NonNumericReading Code = "non_numeric_reading"
	// ReadingOutOfRange: a reading is within the range of a double.
	ReadingOutOfRange Code = "reading_out_of_range"
	// MissingLabel: every row has a label for every factor.
	MissingLabel Code = "missing_label"
	// UnusableLabel: a label is a text, or a number within the range of a double.
	UnusableLabel Code = "unusable_label"
	// UnknownLabel: where a factor's labels are listed, the data use no others.
	UnknownLabel Code = "unknown_label"
	// TooManyLevels: the data have no more levels of a factor than are declared.
	TooManyLevels Code = "too_many_levels"
	// TooFewLevels: the data have no fewer levels of a factor than are declared.
	TooFewLevels Code = "too_few_levels"
	// MissingReadings: every cell has as many readings as there are replicates, not fewer.
	MissingReadings Code = "missing_readings"
	// SurplusReadings: no cell has more readings than there are replicates.
	SurplusReadings Code = "surplus_readings"
)

// RowLimitOfExample is the row limit of the service to which the example of TooManyRows is to be posted: no usual limit
// makes for an example of a readable size. No other example has as many rows.
const RowLimitOfExample = 100

func dataRules() []Entry {
	anova := func(factors, rest string) Example {
		return Example{Path: "/v1/anova", Body: `{"design": {"factors": [` + factors + `]}, ` + rest + `}`}
	}
	// Two readers of plates, and lamps in two ovens: invented.
	reader := func(rest string) Example {
		return anova(`{"name": "reader", "levels": ["left", "right"], "effect": "fixed"}`, rest)
	}
	lamp := func(rest string) Example {
		return anova(`{"name": "oven", "levels": 2, "effect": "random"}, {"name": "lamp", "levels": 2, "effect": "random", "within": ["oven"]}`, rest)
	}
	many := func(n int) string {
		labels := make([]string, n)
		for i := range labels {
			labels[i] = strconv.Itoa(i + 1)
		}
		return strings.Join(labels, ", ")
	}
	rules := []Entry{
		{Code: RepeatedResponse, Rule: "The list of responses names each column once.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, 0.29]}, "responses": ["density", "density"]`)},
		{Code: ResponseIsFactor, Rule: "A column is a response or a factor, not both.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, 0.29]}, "responses": ["density", "reader"]`)},
		{Code: NoResponse, Rule: "The data have at least one response: a column that is not a factor.", Example: reader(`"data": {"reader": ["left", "right"]}`)},
		{Code: DuplicateColumn, Rule: "No two columns have the same name.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, 0.29], "density": [0.33, 0.3]}`)},
		{Code: MissingColumn, Rule: "The data have a column for every factor and for every response that is named.", Example: reader(`"data": {"readr": ["left", "right"], "density": [0.31, 0.29]}, "responses": ["density"]`)},
		{Code: NotAColumn, Rule: "A column is an array with one value per row.", Example: reader(`"data": {"reader": ["left", "right"], "density": 0.31}`)},
		{Code: UnequalColumns, Rule: "All columns are of one length.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, 0.29, 0.3]}`)},
		{Code: NoRows, Rule: "The data have at least one row.", Example: reader(`"data": {"reader": [], "density": []}`)},
		{Code: TooManyRows, Rule: "The data have at most as many rows as the service takes.", Example: reader(`"data": {"reader": [` + many(RowLimitOfExample+1) + `], "density": [` + many(RowLimitOfExample+1) + `]}`)},
		{Code: InvalidCSV, Rule: "A CSV text is UTF-8, begins with a header, and closes every quotation mark that it opens, as RFC 4180 has it.", Example: reader(`"csv": "reader,density\n\"left,0.31\nright,0.29\n"`)},
		{Code: RaggedRow, Rule: "Every row of a CSV text has as many cells as its header.", Example: reader(`"csv": "reader,density\nleft,0.31\nright\n"`)},
		{Code: LostReading, Rule: "No reading is lost: none is null, an empty cell, or one of the texts in missing. A lost reading is never taken as a zero.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, null]}`)},
		{Code: NonNumericReading, Rule: "A reading is a number, not a text, true, false, an array or an object.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, "NaN"]}`)},
		{Code: ReadingOutOfRange, Rule: "A reading lies within the range of a double: at most 1.797e308 in size and, unless it is 0, no nearer to it than 5e-324.", Example: reader(`"data": {"reader": ["left", "right"], "density": [0.31, 1e400]}`)},
		{Code: MissingLabel, Rule: "Every row has a label for every factor; null and the empty text are none.", Example: reader(`"data": {"reader": ["left", null], "density": [0.31, 0.29]}`)},
		{Code: UnusableLabel, Rule: "A label is a text, or a number within the range of a double.", Example: reader(`"data": {"reader": ["left", true], "density": [0.31, 0.29]}`)},
		{Code: UnknownLabel, Rule: "Where the design lists a factor's labels, the data use no others.", Example: reader(`"data": {"reader": ["left", "Right"], "density": [0.31, 0.29]}`)},
		{Code: TooManyLevels, Rule: "The data have no more levels of a factor, for a nested one within any level of what it is nested in, than the design declares.", Example: lamp(`"data": {"oven": ["a", "a", "a", "b"], "lamp": [1, 2, 3, 1], "hours": [812, 790, 805, 798]}`)},
		{Code: TooFewLevels, Rule: "The data have no fewer levels of a factor, for a nested one within any level of what it is nested in, than the design declares.", Example: lamp(`"data": {"oven": ["a", "a", "b", "b"], "lamp": [1, 2, 1, 1], "hours": [812, 790, 805, 798]}`)},
		{Code: MissingReadings, Rule: "Every cell of the design has as many readings as there are replicates, not fewer.", Example: reader(`"data": {"reader": ["left", "left"], "density": [0.31, 0.29]}`)},
		{Code: SurplusReadings, Rule: "No cell of the design has more readings than there are replicates.", Example: reader(`"data": {"reader": ["left", "right", "right"], "density": [0.31, 0.29, 0.3]}`)},
	}
	for i := range rules {
		rules[i].Status = 422
	}
	return rules
}
