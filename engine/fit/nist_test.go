package fit

import (
	"bufio"
	"encoding/json"
	"math"
	"math/big"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"guardrow/engine/data"
)

// nistDir holds the Statistical Reference Datasets; see its SOURCE.
const nistDir = "../../testdata/nist"

// nistSet is a data file: the readings by group, and the certified values.
type nistSet struct {
	groups             []string
	readings           []string
	between, within    float64 // certified sums of squares
	dfBetween          float64
	dfWithin           float64
	f, residualSD      float64
	replicates, levels int
}

// readNIST reads a file in the layout that all of them share: certified values on lines 41 to 47, data from line 61.
func readNIST(t *testing.T, name string) nistSet {
	t.Helper()
	file, err := os.Open(filepath.Join(nistDir, name+".dat"))
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close() //nolint:errcheck // only read
	var set nistSet
	groups := map[string]bool{}
	scanner := bufio.NewScanner(file)
	for line := 1; scanner.Scan(); line++ {
		fields := strings.Fields(scanner.Text())
		n := len(fields)
		switch {
		case n == 0:
		case line < 60 && fields[0] == "Between":
			set.dfBetween, set.between, set.f = number(t, fields[n-4]), number(t, fields[n-3]), number(t, fields[n-1])
		case line < 60 && fields[0] == "Within":
			set.dfWithin, set.within = number(t, fields[n-3]), number(t, fields[n-2])
		case line < 60 && fields[0] == "Standard" && n == 3:
			set.residualSD = number(t, fields[2])
		case line > 60:
			set.groups, set.readings = append(set.groups, fields[0]), append(set.readings, fields[1])
			groups[fields[0]] = true
		}
	}
	if err := scanner.Err(); err != nil {
		t.Fatal(err)
	}
	set.levels = len(groups)
	set.replicates = len(set.readings) / set.levels
	return set
}

// exactOffsets subtracts the first reading from all, as decimals, and rounds what is left.
func exactOffsets(t *testing.T, readings []string) (shift float64, offsets []float64) {
	t.Helper()
	first, ok := new(big.Rat).SetString(readings[0])
	if !ok {
		t.Fatalf("not a number: %s", readings[0])
	}
	for _, text := range readings {
		y, ok := new(big.Rat).SetString(text)
		if !ok {
			t.Fatalf("not a number: %s", text)
		}
		offset, _ := y.Sub(y, first).Float64()
		offsets = append(offsets, offset)
	}
	shift, _ = first.Float64()
	return shift, offsets
}

// digits is the log relative error: about how many digits of got are right.
func digits(got, want float64) float64 {
	if got == want {
		return 17
	}
	return -math.Log10(math.Abs(got-want) / math.Abs(want))
}

// TestNIST holds the certified values of all eleven analysis-of-variance sets to 14 digits (they are given to 15, and the
// last is rounded), and the exact values to 15.
func TestNIST(t *testing.T) {
	text, err := os.ReadFile(filepath.Join(nistDir, "recomputed.json"))
	if err != nil {
		t.Fatal(err)
	}
	var exact map[string]struct {
		SS         struct{ Between, Within string }
		F          struct{ Between string }
		ResidualSD string `json:"residual_sd"`
	}
	if err := json.Unmarshal(text, &exact); err != nil {
		t.Fatal(err)
	}
	names := []string{"SiRstv", "SmLs01", "SmLs02", "SmLs03", "AtmWtAg", "SmLs04", "SmLs05", "SmLs06", "SmLs07", "SmLs08", "SmLs09"}
	if len(exact) != len(names) {
		t.Fatalf("%d sets, not %d", len(exact), len(names))
	}
	for _, name := range names {
		set := readNIST(t, name)
		g := emptyGrid(crossed([]int{set.levels}, set.replicates))
		for i, group := range set.groups {
			if strconv.Itoa(code(g, 0, i)+1) != group {
				t.Fatalf("%s: row %d is of group %s", name, i, group)
			}
		}
		shift, offsets := exactOffsets(t, set.readings)
		g.Responses = []data.Response{{Shift: shift, Offsets: offsets}}
		for _, order := range []string{"in cell order", "shuffled"} {
			s, err := NewKernel(g).Sums(t.Context(), 0)
			if err != nil {
				t.Fatal(err)
			}
			between := s.Term(1)
			msWithin := s.Within / set.dfWithin
			f, sd := between/set.dfBetween/msWithin, math.Sqrt(msWithin)
			e := exact[name]
			for _, c := range []struct {
				what           string
				got, certified float64
				exact          string
			}{
				{"SS between", between, set.between, e.SS.Between},
				{"SS within", s.Within, set.within, e.SS.Within},
				{"F", f, set.f, e.F.Between},
				{"residual SD", sd, set.residualSD, e.ResidualSD},
			} {
				want := number(t, c.exact)
				if digits(c.got, c.certified) < 14 {
					t.Errorf("%s %s: %s is %.17g, certified %.15g", name, order, c.what, c.got, c.certified)
				}
				if digits(c.got, want) < 15 {
					t.Errorf("%s %s: %s is %.17g, exactly %s", name, order, c.what, c.got, c.exact)
				}
				t.Logf("%s %s: %s to %.1f digits of the certified value, %.1f of the exact one", name, order, c.what, digits(c.got, c.certified), digits(c.got, want))
			}
			shuffle(g, rand.New(rand.NewPCG(1, 1)))
		}
	}
}
