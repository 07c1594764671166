package prob

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mathext"
)

// Merrington and Thompson (1943): the printed points to their last digit, the recomputed ones to 13 digits.
func TestPublishedFQuantiles(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "prob", "f_quantiles.json"))
	if err != nil {
		t.Fatal(err)
	}
	var c struct {
		Published struct {
			Values map[string]map[string]string `json:"values"`
		} `json:"published"`
		Recomputed map[string]map[string]string `json:"recomputed"`
	}
	if err := json.Unmarshal(text, &c); err != nil {
		t.Fatal(err)
	}
	count := 0
	for alpha, points := range c.Published.Values {
		for df, printed := range points {
			first, second, _ := strings.Cut(df, ",")
			df1, df2, p, recomputed := number(t, first), number(t, second), number(t, alpha), number(t, c.Recomputed[alpha][df])
			f := FUpperQuantile(p, df1, df2)
			_, decimals, _ := strings.Cut(printed, ".")
			if got := strconv.FormatFloat(f, 'f', len(decimals), 64); got != printed {
				t.Errorf("F(%s; %s): %s, printed %s", alpha, df, got, printed)
			}
			if relative(f, recomputed) > 1e-13 {
				t.Errorf("F(%s; %s): %.17g, recomputed %.17g", alpha, df, f, recomputed)
			}
			if relative(FUpperTail(recomputed, df1, df2), p) > 1e-13 {
				t.Errorf("P(F > %g; %s): %.17g, want %s", recomputed, df, FUpperTail(recomputed, df1, df2), alpha)
			}
			count++
		}
	}
	if count != 19 {
		t.Errorf("%d points", count)
	}
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return v
}

// Percentage points found in every statistical table, written from memory.
func TestTablePoints(t *testing.T) {
	for _, c := range []struct {
		name string
		got  float64
		want string
	}{
		{"χ² 5%, 1", ChiSquareUpperQuantile(0.05, 1), "3.841"},
		{"χ² 5%, 10", ChiSquareUpperQuantile(0.05, 10), "18.307"},
		{"χ² 1%, 20", ChiSquareUpperQuantile(0.01, 20), "37.566"},
		{"χ² lower 5%, 10", ChiSquareLowerQuantile(0.05, 10), "3.940"},
		{"χ² lower 2.5%, 30", ChiSquareLowerQuantile(0.025, 30), "16.791"},
		{"t 2.5%, 1", TUpperQuantile(0.025, 1), "12.706"},
		{"t 2.5%, 10", TUpperQuantile(0.025, 10), "2.228"},
		{"t 0.5%, 30", TUpperQuantile(0.005, 30), "2.750"},
		{"t 2.5%, ∞", TUpperQuantile(0.025, math.Inf(1)), "1.960"},
		{"t 97.5%, 10", TUpperQuantile(0.975, 10), "-2.228"},
	} {
		if got := strconv.FormatFloat(c.got, 'f', 3, 64); got != c.want {
			t.Errorf("%s: %s, want %s", c.name, got, c.want)
		}
	}
}

// gonum's incomplete beta and gamma functions are right to about 11 digits for moderate arguments.
func TestAgreesWithGonum(t *testing.T) {
	for _, df1 := range []float64{0.7, 1, 3, 8.5, 40, 150} {
		for _, df2 := range []float64{0.7, 2, 5, 12.5, 60} {
			for _, p := range []float64{0.95, 0.5, 0.1, 0.01, 1e-6, 1e-10} {
				f := FUpperQuantile(p, df1, df2)
				if want := mathext.RegIncBeta(df2/2, df1/2, df2/(df2+df1*f)); relative(p, want) > 1e-11 {
					t.Errorf("P(F > %g; %g, %g) = %g, by gonum %g", f, df1, df2, p, want)
				}
			}
		}
		for _, x := range []float64{0.01, 0.5, 3, 20, 90} {
			if got, want := ChiSquareUpperTail(x, df1), mathext.GammaIncRegComp(df1/2, x/2); relative(got, want) > 1e-11 {
				t.Errorf("P(χ² > %g; %g) = %g, by gonum %g", x, df1, got, want)
			}
		}
	}
}
