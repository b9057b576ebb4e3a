package compensator

// history holds the newest samples of one signal, one a tick, in a ring whose
// length is a power of two.
type history struct {
	ring []float64
	mask int
	head int // where the newest is
}

// newHistory makes a history that reaches back so many ticks, and one more
// for the interpolation.
func newHistory(ticks float64) history {
	ring := make([]float64, ringSize(int(ticks)+3))
	return history{ring: ring, mask: len(ring) - 1}
}

// fill makes every sample x.
func (h *history) fill(x float64) {
	for i := range h.ring {
		h.ring[i] = x
	}
}

// push adds the newest sample.
func (h *history) push(x float64) {
	h.head = (h.head + 1) & h.mask
	h.ring[h.head] = x
}

// at returns the signal so many ticks before its newest sample, on the
// straight line between the samples on either side: with ago = d+φ it is
// (1−φ)·x_{−d} + φ·x_{−d−1}.
func (h *history) at(ago float64) float64 {
	whole := int(ago)
	a, b := h.ring[(h.head-whole)&h.mask], h.ring[(h.head-whole-1)&h.mask]
	return a + (ago-float64(whole))*(b-a)
}
