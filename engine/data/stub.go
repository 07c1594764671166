package data

import "guardrow/engine"

// ScanCSV is being written.
func ScanCSV(text []byte, plan Plan) (*Columns, []engine.Fault) { panic("data: not yet") }

// ScanJSON is being written.
func ScanJSON(text []byte, plan Plan) (*Columns, []engine.Fault, error) { panic("data: not yet") }

// ScanCSVString is being written.
func ScanCSVString(text []byte, plan Plan) (*Columns, []engine.Fault, error) { panic("data: not yet") }

// Lay is being written.
func Lay(design *engine.Design, columns *Columns) (*Grid, []engine.Fault) { panic("data: not yet") }

// Fingerprint is being written.
func Fingerprint(columns *Columns) string { panic("data: not yet") }
