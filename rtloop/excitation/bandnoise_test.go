package excitation

import (
	"math"
	"runtime"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/stat/distuv"

	"antelag/scenarios/kind"
)

func band(rms, low, high float64) kind.Values {
	return kind.Values{"rms": kind.Num(rms), "low": kind.Num(low), "high": kind.Num(high)}
}

// splined is the factor that the spline puts on the density below the grid's
// Nyquist frequency: the weights (−1, 8, −1)/6 and the cubic B-spline.
func splined(f, rate float64) float64 {
	theta := 2 * math.Pi * f / rate
	sinc := math.Sin(theta/2) / (theta / 2)
	return math.Pow((4-math.Cos(theta))/3*math.Pow(sinc, 4), 2)
}

func TestBandNoiseHasItsSpectrumAndItsRMS(t *testing.T) {
	const (
		rms, low, high = 0.004, 1.5, 12.
		rate           = 50. // of the samples, no multiple of the grid's
		n, segments    = 1024, 450
	)
	s := build(t, "band-noise", context(1/rate, 86400, Target), band(rms, low, high))
	filled(s, int(2*rate)) // beyond the fade-in
	// Periodograms under a Hann window. With its power taken out each is
	// exponential about the density as the window smears it, by
	// (S₋₁ + 4S₀ + S₊₁)/6 up to fourth differences; the bins looked at are
	// those where that leaves less than 1 %. Bins three apart are independent.
	power, window, gain := make([]float64, n/2), make([]float64, n), 0.0
	for i := range window {
		window[i] = 0.5 - 0.5*math.Cos(2*math.Pi*float64(i)/n)
		gain += window[i] * window[i]
	}
	fft := fourier.NewFFT(n)
	x, coeff, square := make([]float64, n), make([]complex128, n/2+1), 0.0
	for range segments {
		s.Fill(x)
		for i := range x {
			square += x[i] * x[i]
			x[i] *= window[i]
		}
		for k, c := range fft.Coefficients(coeff, x)[:n/2] {
			power[k] += (real(c)*real(c) + imag(c)*imag(c)) / gain
		}
	}
	// The density, one-sided per Hz, of rms² over the closed form.
	grid := bandGrid * high
	total := overBand(low, high, grid, func(f float64) float64 { return splined(f, grid) })
	density := func(f float64) float64 { return rms * rms * butterworth(f, low, high, grid) * splined(f, grid) / total }
	expected := func(k int) float64 { // what the sampling makes of it, by folding
		f := float64(k) * rate / n
		return rate / 2 * (density(f) + density(rate-f) + density(rate+f))
	}
	ratio := func(k int) float64 {
		return power[k] / ((expected(k-1) + 4*expected(k) + expected(k+1)) / 6)
	}
	check := func(label string, from, to int) {
		sum, m := 0.0, 0
		for k := from; k < to; k += 3 {
			sum += ratio(k)
			m++
		}
		// χ² with 2 degrees of freedom a periodogram; 1e-4 of all seeds fail
		// at either end, and 1 % for the smearing.
		chi := distuv.ChiSquared{K: float64(2 * m * segments)}
		lo, hi := chi.Quantile(1e-4)/chi.K*0.99, chi.Quantile(1-1e-4)/chi.K*1.01
		got := sum / float64(m) / segments
		t.Logf("%s: %.4f of the density; %.4f to %.4f expected", label, got, lo, hi)
		if got < lo || got > hi {
			t.Errorf("%s: %.4f of the density; %.4f to %.4f expected", label, got, lo, hi)
		}
	}
	bin := func(f float64) int { return int(math.Round(f * n / rate)) }
	for _, r := range []struct {
		label    string
		from, to float64
	}{
		{"lower skirt", 1.0, 1.4}, {"lower edge", 1.4, 1.6}, {"flat, low", 1.8, 3}, {"flat, middle", 3, 7},
		{"flat, high", 7, 10}, {"upper edge", 11.5, 12.5}, {"upper skirt", 12.5, 16}, {"upper skirt, far", 16, 24},
	} {
		check(r.label, bin(r.from), bin(r.to))
	}
	// Outside the band next to nothing is left: at half the lower edge and
	// twice the upper the closed form says 2e-5 and 1e-5 of the density within.
	flat := expected(bin(4)) * segments
	for _, f := range []float64{0.75, 24} {
		if got := power[bin(f)] / flat; got > 1e-4 {
			t.Errorf("at %g Hz %.2g of the density within the band is left", f, got)
		}
	}
	for f := 1.8; f < 10; f += 0.1 {
		if d := density(f)/density(4) - 1; math.Abs(d) > 0.06 {
			t.Errorf("the density at %g Hz is off that at 4 Hz by %.2g", f, d)
		}
	}
	// The mean square of a process of one-sided density S scatters with the
	// variance ∫S²df/T.
	spread := overBand(low, high, grid, func(f float64) float64 {
		return splined(f, grid) * density(f) * rms * rms / total
	})
	sigma := math.Sqrt(spread / (n * segments / rate))
	got := square / (n * segments)
	t.Logf("mean square %.4g of rms²: %.2f standard errors of %.2g", got/(rms*rms), (got-rms*rms)/sigma, sigma/(rms*rms))
	if math.Abs(got-rms*rms) > 4*sigma {
		t.Errorf("mean square %v, want %v ± %v", got, rms*rms, sigma)
	}
}

