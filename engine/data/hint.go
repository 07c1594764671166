package data

import (
	"bytes"
	"strings"

	"guardrow/engine"
)

// Hints are searched among so many names, so that they cost little whatever is sent.
const (
	formLimit = 20_000 // for one that differs in case and blanks only
	nearLimit = 500    // for one that is near in its letters
)

// nearest returns a sentence with the known name that is nearest to name, or nothing where none is near.
func nearest(name string, known []string) string {
	if len(name) > engine.MaxName {
		return ""
	}
	var candidates []string
	for _, k := range known[:min(len(known), formLimit)] {
		if len(k) > 2*len(name)+4 {
			continue
		}
		if k != name && sameButForm(k, name) {
			return " Did you mean " + engine.Quote(k) + "? Case and blanks count."
		}
		if k != name && sameNumber(k, name) {
			return " Did you mean " + engine.Quote(k) + "? A label is a text: the same number written otherwise is another."
		}
		if len(candidates) < nearLimit {
			candidates = append(candidates, k)
		}
	}
	return engine.DidYouMean(name, candidates)
}

// sameButForm reports whether two labels differ in nothing but case and blanks.
func sameButForm(a, b string) bool {
	return strings.EqualFold(strings.Join(strings.Fields(a), " "), strings.Join(strings.Fields(b), " "))
}

// sameNumber reports whether two labels are the same number, written differently.
func sameNumber(a, b string) bool {
	x, ok := parseDecimal([]byte(a))
	y, also := parseDecimal([]byte(b))
	return ok && also && string(x.text()) == string(y.text())
}

// readable returns text as valid UTF-8, cut to more than a message shows.
func readable(text []byte) string {
	const enough = 512
	return string(bytes.ToValidUTF8(text[:min(len(text), enough)], []byte("\uFFFD")))
}

// numberHint returns a sentence on how a text that is no number could be meant as one, or nothing.
func numberHint(text []byte) string {
	text = bytes.TrimSpace(text)
	if x := bytes.Replace(text, []byte{','}, []byte{'.'}, 1); bytes.Count(text, []byte{','}) == 1 {
		if _, ok := parseDecimal(x); ok {
			return " Write decimals with a point, not a comma."
		}
	}
	return ""
}
