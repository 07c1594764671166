package main

import (
	"bytes"
	"fmt"
	"slices"
	"strings"
	"unicode/utf8"

	"guardrow/api"
)

// width is how many characters a line of prose holds.
const width = 96

// table prints columns as wide as their widest cell. Every character that is printed here is one column wide.
type table struct {
	head  []string
	right []int // columns whose cells stand to the right
	rows  [][]string
}

func (t *table) add(cells ...string) { t.rows = append(t.rows, cells) }

func (t *table) print(w *bytes.Buffer) {
	widths := make([]int, len(t.head))
	for _, row := range append([][]string{t.head}, t.rows...) {
		for i, cell := range row {
			widths[i] = max(widths[i], utf8.RuneCountInString(cell))
		}
	}
	rule := make([]string, len(widths))
	for i := range rule {
		rule[i] = strings.Repeat("─", widths[i])
	}
	for _, row := range append([][]string{t.head, rule}, t.rows...) {
		var line strings.Builder
		line.WriteString("  ")
		for i, cell := range row {
			blank := strings.Repeat(" ", widths[i]-utf8.RuneCountInString(cell))
			if slices.Contains(t.right, i) {
				line.WriteString(blank + cell + "  ")
			} else {
				line.WriteString(cell + blank + "  ")
			}
		}
		w.WriteString(strings.TrimRight(line.String(), " ") + "\n")
	}
	w.WriteByte('\n')
}

func title(w *bytes.Buffer, text string) {
	fmt.Fprintf(w, "\n%s\n%s\n\n", text, strings.Repeat("═", utf8.RuneCountInString(text)))
}

func heading(w *bytes.Buffer, text string) { fmt.Fprintf(w, "%s\n\n", text) }

func paragraph(w *bytes.Buffer, text string) { wrap(w, text, "  ", "  ") }

func bullet(w *bytes.Buffer, text string) { wrap(w, text, "  · ", "    ") }

// wrap breaks a paragraph into lines.
func wrap(w *bytes.Buffer, text, first, rest string) {
	line, indent := first, first
	for _, word := range strings.Fields(text) {
		if utf8.RuneCountInString(line)+utf8.RuneCountInString(word)+1 > width && line != indent {
			w.WriteString(strings.TrimRight(line, " ") + "\n")
			line, indent = rest, rest
		}
		if line != indent {
			line += " "
		}
		line += word
	}
	w.WriteString(line + "\n\n")
}

// fixed writes a number with four decimals; nothing where there is none.
func fixed(n api.Number) string { return decimals(n, 4) }

func decimals(n api.Number, places int) string {
	x, ok := n.Value()
	if !ok {
		return ""
	}
	return fmt.Sprintf("%.*f", places, x)
}

// probability writes a p with two significant digits, and small ones as a power of ten.
func probability(n api.Number) string {
	p, ok := n.Value()
	switch {
	case !ok:
		return ""
	case p < 0.0001:
		return fmt.Sprintf("%.1e", p)
	case p < 0.1:
		return fmt.Sprintf("%#.2g", p)
	}
	return fmt.Sprintf("%.2f", p)
}

// symbolsOf returns the symbol of each factor.
func symbolsOf(factors []api.DeclaredFactor) map[string]string {
	symbols := make(map[string]string, len(factors))
	for _, f := range factors {
		symbols[f.Name] = f.Symbol
	}
	return symbols
}

// symbol writes a term in its factors' symbols, such as BU(TF).
func (s *study) symbol(t api.Term) string {
	if len(t.Crossed) == 0 {
		return t.Term
	}
	var text strings.Builder
	for _, name := range t.Crossed {
		text.WriteString(s.symbols[name])
	}
	if len(t.Within) > 0 {
		text.WriteByte('(')
		for _, name := range t.Within {
			text.WriteString(s.symbols[name])
		}
		text.WriteByte(')')
	}
	return text.String()
}
