package plant

// work sums the work ∫ f dy that is done on an element, J, by the trapezoid
// rule ½(f₀ + f₁)·Δy, the rule by which a loop of ticks balances its energy.
// A day at 2048 Hz has 1.8e8 ticks, so the rounding error of every addition
// is recovered (Knuth 1969, TwoSum) and summed apart.
type work struct {
	f, y      float64 // at the last move, N and m
	sum, lost float64 // J; the work is sum + lost
}

// start forgets all work and sets force and displacement.
func (w *work) start(f, y float64) { *w = work{f: f, y: y} }

// move adds the work of a move to displacement y, m, where the force is f, N.
func (w *work) move(f, y float64) {
	// The conversion keeps the product from being fused into the sum, which
	// would spoil the recovered error.
	x := float64(0.5 * (w.f + f) * (y - w.y))
	s := w.sum + x
	part := s - w.sum
	w.lost += (w.sum - (s - part)) + (x - part)
	w.sum, w.f, w.y = s, f, y
}

// total is the work done since start, J.
func (w *work) total() float64 { return w.sum + w.lost }
