package api

import "encoding/json"

// Term names a term, for people and for machines.
type Term struct {
	Term    string   `json:"term"`
	Crossed []string `json:"crossed"`
	Within  []string `json:"within"`
}

// Envelope stands at the head of every answer.
type Envelope struct {
	ID          json.RawMessage `json:"id,omitempty"`
	Fingerprint string          `json:"fingerprint"`
	Engine      string          `json:"engine"`
}

// DeclaredFactor is a factor as the service understood it, with the symbol that the formulas use.
type DeclaredFactor struct {
	Name       string   `json:"name"`
	Symbol     string   `json:"symbol"`
	Levels     int64    `json:"levels"`
	Effect     string   `json:"effect"`
	Population int64    `json:"population,omitempty"`
	Within     []string `json:"within"`
}

// TermsAnswer answers POST /v1/terms.
type TermsAnswer struct {
	Envelope
	Title        string           `json:"title,omitempty"`
	Observations int64            `json:"observations"`
	Factors      []DeclaredFactor `json:"factors"`
	Terms        []TermLine       `json:"terms"`
	AboveOrder   *AboveOrder      `json:"above_order,omitempty"`
	Impossible   []Impossible     `json:"impossible"`
}

// TermLine is a line of the model before anything is pooled.
type TermLine struct {
	Term
	Effect     string `json:"effect"`
	Order      int    `json:"order"`
	DF         int64  `json:"df"`
	DFFormula  string `json:"df_formula"`
	Negligible bool   `json:"negligible"`
}

// Impossible is an interaction that cannot exist, and the pair of factors that forbids it.
type Impossible struct {
	Factors []string `json:"factors"` // outer, inner
	Because string   `json:"because"`
	Detail  string   `json:"detail"`
}

// AboveOrder stands for the many terms that max_order made negligible.
type AboveOrder struct {
	AboveOrder int   `json:"above_order"`
	Terms      int64 `json:"terms"`
	DF         int64 `json:"df"`
}

// Pooled is a member of a pooled line: a term by name, or the many terms above max_order as one.
type Pooled struct {
	Term  string
	Above *AboveOrder
}

// MarshalJSON writes a string, or the object that stands for many terms.
func (p Pooled) MarshalJSON() ([]byte, error) {
	if p.Above != nil {
		return json.Marshal(p.Above)
	}
	return json.Marshal(p.Term)
}

// UnmarshalJSON reads what MarshalJSON writes.
func (p *Pooled) UnmarshalJSON(text []byte) error {
	if len(text) > 0 && text[0] == '"' {
		return json.Unmarshal(text, &p.Term)
	}
	p.Above = new(AboveOrder)
	return json.Unmarshal(text, p.Above)
}

// ExpectedMeanSquaresAnswer answers POST /v1/expected-mean-squares.
type ExpectedMeanSquaresAnswer struct {
	Envelope
	Title               string               `json:"title,omitempty"`
	Constraint          string               `json:"constraint"`
	Factors             []DeclaredFactor     `json:"factors"`
	ExpectedMeanSquares []ExpectedMeanSquare `json:"expected_mean_squares"`
	Inseparable         [][]string           `json:"inseparable"`
}

// ExpectedMeanSquare is the expectation of one line's mean square.
type ExpectedMeanSquare struct {
	Term
	Effect     string      `json:"effect"`
	DF         int64       `json:"df"`
	Pooled     []Pooled    `json:"pooled"`
	Components []Component `json:"components"`
	Text       string      `json:"text"`
	Latex      string      `json:"latex,omitempty"`
}

// Component is one component of variance in an expectation, with its coefficient.
type Component struct {
	Term
	Effect      string  `json:"effect"`
	Coefficient float64 `json:"coefficient"`
	Exact       string  `json:"exact"`
	Formula     string  `json:"formula"`
	Latex       string  `json:"latex,omitempty"`
}

// TestsAnswer answers POST /v1/tests.
type TestsAnswer struct {
	Envelope
	Title           string `json:"title,omitempty"`
	Constraint      string `json:"constraint"`
	ApproximateForm string `json:"approximate_form"`
	Tests           []Test `json:"tests"`
}

// Test says what tests a term, or why nothing does.
type Test struct {
	Term
	Effect              string    `json:"effect"`
	DF                  int64     `json:"df"`
	Status              string    `json:"status"`
	Numerator           []Weight  `json:"numerator,omitempty"`
	Denominator         []Weight  `json:"denominator,omitempty"`
	Solution            []Share   `json:"solution,omitempty"`
	DFNumerator         Number    `json:"df_numerator,omitzero"`
	DFDenominator       Number    `json:"df_denominator,omitzero"`
	DFNumeratorBounds   []float64 `json:"df_numerator_bounds,omitempty"`
	DFDenominatorBounds []float64 `json:"df_denominator_bounds,omitempty"`
	Unmatched           []string  `json:"unmatched,omitempty"`
	Explanation         string    `json:"explanation"`
	Remedies            []Remedy  `json:"remedies"`
	RemediesComplete    *bool     `json:"remedies_complete,omitempty"`
	LargerSets          string    `json:"larger_sets,omitempty"`
}

// Words for Test.LargerSets: whether there are minimal sets of more than three components to assume zero.
const (
	LargerSetsExist   = "exist"
	LargerSetsNone    = "none"
	LargerSetsUnknown = "unknown"
)

// Share is a line's weight in a combination of mean squares.
type Share struct {
	Term
	Weight float64 `json:"weight"`
	Exact  string  `json:"exact"`
}

// Weight is a Share, with what was pooled into the line.
type Weight struct {
	Share
	Pooled []Pooled `json:"pooled"`
}

