package main

import (
	"bytes"
	"strings"
	"testing"

	"guardrow/api"
)

func TestProbability(t *testing.T) {
	for _, c := range []struct {
		p    api.Number
		want string
	}{
		{api.Num(0.7612), "0.76"},
		{api.Num(0.0796), "0.080"},
		{api.Num(0.0031), "0.0031"},
		{api.Num(0.00031), "0.00031"},
		{api.Num(2.34e-12), "2.3e-12"},
		{api.Num(1e-300), "1.0e-300"},
		{api.Null, ""},
		{api.Number{}, ""},
	} {
		if got := probability(c.p); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

func TestErrorLineShowsWeights(t *testing.T) {
	s := study{symbols: map[string]string{"rack": "R", "day": "D"}}
	rack, day := api.Term{Term: "rack", Crossed: []string{"rack"}}, api.Term{Term: "day(rack)", Crossed: []string{"day"}, Within: []string{"rack"}}
	rest := api.Term{Term: api.Residual}
	for _, c := range []struct {
		solution []api.Share
		want     string
	}{
		{nil, ""},
		{[]api.Share{{Term: rack, Weight: 1, Exact: "1"}}, "R"},
		{[]api.Share{{Term: rack, Weight: 1, Exact: "1"}, {Term: day, Weight: 1, Exact: "1"}, {Term: rest, Weight: -1, Exact: "-1"}}, "R + D(R) − residual"},
		{[]api.Share{{Term: rack, Weight: 0.75, Exact: "3/4"}, {Term: rest, Weight: 0.25, Exact: "1/4"}}, "3/4 R + 1/4 residual"},
		{[]api.Share{{Term: rack, Weight: -2, Exact: "-2"}, {Term: rest, Weight: 3, Exact: "3"}}, "− 2 R + 3 residual"},
	} {
		if got := s.errorLine(api.Row{Solution: c.solution}); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}

func TestTableAligns(t *testing.T) {
	var w bytes.Buffer
	columns := table{head: []string{"Source", "SS"}, right: []int{1}}
	columns.add("σ²(T × U)", "1.5")
	columns.add("a", "10.25")
	columns.print(&w)
	want := `
  Source        SS
  ─────────  ─────
  σ²(T × U)    1.5
  a          10.25
`
	if got := "\n" + strings.TrimSuffix(w.String(), "\n"); got != want {
		t.Errorf("got%s\nwant%s", got, want)
	}
}

func TestWrapKeepsLongWords(t *testing.T) {
	var w bytes.Buffer
	long := strings.Repeat("x", 2*width)
	wrap(&w, "a "+long+" b", "  · ", "    ")
	if want := "  · a\n    " + long + "\n    b\n\n"; w.String() != want {
		t.Errorf("got %q", w.String())
	}
}
