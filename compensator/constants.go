package compensator

// The numbers that methods have worked out of their settings, for whoever
// writes a tuned compensator in another language: so they are worked out in one
// place. They are those at the start, before anything was learned; SI.

// Tap is one past target in a weighted sum: so many ticks ago, with this
// weight.
type Tap struct {
	Ago    int
	Weight float64
}

// Taps returns the weight of the present target, and the past ones in the
// order in which Command adds them: every second one goes to a sum of its own,
// which is added to the other at the end.
func (p *Polynomial) Taps() (now float64, past []Tap) {
	for i := range p.count {
		t := p.pairs[i/2][i%2]
		past = append(past, Tap{t.ago, t.weight})
	}
	return p.now, past
}

// Law is how a parameter follows the synchronization error (follower).
type Law struct {
	Start     float64 // where it begins
	Step      float64 // κ·dt
	Floor     float64 // q₀²
	Low, High float64
}

func (f *follower) law() Law { return Law{f.start, f.step, f.floor, f.lo, f.hi} }

// Law returns how the delay, s, follows.
func (c *DelaySeeking) Law() Law { return c.delay.law() }

// Bounds returns the start and the bounds of α.
func (c *AdaptiveInverse) Bounds() (start, low, high float64) { return c.start, c.lo, c.hi }

// Fit is the polynomial of LeastSquaresPolynomial on its points.
type Fit struct {
	Weights []float64   // of the assumed delay, the oldest target first
	Basis   [][]float64 // p_j at every point, likewise

	Edge, First  float64   // (M−1)/2 and p_0
	Beta, Invert []float64 // β_j and 1/β_j; that of j = 0 means nothing

	Delay, Amplitude Law
	Fade             float64 // part of the mean square speed that a tick renews
	Floor            float64 // v₀², (m/s)²
}

// Fit returns the polynomial and how delay and amplitude follow.
func (c *LeastSquaresPolynomial) Fit() Fit {
	f := Fit{
		Weights: c.weight[:c.points], Edge: c.edge, First: c.first,
		Beta: c.beta[:c.order+1], Invert: c.invert[:c.order+1],
		Delay: c.delay.law(), Amplitude: c.amplitude.law(), Fade: c.fade, Floor: c.floor,
	}
	for j := range c.order + 1 {
		f.Basis = append(f.Basis, c.basis[j][:c.points])
	}
	return f
}

// Ahead returns p_0 to p_N at a delay, s, after the newest point.
func (c *LeastSquaresPolynomial) Ahead(delay float64) []float64 {
	p := c.ahead(delay)
	return p[:c.order+1]
}

// Section is a second-order section b·(1 + z⁻¹)²/(1 + a1·z⁻¹ + a2·z⁻²).
type Section struct{ B, A1, A2 float64 }

// Learning is how AdaptiveTimeSeries learns.
type Learning struct {
	Sections [2]Section // of the low-pass
	Window   int        // rows
	Floor    float64    // least N·Σ(Y−mean)², m²
	Pivot    float64    // least part of a column's square in a pivot

	A0, A1, A2, Delay                float64 // at the start
	StepAmplitude, StepDelay, StepA2 float64 // most that a tick may change
	MaxA2                            float64
}

// Learning returns how the coefficients are learned, and the start values.
func (c *AdaptiveTimeSeries) Learning() Learning {
	start := *c // the copy starts; its window is not written to
	start.place(c.set.startValues())
	f := &c.filter
	return Learning{
		Sections: [2]Section{{f.b, f.a1, f.a2}, {f.d, f.c1, f.c2}},
		Window:   c.win.size, Floor: c.floor, Pivot: pivotFloor,
		A0: start.a0, A1: start.a1, A2: start.a2, Delay: start.delay,
		StepAmplitude: c.stepAmplitude, StepDelay: c.stepDelay, StepA2: c.stepA2, MaxA2: c.maxA2,
	}
}
