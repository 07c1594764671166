package api

import "strings"

// Rules on declared designs and on the terms that a request names. All are answered with 422.
const (
	// EmptyDesign: a design has at least one factor.
	EmptyDesign Code = "empty_design"
	// TooManyFactors: a design has at most 16 factors.
	TooManyFactors Code = "too_many_factors"
	// InvalidName: a factor's name is 1 to 200 characters without ×, brackets, commas, line breaks or outer blanks, and is
	// not the word residual.
	InvalidName Code = "invalid_name"
	// DuplicateName: no two factors have the same name.
	DuplicateName Code = "duplicate_name"
	// InvalidSymbol: a symbol is one letter A to Z, not N.
	InvalidSymbol Code = "invalid_symbol"
	// DuplicateSymbol: symbols are unique, ignoring case.
	DuplicateSymbol Code = "duplicate_symbol"
	// InvalidLevels: a factor has at least one level.
	InvalidLevels Code = "invalid_levels"
	// InvalidLabel: a level's label is 1 to 200 characters without line breaks.
	InvalidLabel Code = "invalid_label"
	// DuplicateLabel: a factor's labels differ from each other.
	DuplicateLabel Code = "duplicate_label"
	// PopulationBelowLevels: a population holds at least the levels that were drawn from it.
	PopulationBelowLevels Code = "population_below_levels"
	// PopulationOfFixed: only a random factor's levels are drawn from a population.
	PopulationOfFixed Code = "population_of_fixed"
	// PopulationUnrestricted: finite populations have a meaning under the restricted constraint only.
	PopulationUnrestricted Code = "population_unrestricted"
	// UnknownFactor: a name refers to a declared factor.
	UnknownFactor Code = "unknown_factor"
	// RepeatedFactor: a list of factors names each once.
	RepeatedFactor Code = "repeated_factor"
	// NestingCycle: no factor is nested in itself, directly or through others.
	NestingCycle Code = "nesting_cycle"
	// InvalidReplicates: there is at least one observation per cell.
	InvalidReplicates Code = "invalid_replicates"
	// InvalidMaxOrder: max_order is at least 1.
	InvalidMaxOrder Code = "invalid_max_order"
	// DesignTooLarge: all counts multiply to less than 2^53.
	DesignTooLarge Code = "design_too_large"
	// UnknownTerm: a term that a request names exists in the design.
	UnknownTerm Code = "unknown_term"
	// NegligibleResidual: the residual cannot be assumed null.
	NegligibleResidual Code = "negligible_residual"
	// NoSuchLine: a line or a component that a request asks for exists once negligible terms are pooled.
	NoSuchLine Code = "no_such_line"
	// TooManyTerms: an answer lists at most 8,192 terms.
	TooManyTerms Code = "too_many_terms"
	// TooManyComponents: an answer holds at most 250,000 components or weights, fewer where names are long.
	TooManyComponents Code = "too_many_components"
	// InvalidVariance: a variance is a finite number, at least 0, and above 0 for the residual.
	InvalidVariance Code = "invalid_variance"
	// RepeatedComponent: each component is given once.
	RepeatedComponent Code = "repeated_component"
	// ComponentOfFixed: only random terms have a variance.
	ComponentOfFixed Code = "component_of_fixed"
	// MissingResidual: where components are given, the residual's variance is among them.
	MissingResidual Code = "missing_residual"
	// InvalidConfidence: a confidence level is above 0 and below 1.
	InvalidConfidence Code = "invalid_confidence"
)

