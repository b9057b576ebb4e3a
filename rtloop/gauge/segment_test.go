package gauge

import (
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"
)

// table is noise repeated every len ticks, and its late and weaker image.
func (s *noise) table(gain, delay float64) (x, y []float64) {
	x, y = make([]float64, s.n), make([]float64, s.n)
	for k := range x {
		x[k], y[k] = s.at(float64(k)), gain*s.at(float64(k)-delay)
	}
	return x, y
}

// TestLongRun: three full segments of 2²⁰ ticks and a part of one. The motion
// repeats every 4096 ticks, so that full segments give its closed form; the
// part, a thirtieth of the ticks, is cut off inside a repeat. Its ends, 5 in 10⁵
// samples, change amplitude and delay of the whole by less than 10⁻⁵. The jump J
// between the ends adds J²/(2π²σ²n)·ln(n/2) cycles per tick to its mean frequency:
// for J = σ and the 6·10⁻³ here a thousandth, and a thirtieth of that to the whole.
func TestLongRun(t *testing.T) {
	const tick, gain, delay, n = 1.0 / 1024, 0.9, 5.3, 3*segment + 100_001
	s := newNoise(4096, 4, 40, 1)
	x, y := s.table(gain, delay)
	r := recorded(NewRecord(tick, n), n, func(k int) (float64, float64) { return x[k%4096], y[k%4096] })
	a := r.Finish()
	index, f := s.index(gain, delay)
	want := -cmplx.Phase(index) / (2 * math.Pi * f / tick)
	if !agrees(a.FEI.Amplitude, cmplx.Abs(index), 1e-5) || !agrees(a.FEI.Delay, want, 1e-5) ||
		!agrees(a.FEI.Frequency, f/tick, 1e-4) {
		t.Errorf("index %+v, want amplitude %v, delay %v, frequency %v", a.FEI, cmplx.Abs(index), want, f/tick)
	}
	fastest := 2 * math.Pi * 40 / 4096.0
	if !within(a.Delay/tick, delay, fastest*fastest/62) {
		t.Errorf("by correlation %v ticks, want %v", a.Delay/tick, delay)
	}
	if len(r.buf) > segment || len(r.spare) > segment {
		t.Errorf("%d and %d samples kept, more than a segment each", len(r.buf), len(r.spare))
	}
}

// TestSegmentsAgainstTheWholeRecord compares the sums over short segments with
// the same quantities of the whole record at once, by definition: every lag by
// its own loop, the spectra in one transform.
func TestSegmentsAgainstTheWholeRecord(t *testing.T) {
	const tick, part, n, delay = 1.0 / 256, 4096, 3*4096 + 1500, 5.3
	s := newNoise(n, 20, 700, 7)
	other := newNoise(n, 20, 2000, 8)
	var xs, ys []float64
	r := newRecord(tick, n, part)
	r.Start(0, 0)
	for k := range n {
		x := s.at(float64(k))
		y := 0.9*s.at(float64(k)-delay) + 0.1*other.at(float64(k))
		xs, ys = append(xs, x), append(ys, y)
		r.Add(x, y)
	}
	a := r.Finish()
	if again := r.Finish(); again.Delay != a.Delay || again.FEI != a.FEI {
		t.Errorf("a second Finish gives %+v after %+v", again, a)
	}

	fx, fy := fourier.NewFFT(n).Coefficients(nil, xs), fourier.NewFFT(n).Coefficients(nil, ys)
	var cross complex128
	var power, moment float64
	for i := 1; i < len(fx); i++ {
		p := real(fx[i] * cmplx.Conj(fx[i]))
		cross += fy[i] / fx[i] * complex(p, 0)
		power += p
		moment += p * float64(i) / n / tick
	}
	f := moment / power
	amplitude := cmplx.Abs(cross) / power
	late := -cmplx.Phase(cross) / (2 * math.Pi * f)
	// At the start of each segment the response to what came before it does not
	// fit the target: 5 samples in 4096, and the noise meets other bins.
	if !agrees(a.FEI.Amplitude, amplitude, 3e-3) || !agrees(a.FEI.Delay, late, 1e-2) ||
		!agrees(a.FEI.Frequency, f, 3e-3) {
		t.Errorf("index %+v, of the whole record amplitude %v, delay %v, frequency %v",
			a.FEI, amplitude, late, f)
	}

	// The lags do not see across the borders of segments, 5 products in 4096;
	// what that changes in the noise's share of the peak is far below 0.01 ticks.
	best, at := -1.0, 0
	for lag := -128; lag <= 128; lag++ {
		if c := coefficient(xs, ys, lag); c > best {
			best, at = c, lag
		}
	}
	before, after := coefficient(xs, ys, at-1), coefficient(xs, ys, at+1)
	want := float64(at) + (before-after)/(2*(before-2*best+after))
	if !within(a.Delay/tick, want, 0.01) {
		t.Errorf("by correlation %v ticks, of the whole record %v", a.Delay/tick, want)
	}
}

