package engine

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"guardrow/api"
)

// MaxName is the largest number of characters in a factor's name or a level's label.
const MaxName = 200

// Exclusive bound on the product of all counts: below it every count is exact as a double too.
const tooLarge = 1 << 53

// Check reads a declared design and returns it checked, or everything that is wrong with it. Places are relative to the
// design ("factors/2/within/0").
func Check(declared *api.Design) (*Design, []Fault) {
	c := checker{declared: declared, index: make(map[string]int, len(declared.Factors))}
	d := &Design{title: declared.Title, restricted: declared.Constraint == api.Restricted, replicates: 1}
	if len(declared.Factors) == 0 {
		c.fault(api.EmptyDesign, "factors", "The design has no factors. Declare at least one, with its name, levels and effect.")
	}
	if len(declared.Factors) > MaxFactors {
		c.fault(api.TooManyFactors, "factors", "The design has %d factors; at most %d can be taken. Leave out those that play no part in the question, or join factors that are always varied together.", len(declared.Factors), MaxFactors)
	}
	c.names()
	for i := range declared.Factors {
		d.factors = append(d.factors, c.factor(i))
	}
	c.symbols(d.factors)
	c.nesting(d.factors)
	c.counts(d)
	if len(c.faults) > 0 {
		return nil, c.faults
	}
	d.arrange()
	c.negligible(d)
	if len(c.faults) > 0 {
		return nil, c.faults
	}
	return d, nil
}

// checker collects the faults of one declared design.
type checker struct {
	declared *api.Design
	index    map[string]int // first factor of each name
	faults   []Fault
}

func (c *checker) fault(code api.Code, place, format string, args ...any) {
	c.faults = append(c.faults, Fault{code, place, fmt.Sprintf(format, args...)})
}

func (c *checker) names() {
	for i, f := range c.declared.Factors {
		place := fmt.Sprintf("factors/%d/name", i)
		if what := nameFault(f.Name); what != "" {
			c.fault(api.InvalidName, place, "The name %s %s", Quote(f.Name), what)
		}
		if first, taken := c.index[f.Name]; taken {
			c.fault(api.DuplicateName, place, "The name %s is already that of factor %d. Give each factor a name of its own.", Quote(f.Name), first+1)
			continue
		}
		c.index[f.Name] = i
	}
}

// nameFault says what is wrong with a factor's name, or nothing.
func nameFault(name string) string {
	switch {
	case name == "":
		return "is empty. Give the factor a name."
	case utf8.RuneCountInString(name) > MaxName:
		return fmt.Sprintf("has %d characters; use at most %d.", utf8.RuneCountInString(name), MaxName)
	case strings.TrimSpace(name) != name:
		return "begins or ends with a blank. Remove it."
	case strings.ContainsAny(name, "×(),") || strings.ContainsFunc(name, isBreak):
		return "contains one of × ( ) , or a line break or control character; these are kept for writing terms. Use other characters."
	case strings.EqualFold(name, api.Residual):
		return "is the name of the last line of every analysis. Use another."
	}
	return ""
}

func isBreak(r rune) bool { return unicode.IsControl(r) || r == '\u2028' || r == '\u2029' }

func (c *checker) factor(i int) Factor {
	f := c.declared.Factors[i]
	place := "factors/" + strconv.Itoa(i)
	checked := Factor{Name: f.Name, Symbol: strings.ToUpper(f.Symbol), Levels: f.Levels.Count, Labels: f.Levels.Labels, Random: f.Effect == api.Random}
	if f.Effect != api.Fixed && f.Effect != api.Random {
		c.fault("not_in_enumeration", place+"/effect", "The effect of %s is neither fixed nor random. Say which.", Quote(f.Name))
	}
	if f.Levels.Count < 1 {
		c.fault(api.InvalidLevels, place+"/levels", "The factor %s has %d levels; it needs at least 1.", Quote(f.Name), f.Levels.Count)
	}
	c.labels(place+"/levels", f)
	if f.Population != nil {
		checked.Population = int64(*f.Population)
		c.population(place+"/population", f)
	}
	c.within(place+"/within", f, &checked)
	return checked
}

