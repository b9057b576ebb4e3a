package compensator

// Adaptive is a Compensator that learns while it runs.
type Adaptive interface {
	// Frozen returns a compensator of its own that commands with the coefficients
	// of now for ever and has no past.
	Frozen() Compensator
}

// Frozen returns what a compensator is without learning: another one with the
// coefficients of now, or, of a fixed method, itself.
func Frozen(c Compensator) Compensator {
	if a, ok := c.(Adaptive); ok {
		return a.Frozen()
	}
	return c
}

// visit visits the newest samples, as many as so many ticks ago, counted after
// the next one is there, can ask for.
func (h *history) visit(ago float64, each func(*float64)) {
	for i := range min(int(ago+1e-9)+1, len(h.ring)-1) { // the sum of steps may round across a tick
		each(&h.ring[(h.head-i)&h.mask])
	}
}

// Memory visits nothing: there is no past.
func (*None) Memory(func(*float64)) {}

// Memory visits nothing: there is no past.
func (*Taylor) Memory(func(*float64)) {}

// Memory visits the previous target.
func (c *Inverse) Memory(each func(*float64)) { each(&c.x) }

// Memory visits the previous acceleration.
func (c *ModelInverse) Memory(each func(*float64)) { each(&c.a) }

// Memory visits the past accelerations that the delay reaches back to.
func (c *LinearAcceleration) Memory(each func(*float64)) { c.past.visit(c.ago, each) }

// Memory visits the past targets that the delay reaches back to.
func (p *Polynomial) Memory(each func(*float64)) {
	oldest := 0
	for i := range p.count {
		oldest = max(oldest, p.pairs[i/2][i%2].ago)
	}
	for i := range oldest {
		each(&p.ring[(p.head-i)&p.mask])
	}
}

// Memory visits the past targets that the delay of now reaches back to. The
// target and velocity that it learns with are no part of it.
func (c *DelaySeeking) Memory(each func(*float64)) {
	c.past.visit(float64(c.order)*c.delay.value*c.rate, each)
}

// Frozen is the same with a delay that follows nothing.
func (c *DelaySeeking) Frozen() Compensator {
	f := *c
	f.delay.hold(c.delay.value)
	f.past = history{ring: make([]float64, len(c.past.ring)), mask: c.past.mask}
	f.x, f.v = 0, 0
	return &f
}

// Memory visits the previous target; what it learns with is no part of it.
func (c *AdaptiveInverse) Memory(each func(*float64)) { each(&c.x) }

// Frozen is Inverse with the α of now.
func (c *AdaptiveInverse) Frozen() Compensator {
	return &Inverse{tick: c.tick, delay: (c.alpha - 1) * c.tick, alpha: c.alpha}
}

// Memory visits the past targets that are fitted; what it learns with is no part
// of it.
func (c *LeastSquaresPolynomial) Memory(each func(*float64)) {
	for i := range c.points - 1 {
		at := (c.head - fitRing - i) & (fitRing - 1)
		each(&c.ring[at])
		c.ring[at+fitRing] = c.ring[at]
	}
}

// Frozen is the same with a delay and an amplitude that follow nothing.
func (c *LeastSquaresPolynomial) Frozen() Compensator {
	f := *c
	f.delay.hold(c.delay.value)
	f.amplitude.hold(c.amplitude.value)
	f.ring, f.activity, f.x, f.v = [2 * fitRing]float64{}, 0, 0, 0
	return &f
}

// Memory visits nothing: what a command is made of has no past; what it learns
// from is no part of it.
func (*AdaptiveTimeSeries) Memory(func(*float64)) {}

// Frozen is the series with the coefficients of now.
func (c *AdaptiveTimeSeries) Frozen() Compensator {
	return &series{a0: c.a0, a1: c.a1, a2: c.a2, names: c.Coefficients(nil)}
}
