package data

import (
	"bytes"
	"encoding/binary"
	"hash/maphash"
	"math/bits"
)

// dictionary numbers the labels of one column in order of first appearance.
//
// A label of up to 15 bytes is kept as two words, its length in the top byte of the second, so that finding it is one
// multiplication and, nearly always, one comparison; longer ones are found by a map. What a slot holds is an entry: the
// label's number plus one, and below it two bits on how it is written. 0 stands for none.
type dictionary struct {
	slots []uint32 // open addressing, a power of two of them, at most half of them taken
	mask  uint64
	near  nearTable
	words [][2]uint64 // by number
	// longs are the labels of 16 bytes and more, whose words are their position in longs and longMark.
	longs []string
	long  map[string]uint32 // the entries of longs
	// spelt holds the entries of labels whose text is not what was sent: escaped strings, and numbers not in shortest form.
	spelt map[string]uint32
}

const (
	shortLabel = 15
	longMark   = 0xFF << 56

	asNumber  = 1 // the label's text is also the JSON number that stands for it
	asText    = 2 // the label's text between quotes is a JSON string that stands for it
	entryBits = 2
)

// Two random words keep callers from choosing labels that collide. Which labels collide never shows in an answer.
var hashSeed = func() [2]uint64 {
	seed := maphash.MakeSeed()
	return [2]uint64{maphash.Bytes(seed, []byte{0}), maphash.Bytes(seed, []byte{1})}
}()

func newDictionary() *dictionary {
	return &dictionary{slots: make([]uint32, 64), mask: 63, words: make([][2]uint64, 0, 32), near: newNearTable(256)}
}

func hashWords(lo, hi uint64) uint64 {
	high, low := bits.Mul64(lo^hashSeed[0], hi^hashSeed[1])
	return high ^ low
}

// entryNumber returns the number of the label that an entry stands for.
func entryNumber(entry uint32) uint32 { return entry>>entryBits - 1 }

// find returns the entry of the label with these words, or 0.
func (d *dictionary) find(lo, hi uint64) uint32 {
	for i := hashWords(lo, hi) & d.mask; ; i = (i + 1) & d.mask {
		entry := d.slots[i]
		if entry == 0 {
			return 0
		}
		if w := &d.words[entryNumber(entry)]; w[0] == lo && w[1] == hi {
			return entry
		}
	}
}

// entry returns the entry of a label, and makes one if it is new.
func (d *dictionary) entry(label []byte) uint32 {
	if len(label) > shortLabel {
		if entry, known := d.long[string(label)]; known {
			return entry
		}
		if d.long == nil {
			d.long = make(map[string]uint32)
		}
		entry := d.next(label)
		d.words = append(d.words, [2]uint64{uint64(len(d.longs)), longMark})
		d.longs = append(d.longs, string(label))
		d.long[d.longs[len(d.longs)-1]] = entry
		return entry
	}
	lo, hi := labelWords(label)
	if entry := d.find(lo, hi); entry != 0 {
		return entry
	}
	entry := d.next(label)
	d.words = append(d.words, [2]uint64{lo, hi})
	d.place(entry, lo, hi)
	if d.crowded() {
		d.grow()
	}
	return entry
}

// next returns the entry for a label that is about to be added.
func (d *dictionary) next(label []byte) uint32 {
	entry := uint32(len(d.words)+1) << entryBits
	if isShortestNumber(label) {
		entry |= asNumber
	}
	if !bytes.ContainsFunc(label, func(c rune) bool { return c < ' ' || c == '"' || c == '\\' }) {
		entry |= asText
	}
	return entry
}

// place puts an entry into the first free slot from where it belongs.
func (d *dictionary) place(entry uint32, lo, hi uint64) {
	i := hashWords(lo, hi) & d.mask
	for d.slots[i] != 0 {
		i = (i + 1) & d.mask
	}
	d.slots[i] = entry
}

// crowded reports whether there are too few slots: where they are few enough to stay close to the processor, so many are
// kept free that nearly every label is found at once.
func (d *dictionary) crowded() bool {
	const near = 1 << 13
	if len(d.slots) < near {
		return 8*len(d.words) > len(d.slots)
	}
	return 2*len(d.words) > len(d.slots)
}

