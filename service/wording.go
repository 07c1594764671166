package service

import (
	"fmt"
	"strconv"
	"strings"

	"guardrow/engine"
)

// maxNameInPlace is how long a field's name may be, in characters, to become part of a place.
const maxNameInPlace = 200

var pointerEscapes = strings.NewReplacer("~", "~0", "/", "~1")

// escapePointer returns a name as a part of a JSON pointer.
func escapePointer(name string) string {
	if strings.ContainsAny(name, "~/") {
		return pointerEscapes.Replace(name)
	}
	return name
}

// nouns says what a value of each kind is called.
var nouns = [kinds]string{"a text", "a number", "true or false", "a list", "an object", "null"}

// wanted says what a shape admits, such as "a whole number or a list".
func wanted(s *shape) string {
	var list []string
	for kind, r := range s {
		switch {
		case r == nil:
		case r.whole:
			list = append(list, "a whole number")
		case r.words != nil:
			list = append(list, "one of the texts "+enumerate(r.words))
		default:
			list = append(list, nouns[kind])
		}
	}
	return strings.Join(list, " or ")
}

func enumerate(words []string) string {
	quoted := make([]string, len(words))
	for i, w := range words {
		quoted[i] = strconv.Quote(w)
	}
	return strings.Join(quoted, ", ")
}

// wrongType says that a value is of a kind that is not wanted, and how to mend it.
func wrongType(s *shape, kind jsonKind, raw []byte) string {
	sentence := fmt.Sprintf("This is %s; wanted is %s.", nouns[kind], wanted(s))
	switch {
	case kind == nullKind:
		return sentence + " Leave the field out if there is nothing to give."
	case kind == textKind && s[numberKind] != nil && isNumber(unquote(raw)):
		return sentence + " Write the number without quotation marks."
	case kind != objectKind && s[listKind] != nil && s[listKind].items[kind] != nil:
		return sentence + " Put it in brackets, as a list of one."
	case kind == numberKind && s[textKind] != nil:
		return sentence + " Put it in quotation marks."
	}
	return sentence
}

func isNumber(text string) bool {
	_, err := strconv.ParseFloat(text, 64)
	return err == nil
}

func fractional(s *shape) string {
	return fmt.Sprintf("This is a number with a fraction; wanted is %s.", wanted(s))
}

func unknownField(name string, known []string) string {
	return fmt.Sprintf("There is no field %s here.%s The fields are %s.", engine.Quote(name), engine.DidYouMean(name, known), strings.Join(known, ", "))
}

func notInEnumeration(text string, words []string) string {
	return fmt.Sprintf("The text %s is not one of %s.%s", engine.Quote(text), enumerate(words), engine.DidYouMean(text, words))
}

// wrongSize says that a text or list is shorter or longer than its bounds.
func wrongSize(r *rule, n int, unit string) string {
	if n < r.least {
		return fmt.Sprintf("There are %s here; at least %d must be given.", count(n, unit), r.least)
	}
	return fmt.Sprintf("There are %s here; at most %d can be taken.", count(n, unit), r.most)
}

func count(n int, unit string) string {
	if n == 1 {
		return "1 " + unit
	}
	return strconv.Itoa(n) + " " + unit + "s"
}

// outOfRange says what a number must keep to.
func outOfRange(r *rule) string {
	var parts []string
	if r.min != nil {
		parts = append(parts, bound("at least", "above", r.above, *r.min))
	}
	if r.max != nil {
		parts = append(parts, bound("at most", "below", r.below, *r.max))
	}
	return "The number must be " + strings.Join(parts, " and ") + "."
}

func bound(inclusive, exclusive string, excluded bool, x float64) string {
	text := strconv.FormatFloat(x, 'f', -1, 64)
	if excluded {
		return exclusive + " " + text
	}
	return inclusive + " " + text
}
