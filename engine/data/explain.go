package data

import "guardrow/engine"

func explain(design *engine.Design, columns *Columns) []engine.Fault { panic("data: not yet") }
