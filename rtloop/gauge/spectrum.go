package gauge

import "math"

// Spectrum compares the response spectra of two base motions, the target's and
// the measured one's: what oscillators of many periods would feel on the shaking
// table that was asked for, and on the one that came.
//
// An oscillator of period T and damping ratio ζ on a base that moves by s has the
// relative displacement z,
//
//	z̈ + 2ζωż + ω²z = −s̈,  ω = 2π/T,  Sa(T) = ω²·max|z| (pseudo-acceleration).
//
// Between ticks s moves straight, so that s̈ is an impulse at each tick, the change
// of the slope of s: z goes on exactly in between, and no displacement is
// differentiated twice. Sampling s so is right to second order in ω·tick.
type Spectrum struct {
	tick         float64
	oscillators  []oscillator
	x, y         float64 // last samples
	vx, vy       float64 // slopes of the last tick
	targetPeak   []float64
	measuredPeak []float64
}

// oscillator has its exact transition over a tick, and its state on either base.
type oscillator struct {
	a11, a12, a21, a22 float64
	zx, ux, zy, uy     float64 // relative displacement and velocity on x and on y
	omega2             float64
}

// The periods at which spectra are compared: so many, evenly spaced in their
// logarithm, from the stiffest to the softest structure that a table test is
// usually about (common practice).
const (
	spectrumPeriods  = 31
	shortestPeriod   = 0.1 // s
	longestPeriod    = 3.0
	spectrumDamping  = 0.05
	spectrumFewTicks = 10 // a period must have so many ticks to be resolved
)

// NewSpectrum returns the comparison for ticks of so many seconds. Periods of
// fewer than ten ticks are left out.
func NewSpectrum(tick float64) *Spectrum {
	s := &Spectrum{tick: tick}
	ratio := math.Pow(longestPeriod/shortestPeriod, 1/float64(spectrumPeriods-1))
	for i := range spectrumPeriods {
		if period := shortestPeriod * math.Pow(ratio, float64(i)); period >= spectrumFewTicks*tick {
			s.oscillators = append(s.oscillators, newOscillator(2*math.Pi/period, spectrumDamping, tick))
		}
	}
	s.targetPeak = make([]float64, len(s.oscillators))
	s.measuredPeak = make([]float64, len(s.oscillators))
	return s
}

func newOscillator(omega, zeta, tick float64) oscillator {
	damped := omega * math.Sqrt(1-zeta*zeta)
	e := math.Exp(-zeta * omega * tick)
	sin, cos := math.Sincos(damped * tick)
	q := zeta * omega / damped
	return oscillator{
		a11: e * (cos + q*sin), a12: e * sin / damped,
		a21: -e * omega * omega / damped * sin, a22: e * (cos - q*sin),
		omega2: omega * omega,
	}
}

// Start puts both bases at rest.
func (s *Spectrum) Start(x, y float64) {
	s.x, s.y, s.vx, s.vy = x, y, 0, 0
	for i := range s.oscillators {
		o := &s.oscillators[i]
		o.zx, o.ux, o.zy, o.uy = 0, 0, 0, 0
		s.targetPeak[i], s.measuredPeak[i] = 0, 0
	}
}

// Add takes the samples of one tick, m.
func (s *Spectrum) Add(x, y float64) {
	vx, vy := (x-s.x)/s.tick, (y-s.y)/s.tick
	jx, jy := vx-s.vx, vy-s.vy
	s.x, s.y, s.vx, s.vy = x, y, vx, vy
	for i := range s.oscillators {
		o := &s.oscillators[i]
		ux, uy := o.ux-jx, o.uy-jy
		o.zx, o.ux = o.a11*o.zx+o.a12*ux, o.a21*o.zx+o.a22*ux
		o.zy, o.uy = o.a11*o.zy+o.a12*uy, o.a21*o.zy+o.a22*uy
		s.targetPeak[i] = max(s.targetPeak[i], math.Abs(o.zx))
		s.measuredPeak[i] = max(s.measuredPeak[i], math.Abs(o.zy))
	}
}

// Error returns the rms over the periods of Sa(measured)/Sa(target) − 1; NaN
// while the target has not moved.
func (s *Spectrum) Error() float64 {
	sum := 0.0
	for i, target := range s.targetPeak {
		e := s.measuredPeak[i]/target - 1 // 0/0 at rest
		sum += e * e
	}
	if len(s.targetPeak) == 0 || math.IsInf(sum, 0) {
		return math.NaN()
	}
	return math.Sqrt(sum / float64(len(s.targetPeak)))
}

// Points returns period, s, and the two pseudo-accelerations, m/s², of every
// oscillator.
func (s *Spectrum) Points() (period, target, measured []float64) {
	for i := range s.oscillators {
		w2 := s.oscillators[i].omega2
		period = append(period, 2*math.Pi/math.Sqrt(w2))
		target = append(target, w2*s.targetPeak[i])
		measured = append(measured, w2*s.measuredPeak[i])
	}
	return period, target, measured
}
