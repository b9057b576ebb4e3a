package compensator

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// AdaptiveTimeSeries commands a short Taylor series of the target, whose
// coefficients it learns from what the actuator made of earlier commands
// (Chae, Kazemibidokhti & Ricles 2013):
//
//	u_k = a₀·x + a₁·v + a₂·a,
//
// u the command, m; x, v, a the target's displacement, m, velocity, m/s, and
// acceleration, m/s²; a₁ in s, a₂ in s². An actuator of gain g and delay τ
// starts from a₀ = 1/g, a₁ = τ/g, a₂ = τ²/(2g). The actuator's delay is read
// as a₁/a₀, its gain as 1/a₀.
//
// The coefficients are those that best explain the commands of the window by
// what was measured,
//
//	min Σ_j (U_j − a₀·Y_j − a₁·Ẏ_j − a₂·Ÿ_j)²,
//
// Y and U being measured displacement and command through the same fourth-
// order Butterworth low-pass, which thereby drops out of the relation. U_j is
// the command meant for the instant of Y_j, so a perfect actuator has a delay
// of 0. Derivatives are central differences, Ẏ_j = (Y_{j+1}−Y_{j−1})/(2dt),
// Ÿ_j = (Y_{j+1}−2Y_j+Y_{j−1})/dt², so the newest row is one tick old.
//
// The normal equations are solved by elimination in the order Y, Ẏ, Ÿ, whose
// pivots are what the earlier columns cannot explain of each column. (That
// ratio does not depend on the units of the columns; they need no scaling.)
// In a narrow band Ÿ ≈ −ω²Y, so a₀ and a₂ cannot be told apart, and noise
// would make them wander. A pivot below 10⁻³ of its column is therefore
// lifted to that, and what lifts it pulls: a₂ towards a₁²/(2a₀), its value
// for a pure delay; a₁ towards its present value. A pure sine is then fitted
// by a₀ and a₁ alone, and a well-spread motion by plain least squares, with
// no switch between the two.
//
// Back-substitution goes from a₂ to a₀. a₂ is bounded to 0…delay_max² and
// moves by no more than delay_max·delay_rate·dt a tick before a₁ and a₀ are
// found for it; then a₀ is bounded to amplitude_min…amplitude_max and moves
// by no more than amplitude_rate·dt, and a₁/a₀ to delay_min…delay_max and by
// no more than delay_rate·dt.
//
// Nothing is learned while the rms of Y about its mean over the window is
// below the threshold: neither rest nor a standing offset says anything of
// the actuator. Until the window has filled, the time before the start counts
// as rest in that rms, so that learning begins early only in strong motion.
//
// A sensor's noise makes Ẏ and Ÿ too large and hence a₁ and a₂ too small; a
// lower cutoff or a higher threshold helps.
type AdaptiveTimeSeries struct {
	tick float64
	set  timeSeriesSettings

	a0, a1, a2 float64
	delay      float64 // a₁/a₀, s

	stepAmplitude, stepDelay, stepA2 float64 // most that a tick may change
	maxA2                            float64
	floor                            float64 // least N·Σ(Y−mean)², m²
	half, square                     float64 // 1/(2dt), 1/dt²

	filter                 lowpass
	measured, commanded    lowpassState
	last                   float64 // u_{k−1}, m
	older, centre, partner float64 // Y two and one ticks ago, U one tick ago
	settle                 int     // ticks until the filters are trusted again
	win                    window
}

// timeSeriesSettings are the settings as given, SI.
type timeSeriesSettings struct {
	delay, gain, window, cutoff, threshold float64
	amplitudeMin, amplitudeMax             float64
	delayMin, delayMax                     float64
	amplitudeRate, delayRate               float64
}

var _ Compensator = (*AdaptiveTimeSeries)(nil)

// pivotFloor is the part of a column's own square that must be left after
// the earlier columns have explained what they can. 10⁻³ is a band of about
// ±1.6 % about one frequency, where the share of noise in Ÿ is no smaller.
const pivotFloor = 1e-3

// minWindowTicks is the fewest rows that a window may hold: enough more than
// the three unknowns for the fit to average.
const minWindowTicks = 8

var adaptiveTimeSeriesSettings = []kind.Setting{
	delaySetting("delay τ assumed at the start"),
	kind.Number("gain", quantity.None, "actuator gain g assumed at the start").Default(1).Range(0.5, 2),
	kind.Number("window", quantity.Time, "length of the moving window of the fit").Default(1).Range(0.05, 10),
	kind.Number("cutoff", quantity.Frequency, "cutoff of the low-pass on command and measured").Default(20).Range(1, 500),
	kind.Number("threshold", quantity.Length, "rms of measured over the window below which nothing is learned").Default(1e-3).Range(1e-6, 1),
	kind.Number("amplitude_min", quantity.None, "smallest coefficient a₀").Default(0.7).Range(0.1, 10),
	kind.Number("amplitude_max", quantity.None, "largest coefficient a₀").Default(1.4).Range(0.1, 10),
	kind.Number("delay_min", quantity.Time, "smallest delay that may be adapted to").Default(0).Range(0, maxDelay),
	kind.Number("delay_max", quantity.Time, "largest delay that may be adapted to").Default(60e-3).Range(0, maxDelay),
	kind.Number("amplitude_rate", quantity.Frequency, "fastest change of a₀, in units a second").Default(0.5).Range(0, 1000),
	kind.Number("delay_rate", quantity.None, "fastest change of the delay, in seconds a second").Default(0.1).Range(0, 1000),
}

var adaptiveTimeSeriesKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name:     "adaptive-time-series",
		Doc:      "Taylor series of the target, coefficients by moving least squares",
		Equation: "u = a₀·x + a₁·v + a₂·a, min Σ(U − a₀Y − a₁Ẏ − a₂Ÿ)² over the window, U and Y filtered",
		Source:   "Chae, Kazemibidokhti & Ricles 2013",
		Settings: adaptiveTimeSeriesSettings,
	},
	New: newAdaptiveTimeSeries,
}

func newAdaptiveTimeSeries(tick float64, v kind.Values) (Compensator, error) {
	c := &AdaptiveTimeSeries{tick: tick}
	set, err := c.read(v)
	if err != nil {
		return nil, err
	}
	c.half, c.square = 1/(2*tick), 1/(tick*tick)
	c.filter = newLowpass(set.cutoff, tick)
	c.win.resize(set.ticks(tick))
	c.apply(set)
	c.Start(0, 0)
	return c, nil
}

// ticks is the length of the window in ticks.
func (s *timeSeriesSettings) ticks(tick float64) int { return int(math.Round(s.window / tick)) }

// read checks the settings and takes them from the table.
func (c *AdaptiveTimeSeries) read(v kind.Values) (set timeSeriesSettings, err error) {
	if err := check(c.tick, adaptiveTimeSeriesSettings, v); err != nil {
		return set, err
	}
	if err := checkDelays(v); err != nil {
		return set, err
	}
	set = timeSeriesSettings{
		delay: v.Num("delay"), gain: v.Num("gain"),
		window: v.Num("window"), cutoff: v.Num("cutoff"), threshold: v.Num("threshold"),
		amplitudeMin: v.Num("amplitude_min"), amplitudeMax: v.Num("amplitude_max"),
		delayMin: v.Num("delay_min"), delayMax: v.Num("delay_max"),
		amplitudeRate: v.Num("amplitude_rate"), delayRate: v.Num("delay_rate"),
	}
	switch {
	case set.amplitudeMin > set.amplitudeMax:
		err = fmt.Errorf("amplitude_min: %v is above amplitude_max, %v", set.amplitudeMin, set.amplitudeMax)
	case 1/set.gain < set.amplitudeMin:
		err = fmt.Errorf("gain: %v makes a₀ = 1/gain smaller than amplitude_min, %v", set.gain, set.amplitudeMin)
	case 1/set.gain > set.amplitudeMax:
		err = fmt.Errorf("gain: %v makes a₀ = 1/gain larger than amplitude_max, %v", set.gain, set.amplitudeMax)
	case set.cutoff*c.tick >= 0.5:
		err = fmt.Errorf("cutoff: %v Hz is not below half the rate, %v Hz", set.cutoff, 0.5/c.tick)
	case set.ticks(c.tick) < minWindowTicks:
		err = fmt.Errorf("window: %v s holds fewer than %d ticks of %v s", set.window, minWindowTicks, c.tick)
	}
	return set, err
}

// apply takes over all settings but start values, filter and window length.
func (c *AdaptiveTimeSeries) apply(set timeSeriesSettings) {
	c.set = set
	c.stepAmplitude = set.amplitudeRate * c.tick
	c.stepDelay = set.delayRate * c.tick
	c.stepA2 = set.delayMax * set.delayRate * c.tick
	c.maxA2 = set.delayMax * set.delayMax
	n := float64(c.win.size)
	c.floor = n * set.threshold * set.threshold
}

// place sets the coefficients, within their bounds.
func (c *AdaptiveTimeSeries) place(a0, delay, a2 float64) {
	c.a0 = clamp(a0, c.set.amplitudeMin, c.set.amplitudeMax)
	c.delay = clamp(delay, c.set.delayMin, c.set.delayMax)
	c.a2 = clamp(a2, 0, c.maxA2)
	c.a1 = c.delay * c.a0
}

// startValues are the coefficients before anything was learned.
func (s *timeSeriesSettings) startValues() (a0, delay, a2 float64) {
	return 1 / s.gain, s.delay, s.delay * s.delay / (2 * s.gain)
}

