package data

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"hash"
	"math"
)

// Fingerprint returns the SHA-256 of columns, as 64 hexadecimal digits: of the factors in the order of the design, with
// the label of every row, then of the responses in the order of the request, with every reading. Columns that read the
// same have the same fingerprint, however they were written and whether as JSON or CSV. It is taken before the columns are laid.
//
// A reading enters as the exact decimal of the shift and the double of its offset, which are all that an analysis sees of it.
func Fingerprint(columns *Columns) string {
	if columns.laid {
		panic("data: fingerprint of columns that were laid")
	}
	p := printer{hash: sha256.New()}
	p.text("guardrow data 1")
	p.number(uint64(columns.Rows))
	p.number(uint64(len(columns.Factors)))
	for i := range columns.Factors {
		f := &columns.Factors[i]
		p.text(f.Name)
		p.number(uint64(len(f.Labels)))
		for _, label := range f.Labels {
			p.text(label)
		}
		for row := range columns.Rows {
			p.code(f.Codes.At(row))
		}
	}
	p.number(uint64(len(columns.Responses)))
	for i := range columns.Responses {
		r := &columns.Responses[i]
		p.text(r.Name)
		p.text(r.exact)
		for _, offset := range r.Offsets {
			p.number(math.Float64bits(offset))
		}
	}
	p.flush()
	return hex.EncodeToString(p.hash.Sum(nil))
}

// printer writes to a hash, a block at a time. Texts are preceded by their length, so that no two lists of texts agree.
type printer struct {
	hash  hash.Hash
	block [4096]byte
	n     int
}

func (p *printer) flush() {
	p.hash.Write(p.block[:p.n])
	p.n = 0
}

func (p *printer) number(x uint64) {
	if p.n+8 > len(p.block) {
		p.flush()
	}
	binary.LittleEndian.PutUint64(p.block[p.n:], x)
	p.n += 8
}

func (p *printer) code(x uint32) {
	if p.n+4 > len(p.block) {
		p.flush()
	}
	binary.LittleEndian.PutUint32(p.block[p.n:], x)
	p.n += 4
}

func (p *printer) text(text string) {
	p.number(uint64(len(text)))
	p.flush()
	p.hash.Write([]byte(text))
}