func TestBandNoiseSplineHasTheVarianceOfItsDensity(t *testing.T) {
	for _, b := range bands {
		grid := bandGrid * b.high
		f := newBandpass(b.low, b.high, grid)
		r := f.stationarity(splineLags).r
		plain := overBand(b.low, b.high, grid, func(float64) float64 { return 1 })
		with := overBand(b.low, b.high, grid, func(f float64) float64 { return splined(f, grid) })
		// The images of the spectrum add up to (1/15)⁸ = 4e-10 of the power at
		// the upper edge; see the test of the covariance for 3e-8.
		if got := splineVariance(r) / r[0]; math.Abs(got-with/plain) > 6e-8 {
			t.Errorf("%g to %g Hz: the spline has %v of the variance, closed form %v", b.low, b.high, got, with/plain)
		}
	}
}

func TestBandNoiseIsSteadyFromTheFirstInstant(t *testing.T) {
	// The mean square over seeds, with the fade-in taken out, at instants on
	// the grid of 32 Hz and between.
	const seeds = 500
	at := []int{13, 64, 256, 261, 263, 512, 1111} // of 256 Hz
	sums, fourth := make([]float64, len(at)), make([]float64, len(at))
	for seed := range uint64(seeds) {
		c := context(1./256, 10, Ground)
		c.Seed = seed
		x := filled(build(t, "band-noise", c, band(1, 0.5, 2)), 1112)
		for i, k := range at {
			v := x[k]
			if k < 256 {
				v /= (1 - math.Cos(math.Pi*float64(k)/256)) / 2
			}
			sums[i] += v * v
			fourth[i] += v * v * v * v
		}
	}
	for i, k := range at {
		// Squares of normals have the variance 2, fourth powers 96.
		if got := sums[i] / seeds; math.Abs(got-1) > 4*math.Sqrt(2./seeds) {
			t.Errorf("at %g s: mean square %v, want 1", float64(k)/256, got)
		}
		if got := fourth[i] / seeds; math.Abs(got-3) > 4*math.Sqrt(96./seeds) {
			t.Errorf("at %g s: mean fourth power %v, that of a normal is 3", float64(k)/256, got)
		}
	}
}

func TestBandNoiseFadesIn(t *testing.T) {
	const step = 1. / 4096
	c := context(step, 10, Target)
	faded := filled(build(t, "band-noise", c, band(0.01, 0.2, 6)), 2*4096)
	whole := build(t, "band-noise", c, band(0.01, 0.2, 6))
	whole.(*bandNoise).fadeEnd = 0
	for k, x := range filled(whole, len(faded)) {
		e := 1.0
		if k < 4096 {
			e = math.Pow(math.Sin(math.Pi*float64(k)/8192), 2)
		}
		if math.Abs(faded[k]-e*x) > 1e-16 {
			t.Fatalf("sample %d: %v, want %v of %v", k, faded[k], e, x)
		}
	}
	// At rest: near 0 the envelope is (π·t/2)², and the noise below 5 rms.
	if faded[0] != 0 || math.Abs(faded[1]) > 0.05*math.Pow(math.Pi*step/2, 2) {
		t.Errorf("it starts with %v, %v", faded[0], faded[1])
	}
}

func TestBandNoiseHasAContinuousAcceleration(t *testing.T) {
	// Second differences over 1/16 of a grid interval. Between neighbours
	// they change by the third derivative times the step, and no instant is
	// worse than another: a velocity that jumped would give 16 times as much
	// at the instants of the grid.
	const high, fine = 5., 16
	step := 1 / (bandGrid * high * fine)
	s := build(t, "band-noise", context(step, 100, Target), band(1, 0.5, high))
	s.(*bandNoise).fadeEnd = 0
	x := filled(s, 40000)
	on, off, rms := 0.0, 0.0, 0.0
	second := func(k int) float64 { return (x[k-1] - 2*x[k] + x[k+1]) / (step * step) }
	for k := 2; k < len(x)-2; k++ {
		d := math.Abs(second(k+1) - second(k))
		rms += second(k) * second(k)
		if k%fine == 0 || k%fine == fine-1 {
			on = max(on, d)
		} else {
			off = max(off, d)
		}
	}
	rms = math.Sqrt(rms / float64(len(x)-4))
	if on > 1.5*off || off > 0.2*rms {
		t.Errorf("the acceleration, rms %v, changes by %v at grid instants, %v between", rms, on, off)
	}
}

func TestBandNoiseFollowsItsSeed(t *testing.T) {
	motion := func(seed uint64, rms float64) []float64 {
		c := context(1./64, 100, Target)
		c.Seed = seed
		return filled(build(t, "band-noise", c, band(rms, 0.5, 8)), 6400)
	}
	a, b, twice := motion(1, 1), motion(2, 1), motion(1, 2)
	ab := 0.0
	for k := range a {
		ab += a[k] * b[k]
		if twice[k] != 2*a[k] {
			t.Fatalf("sample %d: %v is not twice %v", k, twice[k], a[k])
		}
	}
	// Two times 7.5 Hz times 100 s independent values: 1/√1500 = 0.026.
	if r := ab / float64(len(a)); math.Abs(r) > 4*0.026 {
		t.Errorf("seeds 1 and 2 are correlated by %g", r)
	}
}

func TestGeneratedMotionsStreamInConstantMemory(t *testing.T) {
	for _, k := range every {
		if k.kind == "record" || k.kind == "filtered-noise" { // one is as long as its file, the other has a test of its own
			continue
		}
		allocated := func(duration float64, fills int) uint64 {
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			s := build(t, k.kind, context(0.1, duration, k.drives), k.given)
			buf := make([]float64, 1000)
			for range fills {
				s.Fill(buf)
			}
			runtime.ReadMemStats(&after)
			return after.TotalAlloc - before.TotalAlloc
		}
		if short, long := allocated(100, 1), allocated(86400, 20); long > short+10000 {
			t.Errorf("%s: 100 s take %d bytes, a day %d", k.label, short, long)
		}
	}
}
