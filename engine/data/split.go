package data

import (
	"bytes"
	"slices"
)

// Parts is a request, taken apart at its top level.
type Parts struct {
	// Envelope is the request without its bulk members: valid JSON, everything else byte for byte. It is the body itself
	// where there was nothing to cut.
	Envelope []byte
	// Bulk are the values of the bulk members, one for each name that was asked for, in that order.
	Bulk []Bulk
	// Duplicates are the members whose name occurred before, in their order. Of a repeated bulk member the first counts.
	Duplicates []Member

	cuts []cut
}

// Bulk is the text of a bulk member's value, within the body.
type Bulk struct {
	Text   []byte // nil where the request has no such member
	Offset int    // where Text begins in the body
}

// Member is a member of the request object: its name, and where the name begins in the body.
type Member struct {
	Name   string
	Offset int
}

// cut is a stretch of the body that the envelope leaves out.
type cut struct{ start, end int }

// Split takes a request, a JSON object, apart: the members named in bulk are found and left as they are, the others are
// checked strictly (see Valid) and kept as the envelope. The inside of a bulk value is only searched for its end, at a small part
// of the cost of reading it; what reads it later checks it, and if that finds it valid, the body as a whole is valid.
// The error is a *SyntaxError.
func Split(body []byte, bulk ...string) (*Parts, error) {
	s := splitter{reader: reader{text: body}, names: bulk, parts: &Parts{Bulk: make([]Bulk, len(bulk))}}
	if end := s.object(s.space(0)); end >= 0 {
		s.end(end)
	}
	if s.err != nil {
		return nil, s.err
	}
	s.parts.Envelope = s.envelope()
	return s.parts, nil
}

// BodyOffset returns where the byte at offset of the envelope stands in the body.
func (p *Parts) BodyOffset(offset int) int {
	for _, c := range p.cuts {
		if c.start <= offset {
			offset += c.end - c.start
		}
	}
	return offset
}

type splitter struct {
	reader
	names []string
	parts *Parts
	seen  map[string]bool
	kept  int // the end of the last member that is kept, or of the opening bracket
}

// object reads the request object.
func (s *splitter) object(pos int) int {
	if s.at(pos) != '{' {
		return s.fail(pos, "A request is a JSON object.")
	}
	s.kept = pos + 1
	s.seen = make(map[string]bool)
	if pos = s.space(pos + 1); s.at(pos) == '}' {
		return pos + 1
	}
	for {
		start := pos
		value := s.key(pos)
		if value < 0 {
			return -1
		}
		which := s.name(start)
		end := s.member(which, value)
		if end < 0 {
			return -1
		}
		next := s.space(end)
		last := s.at(next) != ','
		s.cut(which, start, end, next, last)
		if last {
			if s.at(next) != '}' {
				return s.fail(next, missingComma(true, next >= len(s.text)))
			}
			return next + 1
		}
		pos = s.space(next + 1)
	}
}

// name returns which bulk member the name at pos is, or -1, and notes whether it occurred before.
func (s *splitter) name(pos int) int {
	raw := s.text[pos+1 : s.str(pos)-1]
	if bytes.IndexByte(raw, '\\') >= 0 {
		raw = unescape(nil, raw)
	}
	name := string(raw)
	if s.seen[name] {
		s.parts.Duplicates = append(s.parts.Duplicates, Member{Name: name, Offset: pos})
	}
	s.seen[name] = true
	return slices.Index(s.names, name)
}

// member skips a member's value, and notes it if it is a bulk member's.
func (s *splitter) member(which, pos int) int {
	if which < 0 {
		return s.value(pos)
	}
	end := s.bulk(pos)
	if end >= 0 && s.parts.Bulk[which].Text == nil {
		s.parts.Bulk[which] = Bulk{Text: s.text[pos:end:end], Offset: pos}
	}
	return end
}

// cut leaves a bulk member out of the envelope, with one comma if there is any.
func (s *splitter) cut(which, start, end, next int, last bool) {
	switch {
	case which < 0:
		s.kept = end
	case !last:
		s.parts.cuts = append(s.parts.cuts, cut{start, next + 1})
	default:
		for n := len(s.parts.cuts); n > 0 && s.parts.cuts[n-1].start >= s.kept; n-- {
			s.parts.cuts = s.parts.cuts[:n-1]
		}
		s.parts.cuts = append(s.parts.cuts, cut{s.kept, end})
	}
}

// envelope joins what was not cut.
func (s *splitter) envelope() []byte {
	if len(s.parts.cuts) == 0 {
		return s.text
	}
	size := len(s.text)
	for _, c := range s.parts.cuts {
		size -= c.end - c.start
	}
	envelope := make([]byte, 0, size)
	from := 0
	for _, c := range s.parts.cuts {
		envelope = append(envelope, s.text[from:c.start]...)
		from = c.end
	}
	return append(envelope, s.text[from:]...)
}

// bulk skips a bulk value. An object of flat arrays is skipped an array at a time.
func (s *splitter) bulk(pos int) int {
	if s.at(pos) != '{' {
		return s.value(pos)
	}
	if pos = s.space(pos + 1); s.at(pos) == '}' {
		return pos + 1
	}
	for {
		if pos = s.key(pos); pos < 0 {
			return -1
		}
		if pos = s.array(pos); pos < 0 {
			return -1
		}
		pos = s.space(pos)
		switch s.at(pos) {
		case ',':
			pos = s.space(pos + 1)
		case '}':
			return pos + 1
		default:
			return s.fail(pos, missingComma(true, pos >= len(s.text)))
		}
	}
}

// array skips a value, quickly if it is an array without brackets or backslashes inside. Then the first ] that follows an
// even number of quotes ends it: without backslashes every quote opens or closes a string, and without brackets it is not
// deeper. If the array is not valid JSON the end may be wrong, but then its reader refuses it wherever it ends.
func (s *splitter) array(pos int) int {
	if s.at(pos) != '[' {
		return s.value(pos)
	}
	quotes := 0
	for from := pos + 1; from < len(s.text); {
		block := s.text[from:min(from+skipBlock, len(s.text))]
		end := bytes.IndexByte(block, ']')
		if end >= 0 {
			block = block[:end]
		}
		if bytes.IndexByte(block, '\\') >= 0 || bytes.IndexByte(block, '[') >= 0 {
			break
		}
		quotes += bytes.Count(block, quote)
		from += len(block)
		if end >= 0 {
			if quotes&1 == 0 {
				return from + 1
			}
			break
		}
	}
	return s.value(pos)
}

// skipBlock is how much is looked at in one go, several times over: it stays close to the processor.
const skipBlock = 1 << 14

var quote = []byte{'"'}