func (d *dictionary) grow() {
	old := d.slots
	d.slots = make([]uint32, 4*len(old))
	d.mask = uint64(len(d.slots) - 1)
	for _, entry := range old {
		if entry != 0 {
			w := d.words[entryNumber(entry)]
			d.place(entry, w[0], w[1])
		}
	}
}

// nearTable finds again labels of up to 7 bytes by one word, the label and its length: a place for each, which the label
// seen last in it holds. Where labels are so many that they would chase each other from place to place, it is given up.
type nearTable struct {
	places []nearPlace // a power of two of them; nil once given up
	shift  int
}

// nearNumber is a bit of the keys of labels that are written as JSON numbers, above the length.
const nearNumber = 1 << 60

type nearPlace struct {
	key    uint64 // 0 for a free place
	number uint32
}

func newNearTable(n int) nearTable {
	return nearTable{places: make([]nearPlace, n), shift: 64 - bits.Len(uint(n-1))}
}

// nearHash mixes the bits of a key; its upper bits choose the place. Fibonacci hashing: Knuth, The Art of Computer
// Programming, vol. 3, section 6.4.
func nearHash(key uint64) uint64 { return key * 0x9E3779B97F4A7C15 }

// put remembers the number of a key, there being so many labels.
func (n *nearTable) put(key uint64, number uint32, labels int) {
	const most = 1 << 14
	if size := len(n.places); 8*labels > size {
		old := n.places
		if *n = (nearTable{}); 4*labels > most || size == 0 {
			return
		}
		*n = newNearTable(min(4*size, most))
		for _, place := range old {
			if place.key != 0 {
				n.places[nearHash(place.key)>>n.shift] = place
			}
		}
	}
	n.places[nearHash(key)>>n.shift] = nearPlace{key, number}
}

// labels returns all labels by number.
func (d *dictionary) labels() []string {
	size := 0
	for _, w := range d.words {
		if w[1] < longMark {
			size += int(w[1] >> 56)
		}
	}
	joined := make([]byte, 0, size)
	for _, w := range d.words {
		if w[1] < longMark {
			var text [16]byte
			binary.LittleEndian.PutUint64(text[:], w[0])
			binary.LittleEndian.PutUint64(text[8:], w[1])
			joined = append(joined, text[:w[1]>>56]...)
		}
	}
	all := string(joined)
	labels := make([]string, len(d.words))
	for i, w := range d.words {
		if w[1] >= longMark {
			labels[i] = d.longs[w[0]]
			continue
		}
		n := int(w[1] >> 56)
		labels[i], all = all[:n], all[n:]
	}
	return labels
}

// labelWords returns the two words of a label of at most 15 bytes.
func labelWords(label []byte) (lo, hi uint64) {
	var text [16]byte
	copy(text[:], label)
	return binary.LittleEndian.Uint64(text[:]), binary.LittleEndian.Uint64(text[8:]) | uint64(len(label))<<56
}

// isShortestNumber reports whether text is surely a JSON number written as api.NumberLabel writes it: plain, at most 15
// significant digits (which every double carries), no zeros that could be left out, and not below 1e-6 unless it is 0.
func isShortestNumber(text []byte) bool {
	if len(text) > 0 && text[0] == '-' {
		if text = text[1:]; len(text) == 1 && text[0] == '0' {
			return false
		}
	}
	digits, point := 0, -1
	for i, c := range text {
		switch {
		case isDigit(c):
			digits++
		case c == '.' && point < 0:
			point = i
		default:
			return false
		}
	}
	switch {
	case digits == 0 || digits > 15 || text[0] == '.':
		return false
	case text[0] == '0' && len(text) > 1 && point != 1:
		return false
	case point >= 0:
		small := text[0] == '0' && len(text) >= 8 && string(text[2:7]) == "00000" && text[7] == '0'
		return point < len(text)-1 && text[len(text)-1] != '0' && !small
	}
	return true
}
