package api

// Rules on the data. All are answered with 422.
const ()

func dataRules() []Entry { return nil }
