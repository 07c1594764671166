package api

import "encoding/json"

// TermsRequest asks POST /v1/terms for the terms of a design.
type TermsRequest struct {
	ID     json.RawMessage `json:"id,omitempty"`
	Design *Design         `json:"design"`
	Only   []TermRef       `json:"only,omitempty"`
}

// ExpectedMeanSquaresRequest asks POST /v1/expected-mean-squares for the expectation of every line.
type ExpectedMeanSquaresRequest struct {
	ID     json.RawMessage `json:"id,omitempty"`
	Design *Design         `json:"design"`
	Only   []TermRef       `json:"only,omitempty"`
	Latex  bool            `json:"latex,omitempty"`
}

// TestsRequest asks POST /v1/tests for the F-test of every term.
type TestsRequest struct {
	ID              json.RawMessage     `json:"id,omitempty"`
	Design          *Design             `json:"design"`
	Only            []TermRef           `json:"only,omitempty"`
	ApproximateForm string              `json:"approximate_form,omitempty"`
	Components      []ComponentVariance `json:"components,omitempty"`
}

// ComponentVariance states the variance of a random term. A component left out is 0, the residual apart.
type ComponentVariance struct {
	Term     TermRef `json:"term"`
	Variance float64 `json:"variance"`
}

// AnovaRequest asks POST /v1/anova for the fitted analysis. The bulk columns (data, or csv) never become a Go value of
// this shape: engine/data reads them straight from the text.
type AnovaRequest struct {
	ID              json.RawMessage `json:"id,omitempty"`
	Design          *Design         `json:"design"`
	Only            []TermRef       `json:"only,omitempty"`
	Responses       []string        `json:"responses,omitempty"`
	Missing         []string        `json:"missing,omitempty"`
	ApproximateForm string          `json:"approximate_form,omitempty"`
	Confidence      *float64        `json:"confidence,omitempty"`
	DataFingerprint bool            `json:"data_fingerprint,omitempty"`
}