func designRules() []Entry {
	terms := func(design string) Example {
		return Example{Path: "/v1/terms", Body: `{"design": ` + design + `}`}
	}
	tests := func(components string) Example {
		return Example{Path: "/v1/tests", Body: `{"design": {"factors": [{"name": "batch", "levels": 4, "effect": "random"}, {"name": "dose", "levels": 3, "effect": "fixed"}], "replicates": 2}, "components": ` + components + `}`}
	}
	random := func(names string) string {
		factors := make([]string, 0, len(names))
		for _, name := range names {
			factors = append(factors, `{"name": "`+string(name)+`", "levels": 2, "effect": "random"}`)
		}
		return strings.Join(factors, ", ")
	}
	rules := []Entry{
		{Code: EmptyDesign, Rule: "A design has at least one factor.", Example: terms(`{"factors": []}`)},
		{Code: TooManyFactors, Rule: "A design has at most 16 factors.", Example: terms(`{"factors": [` + random("ABCDEFGHIJKLMOPQR") + `]}`)},
		{Code: InvalidName, Rule: "A factor's name is 1 to 200 characters long, has no ×, brackets, commas, line breaks or outer blanks, and is not the word residual.", Example: terms(`{"factors": [{"name": "rack (left)", "levels": 2, "effect": "fixed"}]}`)},
		{Code: DuplicateName, Rule: "No two factors have the same name.", Example: terms(`{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}, {"name": "rack", "levels": 3, "effect": "random"}]}`)},
		{Code: InvalidSymbol, Rule: "A symbol is one letter from A to Z, and not N, which stands for the replicates.", Example: terms(`{"factors": [{"name": "rack", "symbol": "N", "levels": 2, "effect": "fixed"}]}`)},
		{Code: DuplicateSymbol, Rule: "Symbols are unique, ignoring case.", Example: terms(`{"factors": [{"name": "rack", "symbol": "R", "levels": 2, "effect": "fixed"}, {"name": "reader", "symbol": "r", "levels": 2, "effect": "fixed"}]}`)},
		{Code: InvalidLevels, Rule: "A factor has at least one level.", Example: terms(`{"factors": [{"name": "rack", "levels": 0, "effect": "fixed"}]}`)},
		{Code: InvalidLabel, Rule: "A level's label is 1 to 200 characters long and has no line breaks.", Example: terms(`{"factors": [{"name": "rack", "levels": ["", "left"], "effect": "fixed"}]}`)},
		{Code: DuplicateLabel, Rule: "A factor's labels differ from each other.", Example: terms(`{"factors": [{"name": "rack", "levels": ["1", 1.0], "effect": "fixed"}]}`)},
		{Code: PopulationBelowLevels, Rule: "A population holds at least the levels that were drawn from it.", Example: terms(`{"factors": [{"name": "ward", "levels": 4, "effect": "random", "population": 3}], "constraint": "restricted"}`)},
		{Code: PopulationOfFixed, Rule: "Only a random factor's levels are drawn from a population.", Example: terms(`{"factors": [{"name": "ward", "levels": 4, "effect": "fixed", "population": 9}], "constraint": "restricted"}`)},
		{Code: PopulationUnrestricted, Rule: "Finite populations have a meaning under the restricted constraint only.", Example: terms(`{"factors": [{"name": "ward", "levels": 4, "effect": "random", "population": 9}]}`)},
		{Code: UnknownFactor, Rule: "A name refers to a declared factor.", Example: terms(`{"factors": [{"name": "box", "levels": 4, "effect": "random", "within": ["freezr"]}]}`)},
		{Code: RepeatedFactor, Rule: "A list of factors names each once.", Example: terms(`{"factors": [{"name": "freezer", "levels": 2, "effect": "random"}, {"name": "box", "levels": 4, "effect": "random", "within": ["freezer", "freezer"]}]}`)},
		{Code: NestingCycle, Rule: "No factor is nested in itself, directly or through others.", Example: terms(`{"factors": [{"name": "box", "levels": 4, "effect": "random", "within": ["rack"]}, {"name": "rack", "levels": 2, "effect": "random", "within": ["box"]}]}`)},
		{Code: InvalidReplicates, Rule: "There is at least one observation per cell.", Example: terms(`{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}], "replicates": 0}`)},
		{Code: InvalidMaxOrder, Rule: "max_order is at least 1.", Example: terms(`{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}], "max_order": 0}`)},
		{Code: DesignTooLarge, Rule: "All level counts and the replicates multiply to less than 2^53.", Example: terms(`{"factors": [{"name": "rack", "levels": 100000000, "effect": "random"}, {"name": "slot", "levels": 100000000, "effect": "random"}]}`)},
		{Code: UnknownTerm, Rule: "A term that a request names exists in the design.", Example: terms(`{"factors": [{"name": "freezer", "levels": 2, "effect": "random"}, {"name": "box", "levels": 4, "effect": "random", "within": ["freezer"]}], "negligible": ["freezer × box"]}`)},
		{Code: NegligibleResidual, Rule: "The residual cannot be assumed null.", Example: terms(`{"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}], "negligible": ["residual"]}`)},
		{Code: NoSuchLine, Rule: "A line or a component that a request asks for exists once negligible terms are pooled; the residual has no test.", Example: Example{Path: "/v1/tests", Body: `{"design": {"factors": [{"name": "batch", "levels": 4, "effect": "random"}, {"name": "dose", "levels": 3, "effect": "fixed"}], "negligible": [["batch", "dose"]]}, "only": ["batch × dose"]}`}},
		{Code: TooManyTerms, Rule: "An answer lists at most 8,192 terms; max_order or only make it shorter.", Example: terms(`{"factors": [` + random("ABCDEFGHIJKLMOPQ") + `]}`)},
		{Code: TooManyComponents, Rule: "An answer holds at most 250,000 components or weights, fewer where names are long; max_order or only make it shorter.", Example: Example{Path: "/v1/expected-mean-squares", Body: `{"design": {"factors": [` + random("ABCDEFGHIJKLM") + `]}}`}},
		{Code: InvalidVariance, Rule: "A variance is a finite number, at least 0, and above 0 for the residual.", Example: tests(`[{"term": "residual", "variance": 0}]`)},
		{Code: RepeatedComponent, Rule: "Each component is given once.", Example: tests(`[{"term": "residual", "variance": 1}, {"term": "batch", "variance": 1}, {"term": ["batch"], "variance": 2}]`)},
		{Code: ComponentOfFixed, Rule: "Only random terms have a variance.", Example: tests(`[{"term": "residual", "variance": 1}, {"term": "dose", "variance": 1}]`)},
		{Code: MissingResidual, Rule: "Where components are given, the residual's variance is among them.", Example: tests(`[{"term": "batch", "variance": 1}]`)},
		{Code: InvalidConfidence, Rule: "A confidence level is above 0 and below 1.", Example: Example{Path: "/v1/anova", Body: `{"design": {"factors": [{"name": "rack", "levels": 2, "effect": "fixed"}], "replicates": 2}, "data": {"rack": [1, 1, 2, 2], "volume": [4.1, 4.3, 4.0, 4.4]}, "confidence": 95}`}},
	}
	for i := range rules {
		rules[i].Status = 422
	}
	return rules
}
