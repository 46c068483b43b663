package doubles

import "math/bits"

// sketchSize is the number of minima in a sketch. The error of a likeness of
// 0.5 is then about 0.04 (its standard deviation, sqrt(J(1-J)/128)).
const sketchSize = 128

// shingleWords is how many words in a row are compared. Runs of three are
// shared by copies and edits, hardly by reports of one trade.
const shingleWords = 3

// Sketch stands for the wording of a narrative: a byte of the smallest hash in
// each of 128 classes of its runs of three words. The share of bytes that two
// sketches have in common estimates how many of their runs are shared.
type Sketch [sketchSize]byte

// Sketcher adds up the words of the narratives of one occurrence.
type Sketcher struct {
	least    [sketchSize]uint64
	filled   [sketchSize]bool
	Shingles int // runs seen, repeats included
}

// Add takes a text in. Case, punctuation and spacing make no difference.
func (s *Sketcher) Add(text string) {
	const offset, prime = 14695981039346656037, 1099511628211 // FNV-1a
	var last [shingleWords - 1]uint64
	words := 0
	h := uint64(offset)
	in := false
	for i := 0; i <= len(text); i++ {
		c := byte(' ')
		if i < len(text) {
			c = text[i]
		}
		if 'A' <= c && c <= 'Z' {
			c += 'a' - 'A'
		}
		if 'a' <= c && c <= 'z' || '0' <= c && c <= '9' || c >= 0x80 {
			h, in = (h^uint64(c))*prime, true
			continue
		}
		if !in {
			continue
		}
		if words++; words >= shingleWords {
			s.put(mix(bits.RotateLeft64(last[0], 17) + bits.RotateLeft64(last[1], 34) + h))
		}
		last[0], last[1] = last[1], h
		h, in = offset, false
	}
}

func (s *Sketcher) put(h uint64) {
	s.Shingles++
	bin := h >> (64 - 7)
	if h &= 1<<(64-7) - 1; !s.filled[bin] || h < s.least[bin] {
		s.least[bin], s.filled[bin] = h, true
	}
}

// Sketch returns the sketch of what was added; all zero where that is nothing.
func (s *Sketcher) Sketch() Sketch {
	var out Sketch
	if s.Shingles == 0 {
		return out
	}
	for i := range out {
		// an empty class borrows from the next one that is not, and how far
		// that was is mixed in, so that borrowed bytes agree only where both
		// texts borrow alike
		far := 0
		for !s.filled[(i+far)%sketchSize] {
			far++
		}
		out[i] = byte(mix(s.least[(i+far)%sketchSize] + uint64(far)*0x9E3779B97F4A7C15))
	}
	return out
}

// mix spreads the bits of a number (the finaliser of SplitMix64: Steele, Lea
// and Flood, 2014).
func mix(x uint64) uint64 {
	x = (x ^ x>>30) * 0xBF58476D1CE4E5B9
	x = (x ^ x>>27) * 0x94D049BB133111EB
	return x ^ x>>31
}

// alike estimates the share of runs of words that two narratives have in
// common (Jaccard's coefficient), corrected for bytes that agree by chance.
func alike(a, b *Sketch) float64 {
	same := 0
	for i := range a {
		if a[i] == b[i] {
			same++
		}
	}
	return max(0, (float64(same)/sketchSize-1.0/256)/(1-1.0/256))
}
