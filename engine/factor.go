package engine

// Factor is a classification of the observations, as checked.
type Factor struct {
	Name       string
	Symbol     string   // one capital letter, given or assigned
	Levels     int64    // per combination of the levels of the factors it is nested in
	Labels     []string // the levels' labels in the order given; nil where only a count was given
	Random     bool
	Population int64 // size of the finite population that a random factor's levels came from; 0 if infinite
	Parents    Set   // the factors it is directly nested in, as declared
	Above      Set   // all factors it is nested in
}
