package gauge

import (
	"math"
	"math/cmplx"
)

// FEI is the frequency evaluation index of measured against target (Guo et al.
// 2014), with exponent 2. With X_i, Y_i the discrete Fourier transforms of x and y
// and sums over the positive frequencies f_i (the mean does not count),
//
//	FEI  = Σ(Y_i/X_i)|X_i|² / Σ|X_i|² = ΣY_i·X̄_i / Σ|X_i|²
//	f_eq = Σf_i|X_i|² / Σ|X_i|²
//
// A gain g and a delay τ on a sine over whole periods give Amplitude g, Delay τ
// and its Frequency exactly. All are NaN when the target never moved, the delay
// also when the measured displacement did not.
//
// The transform has no window and no padding. It takes the record whole when its
// length has no prime factor above 13. Else it leaves out what comes first to reach
// such a length: less than 2 % of a record of 500 ticks or more, less than 1 % from
// 5000 on.
type FEI struct {
	Amplitude float64 // |FEI|
	Delay     float64 // −arg(FEI)/(2π·f_eq), s, positive when late
	Frequency float64 // f_eq, Hz
}

// feiSums are the sums of the index over segments, in power: each segment's are
// divided by its length.
type feiSums struct {
	cross complex128 // ΣY·X̄/n
	power float64    // Σ|X|²/n
	mean  float64    // Σf|X|²/n, f in cycles per tick
}

// constant is the share of Σ|x|² below which a spectrum is rounding.
const constant = 1e-24

// add adds the segment that the workspace holds, leaves the spectra there, and
// returns of how many ticks they are.
func (s *feiSums) add(w *workspace) int {
	n := w.transform()
	if n < 2 {
		return n
	}
	var re, im, power, moment float64
	spectrumY := w.fy[:len(w.fx)]
	for i := 1; i < len(w.fx); i++ {
		a, b := real(w.fx[i]), imag(w.fx[i])
		c, d := real(spectrumY[i]), imag(spectrumY[i])
		p := a*a + b*b
		power += p
		moment += p * float64(i)
		re += c*a + d*b
		im += d*a - c*b
	}
	k := float64(n)
	if power <= constant*k*dot(w.x, w.x) {
		return n // what is left of a target that stood still in the part transformed
	}
	s.cross += complex(re/k, im/k)
	s.power += power / k
	s.mean += moment / (k * k)
	return n
}

func (s *feiSums) result(tick float64) FEI {
	if s.power == 0 {
		return FEI{math.NaN(), math.NaN(), math.NaN()}
	}
	index := s.cross / complex(s.power, 0)
	f := FEI{
		Amplitude: cmplx.Abs(index),
		Delay:     math.NaN(),
		Frequency: s.mean / s.power / tick,
	}
	if index != 0 {
		f.Delay = (0 - cmplx.Phase(index)) / (2 * math.Pi * f.Frequency) // never −0
	}
	return f
}
