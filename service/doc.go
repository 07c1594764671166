// Package service is guardrow over HTTP: it splits, validates, decodes and admits requests, calls the engine, turns faults into
// problems (RFC 9457), and observes. It serves what the contract in package api describes, and nothing else.
//
// A POST takes this way:
//
//	body (bounded in size and time) → split (envelope | readings) → shape (checker) → strict decode → room to work
//	  → engine → answer, or faults → problem
package service