func (c *checker) labels(place string, f api.Factor) {
	seen := make(map[string]int, len(f.Levels.Labels))
	for j, label := range f.Levels.Labels {
		at := place + "/" + strconv.Itoa(j)
		switch {
		case label == "":
			c.fault(api.InvalidLabel, at, "Level %d of %s has an empty label. Write the label as it stands in the data.", j+1, Quote(f.Name))
		case utf8.RuneCountInString(label) > MaxName || strings.ContainsFunc(label, isBreak):
			c.fault(api.InvalidLabel, at, "The label %s of %s is longer than %d characters or holds a line break or control character. Use a shorter, plain label.", Quote(label), Quote(f.Name), MaxName)
		}
		if first, taken := seen[label]; taken {
			c.fault(api.DuplicateLabel, at, "The label %s of %s is already that of level %d. Labels of one factor differ; the numbers 1 and 1.0 and the text \"1\" are one label.", Quote(label), Quote(f.Name), first+1)
			continue
		}
		seen[label] = j
	}
}

func (c *checker) population(place string, f api.Factor) {
	size := int64(*f.Population)
	if size < f.Levels.Count {
		c.fault(api.PopulationBelowLevels, place, "The population of %s is %d, but %d levels were drawn from it. Give the size of the whole population, or leave it out if it is unlimited.", Quote(f.Name), size, f.Levels.Count)
	}
	if size >= tooLarge {
		c.fault(api.DesignTooLarge, place, "The population of %s is 2^53 or more. Leave it out: a population so large is as good as unlimited.", Quote(f.Name))
	}
	if f.Effect == api.Fixed {
		c.fault(api.PopulationOfFixed, place, "The factor %s is fixed, so its levels are all there are. Leave out the population, or make the factor random.", Quote(f.Name))
	}
	if c.declared.Constraint != api.Restricted {
		c.fault(api.PopulationUnrestricted, place, "A finite population has no meaning under the unrestricted constraint. Leave it out, or set \"constraint\": \"restricted\".")
	}
}

func (c *checker) within(place string, f api.Factor, checked *Factor) {
	for j, parent := range f.Within {
		at := place + "/" + strconv.Itoa(j)
		p, known := c.index[parent]
		switch {
		case !known:
			c.fault(api.UnknownFactor, at, "%s is said to be nested in %s, but no factor has that name.%s", Quote(f.Name), Quote(parent), c.nearest(parent))
		case p >= MaxFactors: // already reported as too many factors
		case checked.Parents.Has(p):
			c.fault(api.RepeatedFactor, at, "%s is named twice among the factors that %s is nested in. Name it once.", Quote(parent), Quote(f.Name))
		default:
			checked.Parents |= SetOf(p)
		}
	}
}

func (c *checker) nearest(name string) string {
	names := make([]string, len(c.declared.Factors))
	for i, f := range c.declared.Factors {
		names[i] = f.Name
	}
	return DidYouMean(name, names)
}

// symbols checks the given symbols and gives one to each factor that has none: the next free capital letter.
func (c *checker) symbols(factors []Factor) {
	taken := map[string]int{"N": -1}
	for i, f := range factors {
		place := fmt.Sprintf("factors/%d/symbol", i)
		switch {
		case f.Symbol == "":
			continue
		case len(f.Symbol) != 1 || f.Symbol[0] < 'A' || f.Symbol[0] > 'Z' || f.Symbol == "N":
			c.fault(api.InvalidSymbol, place, "The symbol %s of %s is not one letter from A to Z other than N, which stands for the replicates. Use another letter, or leave it out.", Quote(c.declared.Factors[i].Symbol), Quote(f.Name))
			continue
		}
		if first, twice := taken[f.Symbol]; twice {
			c.fault(api.DuplicateSymbol, place, "The symbol %s of %s is already that of %s; capitals and small letters count as one. Use another letter, or leave it out.", Quote(c.declared.Factors[i].Symbol), Quote(f.Name), Quote(factors[first].Name))
			continue
		}
		taken[f.Symbol] = i
	}
	next := byte('A')
	for i := range factors {
		if factors[i].Symbol != "" {
			continue
		}
		for ; next < 'Z'; next++ {
			if _, used := taken[string(next)]; !used {
				break
			}
		}
		factors[i].Symbol = string(next)
		taken[factors[i].Symbol] = i
	}
}

