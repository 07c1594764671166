package api

// Rules on a request's form, answered before anything is computed.
const ()

func requestRules() []Entry { return nil }
