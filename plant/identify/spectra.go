package identify

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/dsp/fourier"
)

// Spectra are averaged spectra of two signals x and y: one-sided densities,
// unit²/Hz, at frequencies from 0 to half the rate.
type Spectra struct {
	Hz       []float64
	XX, YY   []float64
	XY       []complex128 // conj(X)·Y
	Segments int          // how many were averaged
}

// Welch estimates spectra by Welch's method (Welch 1967): segments of the given
// length that overlap by half (rounded down), each without its mean and under a
// periodic Hann window, their periodograms averaged. What is left at the end is
// not used. The tick is in seconds.
func Welch(x, y []float64, tick float64, segment int) (*Spectra, error) {
	switch {
	case len(x) != len(y):
		return nil, fmt.Errorf("%d samples of one signal but %d of the other", len(x), len(y))
	case segment < 2 || segment > len(x):
		return nil, fmt.Errorf("segment: %d samples are not between 2 and the %d of the record", segment, len(x))
	case !(tick > 0):
		return nil, fmt.Errorf("tick: %v s is no time step", tick)
	}
	bins := segment/2 + 1
	s := &Spectra{Hz: make([]float64, bins), XX: make([]float64, bins), YY: make([]float64, bins), XY: make([]complex128, bins)}
	// The library's transform copies small structures on the stack all the time,
	// and how fast that is depends, by a factor of up to four, on where the stack
	// happens to be. On a stack of its own it is always at the same place.
	done := make(chan struct{})
	go func() {
		defer close(done)
		s.average(x, y, tick, segment)
	}()
	<-done
	return s, nil
}

// average fills in the spectra.
func (s *Spectra) average(x, y []float64, tick float64, segment int) {
	w, power := hann(segment)
	bins := len(s.Hz)
	fft := fourier.NewFFT(segment)
	piece := make([]float64, segment)
	fx, fy := make([]complex128, bins), make([]complex128, bins)
	for from := 0; from+segment <= len(x); from += segment - segment/2 {
		windowed(piece, x[from:from+segment], w)
		fft.Coefficients(fx, piece)
		windowed(piece, y[from:from+segment], w)
		fft.Coefficients(fy, piece)
		for i := range bins {
			s.XX[i] += real(fx[i])*real(fx[i]) + imag(fx[i])*imag(fx[i])
			s.YY[i] += real(fy[i])*real(fy[i]) + imag(fy[i])*imag(fy[i])
			s.XY[i] += complex(real(fx[i]), -imag(fx[i])) * fy[i]
		}
		s.Segments++
	}
	for i := range bins {
		scale := tick / (power * float64(s.Segments))
		if i > 0 && !(segment%2 == 0 && i == bins-1) {
			scale *= 2 // the other side
		}
		s.Hz[i] = float64(i) / (float64(segment) * tick)
		s.XX[i] *= scale
		s.YY[i] *= scale
		s.XY[i] *= complex(scale, 0)
	}
}

// hann is the periodic Hann window and the sum of its squares.
func hann(n int) (w []float64, power float64) {
	w = make([]float64, n)
	for i := range w {
		w[i] = 0.5 - 0.5*math.Cos(2*math.Pi*float64(i)/float64(n))
		power += w[i] * w[i]
	}
	return w, power
}

func windowed(dst, x, w []float64) {
	m := mean(x)
	for i := range dst {
		dst[i] = (x[i] - m) * w[i]
	}
}

// Coherence returns |S_xy|²/(S_xx·S_yy) at bin i, 0 where there is nothing.
func (s *Spectra) Coherence(i int) float64 {
	if p := s.XX[i] * s.YY[i]; p > 0 {
		return (real(s.XY[i])*real(s.XY[i]) + imag(s.XY[i])*imag(s.XY[i])) / p
	}
	return 0
}

// Response returns the frequency response S_xy/S_xx from x to y at bin i (H1:
// the noise is in y).
func (s *Spectra) Response(i int) complex128 {
	if s.XX[i] > 0 {
		return s.XY[i] / complex(s.XX[i], 0)
	}
	return 0
}

// Independent is how many segments without overlap would tell as much: under a
// Hann window neighbours that overlap by half share (1/6)² of their power
// (Welch 1967).
func (s *Spectra) Independent() float64 {
	k := float64(s.Segments)
	return k / (1 + 2*(k-1)/k/36)
}
