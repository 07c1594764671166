package service

import (
	"encoding/json"
	"fmt"
	"slices"
	"strings"

	"github.com/go-json-experiment/json/jsontext"
	"go.yaml.in/yaml/v4"
)

// jsonKind is a kind of JSON value. The order is the one in which messages list them.
type jsonKind int

const (
	textKind jsonKind = iota
	numberKind
	boolKind
	listKind
	objectKind
	nullKind
	kinds
)

// shape is what a schema of the contract admits, one rule per kind of JSON value; nil where it admits no value of that kind.
//
// The contract's unions (oneOf) are all of different kinds, so that a value's kind alone tells which alternative is meant and
// a message can be about that one. compile refuses a contract that is otherwise.
type shape [kinds]*rule

// rule is what a schema demands of a value of one kind. Bounds are limits on values, not on the shape: a value outside them
// is a broken rule (422), not a malformed request (400).
type rule struct {
	whole    bool     // of a number: without fractional part
	words    []string // of a text: the enumeration; nil for any
	min, max *float64 // of a number
	above    bool     // min itself is excluded
	below    bool     // max itself is excluded
	least    int      // of a text, in characters; of a list, in items
	most     int      // the same; -1 for no bound
	items    *shape   // of a list
	fields   []field  // of an object, in the order of their names
	names    []string // of fields
	open     bool     // of an object: other fields are admitted, unchecked
}

type field struct {
	name     string
	shape    *shape
	required bool
}

// find returns the position of the field with that name, or -1.
func (r *rule) find(name string) int {
	i, found := slices.BinarySearchFunc(r.fields, name, func(f field, name string) int { return strings.Compare(f.name, name) })
	if !found {
		return -1
	}
	return i
}

// document is the contract as JSON values, as they come out of its YAML.
type document map[string]any

// loadDocument reads the contract's YAML. The second result is the same as JSON, every name at its place, so that a reader of
// either meets things in the order in which they were written.
func loadDocument(text []byte) (document, []byte, error) {
	var root yaml.Node
	if err := yaml.Unmarshal(text, &root); err != nil {
		return nil, nil, fmt.Errorf("the contract is not YAML: %w", err)
	}
	asJSON, err := appendNode(nil, &root)
	if err != nil {
		return nil, nil, fmt.Errorf("the contract has no form in JSON: %w", err)
	}
	var doc document
	if err := json.Unmarshal(asJSON, &doc); err != nil {
		return nil, nil, fmt.Errorf("the contract has no form in JSON: %w", err)
	}
	return doc, asJSON, nil
}

// appendNode appends a YAML value as JSON.
func appendNode(text []byte, node *yaml.Node) ([]byte, error) {
	var err error
	switch node.Kind {
	case yaml.DocumentNode:
		return appendNode(text, node.Content[0])
	case yaml.SequenceNode:
		text = append(text, '[')
		for i, item := range node.Content {
			if i > 0 {
				text = append(text, ',')
			}
			if text, err = appendNode(text, item); err != nil {
				return nil, err
			}
		}
		return append(text, ']'), nil
	case yaml.MappingNode:
		text = append(text, '{')
		for i := 0; i < len(node.Content); i += 2 {
			if i > 0 {
				text = append(text, ',')
			}
			if text, err = jsontext.AppendQuote(text, node.Content[i].Value); err != nil {
				return nil, err
			}
			if text, err = appendNode(append(text, ':'), node.Content[i+1]); err != nil {
				return nil, err
			}
		}
		return append(text, '}'), nil
	case yaml.ScalarNode:
		var value any
		if err = node.Decode(&value); err != nil {
			return nil, err
		}
		scalar, err := json.Marshal(value)
		return append(text, scalar...), err
	}
	return nil, fmt.Errorf("line %d: a kind of YAML that JSON has not", node.Line)
}

// compiler turns the contract's schemas into shapes, each once.
type compiler struct {
	schemas map[string]any
	done    map[string]*shape
}