// coefficient is the correlation coefficient of the overlap, two passes.
func coefficient(x, y []float64, lag int) float64 {
	if lag >= 0 {
		x, y = x[:len(x)-lag], y[lag:]
	} else {
		x, y = x[-lag:], y[:len(y)+lag]
	}
	var mx, my, xy, xx, yy float64
	for k := range x {
		mx += x[k] / float64(len(x))
		my += y[k] / float64(len(x))
	}
	for k := range x {
		xy += (x[k] - mx) * (y[k] - my)
		xx += (x[k] - mx) * (x[k] - mx)
		yy += (y[k] - my) * (y[k] - my)
	}
	return xy / math.Sqrt(xx*yy)
}

// TestEveryLagTwoWays: the sums kept for segments give the coefficient that its
// definition gives, at every lag.
func TestEveryLagTwoWays(t *testing.T) {
	const n = 601
	s, other := newNoise(n, 1, 200, 5), newNoise(n, 1, 300, 6)
	samples := make([]point, n)
	x, y := make([]float64, n), make([]float64, n)
	for k := range samples {
		x[k] = 0.3 + s.at(float64(k))
		y[k] = s.at(float64(k)-4.5) + other.at(float64(k)) - 0.1
		samples[k] = point{x[k], y[k]}
	}
	sums := newLagSums(n / 4)
	w := takeWorkspace()
	defer w.release()
	w.load(samples)
	sums.add(w)
	single := overlap{x: w.x, y: w.y}
	single.total()
	for lag := -n / 4; lag <= n/4; lag++ {
		want := coefficient(x, y, lag)
		// Absolute: transforms round to 10⁻¹⁶ of the whole, not of each lag.
		if got := sums.coefficient(lag); !within(got, want, 1e-13) {
			t.Errorf("lag %d: by transform %v, want %v", lag, got, want)
		}
		if got := single.coefficient(lag); !within(got, want, 1e-13) {
			t.Errorf("lag %d: by itself %v, want %v", lag, got, want)
		}
	}
}

// TestSegmentsWeighByPower: in segments of different amplitude the actuator has
// different gain and phase; the index is their mean by power.
func TestSegmentsWeighByPower(t *testing.T) {
	const tick, part, period = 1.0 / 100, 1000, 50
	parts := []sine{
		{period: period, amplitude: 1, gain: 1, lag: 0.1},
		{period: period, amplitude: 3, gain: 0.8, lag: 0.4},
		{period: period, amplitude: 0.5, gain: 1.5, lag: -0.3},
		{period: period, amplitude: 2, gain: 0.9, lag: 0.2},
	}
	r := newRecord(tick, 0, part)
	r.Start(0, 0)
	var sum complex128
	var power float64
	for _, s := range parts {
		for k := range part {
			r.Add(s.at(k))
		}
		p := s.amplitude * s.amplitude
		sum += cmplx.Rect(p*s.gain, -s.lag)
		power += p
	}
	index := sum / complex(power, 0)
	f := 1 / (period * tick)
	want := FEI{cmplx.Abs(index), -cmplx.Phase(index) / (2 * math.Pi * f), f}
	got := r.Finish().FEI
	// Whole periods: rounding only.
	if !agrees(got.Amplitude, want.Amplitude, 1e-12) || !agrees(got.Delay, want.Delay, 1e-12) ||
		!agrees(got.Frequency, want.Frequency, 1e-12) {
		t.Errorf("index %+v, want %+v", got, want)
	}
}
