package excitation

import "math"

// section is a second-order filter with a low-pass and a high-pass output,
//
//	low(s) = g²/(s² + 2ζ·g·s + g²),   high(s) = s²/(s² + 2ζ·g·s + g²),
//
// in the bilinear variable s = (z−1)/(z+1), so that an analogue corner f, Hz,
// of samples at the rate r, Hz, is met exactly by g = tan(π·f/r). Its states
// are the outputs of two trapezoidal integrators. The same filter in direct
// form has the differences of nearly equal coefficients in its place, and at
// corners far below the rate loses the digits that integrators keep.
type section struct {
	a1, a2, a3, k float64
	s1, s2        float64
}

// newSection returns a section at rest; g > 0 and zeta > 0 as above.
func newSection(g, zeta float64) section {
	k := 2 * zeta
	a1 := 1 / (1 + g*(g+k))
	return section{a1: a1, a2: g * a1, a3: g * g * a1, k: k}
}

// lowpass takes the next input sample and returns the low-pass output.
func (s *section) lowpass(x float64) float64 {
	v := x - s.s2
	band := s.a1*s.s1 + s.a2*v
	low := s.s2 + s.a2*s.s1 + s.a3*v
	s.s1, s.s2 = 2*band-s.s1, 2*low-s.s2
	return low
}

// highpass takes the next input sample and returns the high-pass output.
func (s *section) highpass(x float64) float64 {
	v := x - s.s2
	band := s.a1*s.s1 + s.a2*v
	low := s.s2 + s.a2*s.s1 + s.a3*v
	s.s1, s.s2 = 2*band-s.s1, 2*low-s.s2
	return x - s.k*band - low
}

// warped is the bilinear variable of a frequency, Hz, at a sampling rate, Hz.
func warped(frequency, rate float64) float64 { return math.Tan(math.Pi * frequency / rate) }
