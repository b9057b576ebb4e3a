package excitation

import (
	"fmt"
	"math"
)

// Baseline correction: an acceleration that can be integrated twice without
// running away. The steps are those of strong-motion processing (Converse &
// Brady 1992; Boore 2005), but for the last:
//
//  1. the straight line that fits the acceleration best by least squares is
//     taken off;
//  2. zeros are put before and behind it, 1.5·n/fc seconds each;
//  3. a Butterworth high-pass of order n = 4 and corner fc runs over it
//     forward and then backward: no phase, amplitude 1/(1 + (fc/f)⁸);
//  4. the zeros are cut off again. The filter's precursor has by then given
//     the motion a velocity v0 and a displacement x0, which would remain as
//     the drift x0 + v0·t of a motion that starts at rest; likewise it ends
//     with some of both. Both are taken up within one corner period (half the
//     record at most) of either end by the smooth acceleration
//     τ(1−τ)(p + q(1−2τ)), τ from 0 to 1 over that time.
//
// Integrated from rest, with the acceleration linear between samples, the
// motion starts and ends with zero displacement and velocity.
const (
	highpassOrder = 4
	padFactor     = 1.5 * highpassOrder // pad times corner frequency
	fewestSamples = 16                  // of an acceleration that is integrated
	samplesCorner = 20                  // fewest to a corner period
	mostPadding   = 4e6                 // samples at either end
)

// correctBaseline does that to an acceleration at even steps, s, in place.
// The corner is in Hz. Errors name the setting.
func correctBaseline(a []float64, step, corner float64) error {
	if len(a) < fewestSamples {
		return fmt.Errorf("file: %d samples between start and end; an acceleration that is integrated needs at least %d", len(a), fewestSamples)
	}
	if samplesCorner*corner*step > 1 {
		return fmt.Errorf("corner_frequency: %g Hz leaves fewer than %d samples of %g s to its period", corner, samplesCorner, step)
	}
	padding := math.Ceil(padFactor / (corner * step))
	if padding > mostPadding {
		return fmt.Errorf("corner_frequency: at %g Hz the filter needs %.3g samples of %g s beside the record; at most %g", corner, padding, step, mostPadding)
	}
	detrend(a)
	pad := int(padding)
	padded := make([]float64, len(a)+2*pad)
	copy(padded[pad:], a)
	highpassBothWays(padded, corner*step)
	copy(a, padded[pad:])

	ease := min((len(a)-1)/2, int(1/(corner*step)))
	start := integrate(padded[:pad+1], step)
	takeUp(a[:ease+1], step, start.v, start.x+start.v*step*float64(ease))
	end := integrate(a, step)
	takeUp(a[len(a)-1-ease:], step, -end.v, -end.x)
	return nil
}

// detrend takes off the straight line of least squares.
func detrend(a []float64) {
	middle := float64(len(a)-1) / 2
	mean, slope, weight := 0.0, 0.0, 0.0
	for i, x := range a {
		t := float64(i) - middle
		mean += x
		slope += t * x
		weight += t * t
	}
	mean, slope = mean/float64(len(a)), slope/weight
	for i := range a {
		a[i] -= mean + slope*(float64(i)-middle)
	}
}

// highpassBothWays runs the high-pass forward and backward, from rest. The
// corner is given in cycles a sample. The pole pairs of a Butterworth filter
// of order 4 have the damping ratios sin(π/8) and sin(3π/8).
func highpassBothWays(a []float64, corner float64) {
	g := warped(corner, 1)
	fresh := [...]section{newSection(g, math.Sin(math.Pi/8)), newSection(g, math.Sin(3*math.Pi/8))}
	s := fresh
	for i, x := range a {
		a[i] = s[1].highpass(s[0].highpass(x))
	}
	s = fresh
	for i := len(a) - 1; i >= 0; i-- {
		a[i] = s[1].highpass(s[0].highpass(a[i]))
	}
}

// motionState is a displacement, m, and a velocity, m/s.
type motionState struct{ x, v float64 }

// over carries the state over a step h, s, in which the acceleration, m/s²,
// runs straight from a to b:
//
//	x ← x + h·v + h²·(2a + b)/6,   v ← v + h·(a + b)/2.
func (m *motionState) over(h, a, b float64) {
	m.x += h * (m.v + h*(2*a+b)/6)
	m.v += h * (a + b) / 2
}

// integrate returns the state at the last sample, from rest at the first.
func integrate(a []float64, step float64) (m motionState) {
	for i := 1; i < len(a); i++ {
		m.over(step, a[i-1], a[i])
	}
	return m
}

// takeUp adds τ(1−τ)(p + q(1−2τ)), τ from 0 at the first sample to 1 at the
// last, with p and q such that the velocity at the last grows by dv, m/s, and
// the displacement there by dx, m. A sample a_i that the motion runs straight
// to and from counts as a_i·h of velocity and a_i·h·(t_end − t_i) of
// displacement; the even part p has its centre in the middle, and the odd
// part q adds no velocity.
func takeUp(a []float64, step, dv, dx float64) {
	m := float64(len(a) - 1)
	length := m * step
	even, odd := 0.0, 0.0 // velocity for p = 1, displacement for q = 1
	for i := range a {
		tau := float64(i) / m
		bump := tau * (1 - tau)
		even += bump * step
		odd += bump * (1 - 2*tau) * step * length * (1 - tau)
	}
	p := dv / even
	q := (dx - dv*length/2) / odd
	for i := range a {
		tau := float64(i) / m
		a[i] += tau * (1 - tau) * (p + q*(1-2*tau))
	}
}
