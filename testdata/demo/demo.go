// Package demo is the demonstration study. Its scenario and all its readings are invented: see Readings.
package demo

import (
	_ "embed"
	"fmt"
	"math/rand/v2"
	"strings"
)

// Seed is where the invented readings come from.
const Seed = 20261201

// Design is the study's design as JSON: a biobank compares tube types at three storage temperatures. Freezers are nested in
// temperature and boxes in freezer; every box holds every type of tube; two aliquots of each are measured.
//
//go:embed design.json
var Design string

// Readings are the study's readings as CSV, as Generate makes them.
//
//go:embed readings.csv
var Readings string

// Standard deviations of the invented readings, in mmol/L.
const (
	sdFreezer     = 0.11
	sdBox         = 0.05
	sdFreezerTube = 0.02
	sdBoxTube     = 0.03
	sdAliquot     = 0.06
)

// Generate invents the readings from the seed: serum potassium in mmol/L with two decimals. Tube types differ; storage
// temperatures do not; freezers of one temperature differ more than anything else does.
func Generate() string {
	random := rand.New(rand.NewPCG(Seed, 0)) //nolint:gosec // an invented study, the same every time
	tubes := []struct {
		name   string
		effect float64
	}{{"serum gel", 0}, {"plain", 0.06}, {"lithium heparin", -0.14}}
	var text strings.Builder
	text.WriteString("temperature,freezer,box,tube,potassium\n")
	freezer := 0
	for _, temperature := range []string{"-80", "-30", "4"} {
		for range 3 {
			freezer++
			inFreezer := sdFreezer * random.NormFloat64()
			var byTube [3]float64
			for t := range byTube {
				byTube[t] = sdFreezerTube * random.NormFloat64()
			}
			for box := 1; box <= 4; box++ {
				inBox := sdBox * random.NormFloat64()
				for t, tube := range tubes {
					mean := 4.3 + inFreezer + inBox + tube.effect + byTube[t] + sdBoxTube*random.NormFloat64()
					for range 2 {
						fmt.Fprintf(&text, "%s,F%d,%d,%s,%.2f\n", temperature, freezer, box, tube.name, mean+sdAliquot*random.NormFloat64())
					}
				}
			}
		}
	}
	return text.String()
}
