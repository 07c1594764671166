package api

import (
	"encoding/json"
	"reflect"
	"testing"
)

func TestLevels(t *testing.T) {
	for text, want := range map[string]Levels{
		`3`: {Count: 3}, `3.0`: {Count: 3}, `3e0`: {Count: 3}, `-1`: {Count: -1}, `1e300`: {Count: 1<<63 - 1}, `[]`: {Labels: []string{}}, ` [ ] `: {Labels: []string{}},
		`[ "a" , 1.0, "b,\"]\\" ,-0.0,1e21,"\u00e9é", "" ]`: {Count: 7, Labels: []string{"a", "1", `b,"]\`, "0", "1e+21", "éé", ""}},
	} {
		var got Levels
		if err := json.Unmarshal([]byte(text), &got); err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("%s: %#v %v, want %#v", text, got, err, want)
		}
	}
	for _, text := range []string{`2.5`, `"3"`, `[true]`, `[null]`, `{}`, `["a", ["b"]]`} {
		var got Levels
		if err := json.Unmarshal([]byte(text), &got); err == nil {
			t.Errorf("%s was read as %#v", text, got)
		}
	}
}

func TestTermRefs(t *testing.T) {
	for text, want := range map[string]TermRef{
		`"a × b(c)"`:                       {Text: "a × b(c)"},
		`["a", "b\t\"c"]`:                  {Factors: []string{"a", "b\t\"c"}},
		`[]`:                               {Factors: []string{}},
		`{"crossed": ["a"], "within": []}`: {Parted: true, Crossed: []string{"a"}, Within: []string{}},
	} {
		var got TermRef
		if err := json.Unmarshal([]byte(text), &got); err != nil || !reflect.DeepEqual(got, want) {
			t.Errorf("%s: %#v %v, want %#v", text, got, err, want)
		}
		again, err := json.Marshal(got)
		if err != nil {
			t.Error(err)
		}
		var back TermRef
		if err := json.Unmarshal(again, &back); err != nil || !reflect.DeepEqual(back, want) {
			t.Errorf("%s came back as %s", text, again)
		}
	}
	for _, text := range []string{`5`, `[5]`, `{"crossed": "a"}`} {
		var got TermRef
		if err := json.Unmarshal([]byte(text), &got); err == nil {
			t.Errorf("%s was read as %#v", text, got)
		}
	}
}
