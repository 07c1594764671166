// Package api is the contract of guardrow: the embedded OpenAPI document, the JSON shapes it declares as Go types, and
// the catalogue of error codes. It has no behaviour beyond reading and writing those shapes; what they mean is in engine.
package api
