package answer

import (
	"fmt"
	"math"

	"guardrow/api"
	"guardrow/engine"
	"guardrow/engine/ems"
)

// variances reads the components of variance that a request supplies; nil where it supplies none.
func variances(m *ems.Model, components []api.ComponentVariance) (map[engine.Set]float64, []engine.Fault) {
	if components == nil {
		return nil, nil
	}
	d := m.Design
	var faults []engine.Fault
	fault := func(code api.Code, place, format string, args ...any) {
		faults = append(faults, engine.Fault{Code: code, Place: place, Detail: fmt.Sprintf(format, args...)})
	}
	given := make(map[engine.Set]float64, len(components))
	for i, c := range components {
		place := fmt.Sprintf("components/%d", i)
		s, problem := d.Resolve(c.Term)
		if problem != nil {
			problem.Place = place + "/term" + problem.Place
			faults = append(faults, *problem)
			continue
		}
		name := engine.Quote(d.Name(s))
		if _, twice := given[s]; twice {
			fault(api.RepeatedComponent, place+"/term", "The component of %s is given twice. Give it once.", name)
		}
		given[s] = c.Variance
		switch {
		case !d.IsRandom(s):
			fault(api.ComponentOfFixed, place+"/term", "The term %s is fixed: it has effects, not a variance. Give variances of random terms only.", name)
		case m.Line(s) < 0:
			fault(api.NoSuchLine, place+"/term", "The term %s was declared negligible, so its component is 0. Leave it out, or keep the term in the model.", name)
		}
		switch {
		case math.IsNaN(c.Variance) || math.IsInf(c.Variance, 0) || c.Variance < 0:
			fault(api.InvalidVariance, place+"/variance", "The variance of %s is not a finite number of at least 0. A variance is a square; give it as such.", name)
		case c.Variance == 0 && s == d.Residual():
			fault(api.InvalidVariance, place+"/variance", "The variance of the residual is 0, but repeated readings always differ somewhat. Give a value above 0.")
		}
	}
	if _, ok := given[d.Residual()]; !ok {
		fault(api.MissingResidual, "components", "The variance of the residual is missing. Other components left out count as 0, but the residual's has no default; add {\"term\": \"residual\", \"variance\": …}.")
	}
	return given, faults
}