func newCompiler(doc document) *compiler {
	components, _ := doc["components"].(map[string]any)
	schemas, _ := components["schemas"].(map[string]any)
	return &compiler{schemas: schemas, done: make(map[string]*shape)}
}

// named compiles a schema of the contract's components.
func (c *compiler) named(name string) (*shape, error) {
	if s, ok := c.done[name]; ok {
		return s, nil
	}
	schema, ok := c.schemas[name].(map[string]any)
	if !ok {
		return nil, fmt.Errorf("the contract has no schema %s", name)
	}
	s := new(shape)
	c.done[name] = s // before its parts, which may refer to it
	if err := c.add(s, schema); err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	return s, nil
}

const schemaPrefix = "#/components/schemas/"

func (c *compiler) compile(schema any) (*shape, error) {
	m, ok := schema.(map[string]any)
	if !ok {
		return nil, fmt.Errorf("a schema is not an object")
	}
	if ref, ok := m["$ref"].(string); ok {
		return c.named(strings.TrimPrefix(ref, schemaPrefix))
	}
	s := new(shape)
	return s, c.add(s, m)
}

// add adds what a schema admits to s.
func (c *compiler) add(s *shape, schema map[string]any) error {
	if alternatives, ok := schema["oneOf"].([]any); ok {
		for _, a := range alternatives {
			alternative, err := c.compile(a)
			if err != nil {
				return err
			}
			for kind, r := range alternative {
				if r != nil && s[kind] != nil {
					return fmt.Errorf("two alternatives are of one kind")
				}
				if r != nil {
					s[kind] = r
				}
			}
		}
		nullable(s, schema)
		return nil
	}
	r := &rule{most: -1}
	var kind jsonKind
	var err error
	switch schema["type"] {
	case "string":
		kind = textKind
		r.bounds(schema, "minLength", "maxLength")
		r.words = words(schema["enum"])
	case "integer", "number":
		kind = numberKind
		r.whole = schema["type"] == "integer"
		r.min, r.max = number(schema["minimum"]), number(schema["maximum"])
		r.above, _ = schema["exclusiveMinimum"].(bool)
		r.below, _ = schema["exclusiveMaximum"].(bool)
	case "boolean":
		kind = boolKind
	case "array":
		kind = listKind
		r.bounds(schema, "minItems", "maxItems")
		r.items, err = c.compile(schema["items"])
	case "object":
		kind = objectKind
		err = c.fields(r, schema)
	default:
		err = fmt.Errorf("a schema in requests has the type %v", schema["type"])
	}
	s[kind] = r
	nullable(s, schema)
	return err
}

func nullable(s *shape, schema map[string]any) {
	if schema["nullable"] == true {
		s[nullKind] = &rule{most: -1}
	}
}

func (c *compiler) fields(r *rule, schema map[string]any) error {
	r.open = schema["additionalProperties"] != false
	properties, _ := schema["properties"].(map[string]any)
	required := words(schema["required"])
	for name, property := range properties {
		s, err := c.compile(property)
		if err != nil {
			return fmt.Errorf("%s: %w", name, err)
		}
		r.fields = append(r.fields, field{name: name, shape: s, required: slices.Contains(required, name)})
	}
	slices.SortFunc(r.fields, func(a, b field) int { return strings.Compare(a.name, b.name) })
	for _, f := range r.fields {
		r.names = append(r.names, f.name)
	}
	if len(r.fields) > 64 {
		return fmt.Errorf("an object of requests has more than 64 fields")
	}
	return nil
}

func (r *rule) bounds(schema map[string]any, least, most string) {
	if x := number(schema[least]); x != nil {
		r.least = int(*x)
	}
	if x := number(schema[most]); x != nil {
		r.most = int(*x)
	}
}

func number(value any) *float64 {
	if x, ok := value.(float64); ok {
		return &x
	}
	return nil
}

func words(value any) []string {
	list, _ := value.([]any)
	var texts []string
	for _, v := range list {
		if text, ok := v.(string); ok {
			texts = append(texts, text)
		}
	}
	return texts
}
