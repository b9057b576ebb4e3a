package compensator

import "math"

// lowpass is a fourth-order Butterworth low-pass of unit gain at rest, as two
// second-order sections by the bilinear transform with the cutoff prewarped:
// with K = tan(π·f_c·dt) and section quality Q,
//
//	H(z) = b·(1 + z⁻¹)² / (1 + a1·z⁻¹ + a2·z⁻²),   D = 1 + K/Q + K²,
//	b = K²/D,   a1 = 2(K²−1)/D,   a2 = (1 − K/Q + K²)/D,
//	Q = 1/(2·cos(π/8)), 1/(2·cos(3π/8)).
//
// Fourth order, because the second derivative of a filtered noisy signal is
// taken: of second order, it would pass noise up to half the rate unhindered.
type lowpass struct{ b, a1, a2, d, c1, c2 float64 }

// lowpassState is the memory of one signal's filter: two numbers a section,
// in the transposed direct form.
type lowpassState struct{ p1, p2, q1, q2 float64 }

func newLowpass(cutoff, tick float64) lowpass {
	k := math.Tan(math.Pi * cutoff * tick)
	section := func(halfInverseQ float64) (b, a1, a2 float64) {
		kq := 2 * halfInverseQ * k
		d := 1 + kq + k*k
		return k * k / d, 2 * (k*k - 1) / d, (1 - kq + k*k) / d
	}
	var f lowpass
	f.b, f.a1, f.a2 = section(math.Cos(math.Pi / 8))
	f.d, f.c1, f.c2 = section(math.Cos(3 * math.Pi / 8))
	return f
}

// at returns the memory of a filter whose input has been x for ever.
func (f *lowpass) at(x float64) lowpassState {
	return lowpassState{
		p1: x - f.b*x, p2: f.b*x - f.a2*x,
		q1: x - f.d*x, q2: f.d*x - f.c2*x,
	}
}

// step filters one sample.
func (f *lowpass) step(s *lowpassState, x float64) float64 {
	bx := f.b * x
	y := bx + s.p1
	s.p1 = 2*bx - f.a1*y + s.p2
	s.p2 = bx - f.a2*y
	dy := f.d * y
	z := dy + s.q1
	s.q1 = 2*dy - f.c1*z + s.q2
	s.q2 = dy - f.c2*z
	return z
}