// Words for Remedy.Action.
const (
	Replicate  = "replicate"
	AssumeZero = "assume_zero"
)

// Remedy is a change that was applied and derived again, and what it does.
type Remedy struct {
	Action  string         `json:"action"`
	Factors []string       `json:"factors"`
	Terms   []string       `json:"terms,omitempty"`
	Change  Change         `json:"change"`
	Text    string         `json:"text"`
	Effect  []RemedyEffect `json:"effect"`
}

// Change is what a remedy changes in the design, in the design's own fields.
type Change struct {
	Levels     map[string]int64 `json:"levels,omitempty"`
	Replicates int64            `json:"replicates,omitempty"`
	Negligible [][]string       `json:"negligible,omitempty"`
}

// RemedyEffect is a test before and after a remedy.
type RemedyEffect struct {
	Term
	StatusBefore             string    `json:"status_before"`
	StatusAfter              string    `json:"status_after"`
	DFDenominatorBefore      Number    `json:"df_denominator_before,omitzero"`
	DFDenominatorAfter       Number    `json:"df_denominator_after,omitzero"`
	DFDenominatorBoundsAfter []float64 `json:"df_denominator_bounds_after,omitempty"`
	NumeratorAfter           []Weight  `json:"numerator_after,omitempty"`
	DenominatorAfter         []Weight  `json:"denominator_after,omitempty"`
}

// AnovaAnswer answers POST /v1/anova.
type AnovaAnswer struct {
	Envelope
	DataFingerprint string     `json:"data_fingerprint,omitempty"`
	Title           string     `json:"title,omitempty"`
	Constraint      string     `json:"constraint"`
	ApproximateForm string     `json:"approximate_form"`
	Confidence      float64    `json:"confidence"`
	IgnoredColumns  []string   `json:"ignored_columns,omitempty"`
	Analyses        []Analysis `json:"analyses"`
}

// Analysis is the fitted analysis of one response.
type Analysis struct {
	Response     string              `json:"response"`
	Observations int64               `json:"observations"`
	Mean         Number              `json:"mean"`
	Rows         []Row               `json:"rows"`
	Total        Total               `json:"total"`
	Components   []ComponentEstimate `json:"components"`
	Findings     []Finding           `json:"findings"`
}

// Row is a line of the fitted table.
type Row struct {
	Term
	Effect          string   `json:"effect"`
	Negligible      bool     `json:"negligible,omitempty"`
	DF              int64    `json:"df"`
	SS              Number   `json:"ss"`
	SSReason        string   `json:"ss_reason,omitempty"`
	MS              Number   `json:"ms,omitzero"`
	MSReason        string   `json:"ms_reason,omitempty"`
	EMS             string   `json:"ems"`
	F               Number   `json:"f,omitzero"`
	FReason         string   `json:"f_reason,omitempty"`
	DFNumerator     Number   `json:"df_numerator,omitzero"`
	DFDenominator   Number   `json:"df_denominator,omitzero"`
	P               Number   `json:"p,omitzero"`
	PReason         string   `json:"p_reason,omitempty"`
	Status          string   `json:"status,omitempty"`
	SubtractedShare Number   `json:"subtracted_share,omitzero"`
	Pooled          []Pooled `json:"pooled"`
	Numerator       []Weight `json:"numerator,omitempty"`
	Denominator     []Weight `json:"denominator,omitempty"`
	Solution        []Share  `json:"solution,omitempty"`
}

// Total is the whole table's df and sum of squares about the mean.
type Total struct {
	DF       int64  `json:"df"`
	SS       Number `json:"ss"`
	SSReason string `json:"ss_reason,omitempty"`
}

// ComponentEstimate is an estimated component of variance, or the sum of several that occur only together.
type ComponentEstimate struct {
	Terms          []string `json:"terms"`
	Text           string   `json:"text"`
	Negative       bool     `json:"negative,omitempty"`
	Estimate       Number   `json:"estimate"`
	EstimateReason string   `json:"estimate_reason,omitempty"`
	Lower          Number   `json:"lower,omitzero"`
	Upper          Number   `json:"upper,omitzero"`
	IntervalReason string   `json:"interval_reason,omitempty"`
	Confidence     float64  `json:"confidence"`
	Method         string   `json:"method,omitempty"`
}

// Severities of a Finding.
const (
	Stop    = "stop"
	Caution = "caution"
	Note    = "note"
)

// Codes of findings in an analysis.
const (
	// NegativeComponent (note): an estimate of a component of variance is negative.
	NegativeComponent = "negative_component"
	// LargeSubtraction (caution): the error of an approximate test in the difference form is the difference of two
	// quantities of similar size.
	LargeSubtraction = "large_subtraction"
	// NoErrorVariation (caution): the error line of a test shows no variation at all.
	NoErrorVariation = "no_error_variation"
)

// Finding is something the caller should know about the study.
type Finding struct {
	Code     string   `json:"code"`
	Severity string   `json:"severity"`
	Message  string   `json:"message"`
	Where    []string `json:"where"`
	Terms    []string `json:"terms"`
	Remedies []Remedy `json:"remedies"`
}

// Problem is an RFC 9457 problem: what a request gets that cannot be answered.
type Problem struct {
	Type     string         `json:"type"`
	Title    string         `json:"title"`
	Status   int            `json:"status"`
	Detail   string         `json:"detail"`
	Instance string         `json:"instance,omitempty"`
	Errors   []ProblemError `json:"errors,omitempty"`
}

// ProblemError is one fault of a request, with its place.
type ProblemError struct {
	Pointer string `json:"pointer"`
	Code    Code   `json:"code"`
	Detail  string `json:"detail"`
}
