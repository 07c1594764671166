package service

import (
	"strings"
	"testing"
)

// TestCompilerRefuses holds the compiler to refuse a contract that the check could not hold requests to.
func TestCompilerRefuses(t *testing.T) {
	for name, c := range map[string]struct{ yaml, want string }{
		"two alternatives of one kind": {`{oneOf: [{type: integer}, {type: number}]}`, "one kind"},
		"an unknown reference":         {`{type: array, items: {$ref: '#/components/schemas/Nothing'}}`, "no schema Nothing"},
		"a schema without a type":      {`{description: anything}`, "type"},
		"an unknown type":              {`{type: object, properties: {a: {type: date}}}`, "date"},
		"a list of anything":           {`{type: array}`, "not an object"},
	} {
		doc, _, err := loadDocument([]byte("components:\n  schemas:\n    Root: " + c.yaml + "\n"))
		if err != nil {
			t.Fatal(err)
		}
		if _, err := newCompiler(doc).named("Root"); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, text := range []string{"a: [", "a: &x {b: 1}\nc: *x\n"} {
		if _, _, err := loadDocument([]byte(text)); err == nil {
			t.Errorf("taken: %q", text)
		}
	}
}