// Start forgets all that was learned; the filters have measured y, and the
// command a₀·x, as their whole past.
func (c *AdaptiveTimeSeries) Start(x, y float64) {
	c.place(c.set.startValues())
	c.last = c.a0 * x
	c.measured, c.commanded = c.filter.at(y), c.filter.at(c.last)
	c.older, c.centre, c.partner = y, y, c.last
	c.settle = 0
	c.win.clear()
}

// Prime learns from the pair of what was commanded and measured, which says as
// much of the actuator whoever commanded it.
func (c *AdaptiveTimeSeries) Prime(in Input, u float64) {
	c.Command(in)
	c.last = u
}

// Command learns from the newest measurement and returns the command.
func (c *AdaptiveTimeSeries) Command(in Input) float64 {
	y := c.filter.step(&c.measured, in.Y)
	u := c.filter.step(&c.commanded, c.last)
	if c.settle > 0 {
		c.settle--
	} else {
		c.win.push(row{
			y: c.centre,
			v: (y - c.older) * c.half,
			a: (y - 2*c.centre + c.older) * c.square,
			u: c.partner,
		})
		c.adapt()
	}
	c.older, c.centre, c.partner = c.centre, y, u
	c.last = c.a0*in.X + c.a1*in.V + c.a2*in.A
	return c.last
}

// adapt fits the coefficients to the window and moves them there as far as
// bounds and rates allow.
func (c *AdaptiveTimeSeries) adapt() {
	s := &c.win.run
	n := float64(c.win.count)
	if !(n*s.yy-s.y*s.y >= c.floor*n) {
		return
	}
	// Elimination. z is the right side, d the pivots, each lifted to its
	// floor by a pull towards a known value.
	inv0 := 1 / s.yy
	l1, l2 := s.yv*inv0, s.ya*inv0
	d1, z1 := s.vv-l1*s.yv, s.uv-l1*s.uy
	if least := pivotFloor * s.vv; d1 < least {
		z1 += (least - d1) * c.a1
		d1 = least
	}
	inv1 := 1 / d1
	m := s.va - l1*s.ya
	d2 := s.aa - l2*s.ya - m*m*inv1
	z2 := s.ua - l2*s.uy - m*z1*inv1
	// vv²/yy is what aa is in a pure sine; it stands in where Ÿ is nil.
	if least := pivotFloor * max(s.aa, s.vv*s.vv*inv0); d2 < least {
		z2 += (least - d2) * 0.5 * c.delay * c.a1
		d2 = least
	}

	a2 := approach(c.a2, clamp(z2/d2, 0, c.maxA2), c.stepA2)
	a1 := (z1 - m*a2) * inv1
	a0 := (s.uy - s.yv*a1 - s.ya*a2) * inv0
	if rest := a0 + a1; rest-rest != 0 { // the sums overflowed: NaN or infinite
		return
	}
	c.a2 = a2
	c.a0 = approach(c.a0, clamp(a0, c.set.amplitudeMin, c.set.amplitudeMax), c.stepAmplitude)
	c.delay = approach(c.delay, clamp(a1/c.a0, c.set.delayMin, c.set.delayMax), c.stepDelay)
	c.a1 = c.delay * c.a0
}

// Retune changes the settings. Other start values shift the coefficients by
// the difference; narrower bounds bring them to the bound. Another window
// keeps the newest rows that fit. Another cutoff keeps the rows that were
// filtered alike by the old one, and learning rests until the new filters
// have settled.
func (c *AdaptiveTimeSeries) Retune(v kind.Values) error {
	set, err := c.read(v)
	if err != nil {
		return err
	}
	oldSet := c.set
	if n := set.ticks(c.tick); n != c.win.size {
		c.win.resize(n)
	}
	c.apply(set)
	if set == oldSet {
		return nil
	}
	a0, delay, a2 := set.startValues()
	old0, oldDelay, old2 := oldSet.startValues()
	c.place(c.a0+(a0-old0), c.delay+(delay-oldDelay), c.a2+(a2-old2))
	if set.cutoff != oldSet.cutoff {
		c.filter = newLowpass(set.cutoff, c.tick)
		c.measured, c.commanded = c.filter.at(c.centre), c.filter.at(c.partner)
		// The slower pole pair decays as e^(−0.383·2π·cutoff·t): e^(−7.2).
		c.settle = int(3/(set.cutoff*c.tick)) + 2
	}
	return nil
}

// Coefficients appends the coefficients, the actuator's delay a₁/a₀ and its
// gain 1/a₀.
func (c *AdaptiveTimeSeries) Coefficients(dst []Coefficient) []Coefficient {
	return append(dst,
		Coefficient{"a0", c.a0, quantity.None},
		Coefficient{"a1", c.a1, quantity.Time},
		Coefficient{"a2", c.a2, quantity.Dim{Time: 2}},
		Coefficient{"delay", c.delay, quantity.Time},
		Coefficient{"gain", 1 / c.a0, quantity.None})
}