// nesting closes the relation "is nested in" and reports every cycle once.
func (c *checker) nesting(factors []Factor) {
	for i := range factors {
		factors[i].Above = factors[i].Parents
	}
	for range factors {
		for i := range factors {
			for _, p := range factors[i].Above.Members() {
				factors[i].Above |= factors[p].Above
			}
		}
	}
	var reported Set
	for i := range min(len(factors), MaxFactors) {
		if !factors[i].Above.Has(i) || reported.Has(i) {
			continue
		}
		path := cycle(factors, i)
		names := make([]string, len(path))
		for k, j := range path {
			names[k] = Quote(factors[j].Name)
			reported |= SetOf(j)
		}
		// All factors of this knot are reported with this one.
		for j := range min(len(factors), MaxFactors) {
			if factors[i].Above.Has(j) && factors[j].Above.Has(i) {
				reported |= SetOf(j)
			}
		}
		c.fault(api.NestingCycle, fmt.Sprintf("factors/%d/within", i), "The nesting runs in a circle: %s. A factor cannot be nested in itself; remove one of these from a \"within\".", strings.Join(names, " within "))
	}
}

// cycle returns a shortest way from factor i back to itself along parents.
func cycle(factors []Factor, i int) []int {
	from := make([]int, len(factors))
	for j := range from {
		from[j] = -1
	}
	queue := []int{i}
	for len(queue) > 0 {
		j := queue[0]
		queue = queue[1:]
		if factors[j].Parents.Has(i) {
			path := []int{i}
			for ; j != i; j = from[j] {
				path = append(path, j)
			}
			path = append(path, i)
			for a, b := 1, len(path)-2; a < b; a, b = a+1, b-1 {
				path[a], path[b] = path[b], path[a]
			}
			return path
		}
		for _, p := range factors[j].Parents.Members() {
			if p != i && from[p] < 0 {
				from[p] = j
				queue = append(queue, p)
			}
		}
	}
	return []int{i, i}
}

// counts checks the replicates, max_order and the size of the whole.
func (c *checker) counts(d *Design) {
	if r := c.declared.Replicates; r != nil {
		d.replicates = int64(*r)
		if d.replicates < 1 {
			c.fault(api.InvalidReplicates, "replicates", "There are %d observations per cell; there must be at least 1.", d.replicates)
		}
	}
	if m := c.declared.MaxOrder; m != nil {
		d.maxOrder = int(*m)
		if d.maxOrder < 1 {
			c.fault(api.InvalidMaxOrder, "max_order", "max_order is %d; it must be at least 1. Leave it out to keep every term.", d.maxOrder)
		}
	}
	total := max(d.replicates, 1)
	for _, f := range d.factors {
		next, fits := multiply(total, max(f.Levels, 1))
		if !fits || next >= tooLarge {
			c.fault(api.DesignTooLarge, "factors", "The level counts and the replicates multiply to 2^53 or more. A nested factor's levels are counted per level of what it is nested in, not in all; check the counts.")
			return
		}
		total = next
	}
	if total >= tooLarge {
		c.fault(api.DesignTooLarge, "replicates", "There are 2^53 or more observations. Check the number of replicates.")
	}
}

// negligible resolves the terms declared null.
func (c *checker) negligible(d *Design) {
	d.declared = make(map[Set]bool, len(c.declared.Negligible))
	for i, ref := range c.declared.Negligible {
		place := fmt.Sprintf("negligible/%d", i)
		s, fault := d.Resolve(ref)
		switch {
		case fault != nil:
			fault.Place = place + fault.Place
			c.faults = append(c.faults, *fault)
		case s == d.Residual():
			c.fault(api.NegligibleResidual, place, "The residual cannot be assumed null: every mean square holds it. Remove it from the list.")
		default:
			d.declared[s] = true
		}
	}
	d.markNegligible()
}
