package excitation

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/stat/distuv"
)

// The systems under test, driven by white noise of two-sided density S₀.

// oscillator is z̈ + 2ζω·ż + ω²·z = w with output z.
func oscillator(t *testing.T, w, z, s0, step float64) *sampler {
	t.Helper()
	return newTestSampler(t, []float64{0, 1, -w * w, -2 * z * w}, []float64{0, 1}, []float64{1, 0}, s0, step)
}

// groundFilter is the Kanai–Tajimi filter without high-pass: z̈ + 2ζω·ż + ω²·z
// = −w with output z̈ + w.
func groundFilter(t *testing.T, w, z, s0, step float64) *sampler {
	t.Helper()
	return newTestSampler(t, []float64{0, 1, -w * w, -2 * z * w}, []float64{0, -1}, []float64{-w * w, -2 * z * w}, s0, step)
}

func newTestSampler(t *testing.T, a, b, c []float64, s0, step float64) *sampler {
	t.Helper()
	s, err := newSampler(a, b, c, 2*math.Pi*s0, step, 11)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// outer is m·mᵀ.
func outer(m *square) (p square) {
	for i := range order {
		for j := range order {
			p[i][j] = m[i].dot(&m[j])
		}
	}
	return p
}

// autocovariance returns E[y(t)·y(t+kΔ)] = c·Φᵏ·P·cᵀ of the sampled process.
func (s *sampler) autocovariance(lags int) []float64 {
	p := outer(&s.l0)
	var v column // P·cᵀ
	for i := range v {
		v[i] = p[i].dot(&s.c)
	}
	r := make([]float64, lags)
	for k := range r {
		r[k] = s.c.dot(&v)
		var next column
		for i := range next {
			next[i] = s.phi[i].dot(&v)
		}
		v = next
	}
	return r
}

func TestStationaryVarianceEqualsItsClosedForm(t *testing.T) {
	const s0 = 0.7
	for _, w := range []float64{0.5, 2 * math.Pi * 2.5, 400} {
		for _, z := range []float64{0.02, 0.3, 0.6, 1, 1.5} {
			for _, step := range []float64{0.001 / w, 0.1 / w, 0.15 / w} {
				// Oscillator under white noise, πS₀/(2ζω³); Kanai–Tajimi,
				// πS₀ωg(1+4ζg²)/(2ζg) (both by residues; Crandall & Mark 1963,
				// Tajimi 1960).
				for label, c := range map[string]struct {
					s    *sampler
					want float64
				}{
					"oscillator":    {oscillator(t, w, z, s0, step), math.Pi * s0 / (2 * z * w * w * w)},
					"ground filter": {groundFilter(t, w, z, s0, step), math.Pi * s0 * w * (1 + 4*z*z) / (2 * z)},
				} {
					// The states of these systems differ in size by ω, up to
					// 400, which costs the equations some digits.
					if got := c.s.autocovariance(1)[0]; math.Abs(got/c.want-1) > 1e-10 {
						t.Errorf("%s, ω %g, ζ %g: variance %v, closed form %v", label, w, z, got, c.want)
					}
				}
			}
		}
	}
}

func TestOneStepKeepsTheStationaryCovariance(t *testing.T) {
	// P = Φ·P·Φᵀ + L·Lᵀ ties Van Loan's Q to the Lyapunov equation's P.
	for _, f := range []struct{ fg, zg, ff, zf, rate float64 }{
		{2.5, 0.6, 0.25, 0.6, 200}, {200, 0.6, 0.25, 0.6, 8000}, {0.5, 0.02, 0.05, 1, 200},
		{2.5, 0.3, 5, 0.3, 200}, {0.1, 0.6, 0.01, 0.6, 200}, {0.001, 2, 0.001, 2, 200},
	} {
		s, err := groundProcess(f.fg, f.zg, f.ff, f.zf, f.rate, 1)
		if err != nil {
			t.Fatal(err)
		}
		p, q := outer(&s.l0), outer(&s.l)
		for i := range order {
			for j := range order {
				sum := q[i][j]
				for k := range order {
					sum += s.phi[i][k] * p[k].dot(&s.phi[j])
				}
				if size := math.Sqrt(p[i][i] * p[j][j]); math.Abs(sum-p[i][j]) > 1e-12*size {
					t.Errorf("%v: element %d,%d goes from %v to %v in a step", f, i, j, p[i][j], sum)
				}
			}
		}
	}
}

func TestLongRealizationHasTheVarianceOfItsClosedForm(t *testing.T) {
	const s0, w, z = 1.3, 2 * math.Pi * 2.5, 0.6
	for label, c := range map[string]struct {
		s    *sampler
		want float64
	}{
		"oscillator":    {oscillator(t, w, z, s0, 0.02), math.Pi * s0 / (2 * z * w * w * w)},
		"ground filter": {groundFilter(t, w, z, s0, 0.02), math.Pi * s0 * w * (1 + 4*z*z) / (2 * z)},
	} {
		const n = 400000
		sum := 0.0
		for range n {
			y := c.s.draw()
			sum += y * y
		}
		// The mean of y² of a Gaussian process has variance (2/n)·Σ_k R_k²,
		// k from −∞ to ∞; after 400 lags, 8 s, R is below 1e-30 of its start.
		r := c.s.autocovariance(400)
		spread := r[0] * r[0]
		for _, x := range r[1:] {
			spread += 2 * x * x
		}
		sigma := math.Sqrt(2 * spread / n)
		got := sum / n
		t.Logf("%s: variance %.5g, closed form %.5g: %.2f standard errors of %.2f %%", label, got, c.want, (got-c.want)/sigma, 100*sigma/c.want)
		if math.Abs(got-c.want) > 4*sigma { // 6e-5 of all seeds would be beyond
			t.Errorf("%s: variance %v, closed form %v ± %v", label, got, c.want, sigma)
		}
		if sigma > 0.01*c.want {
			t.Errorf("%s: the bound of %.2g is too wide to show anything", label, sigma/c.want)
		}
	}
}

// cloughPenzien is the two-sided density per rad/s of white noise of density
// 1 through both filters, frequencies in rad/s.
func cloughPenzien(w, wg, zg, wf, zf float64) float64 {
	a, b := wg*wg-w*w, 2*zg*wg*w
	c, d := wf*wf-w*w, 2*zf*wf*w
	return (wg*wg*wg*wg + b*b) / (a*a + b*b) * (w * w * w * w) / (c*c + d*d)
}

// aliased is the density of the same process sampled at the given rate, Hz:
// the sum over all frequencies that look alike. Behind ±m the terms fall as
// (2ζg·ωg/ω)², whose rest is added as an integral.
func aliased(w, rate, wg, zg, wf, zf float64) float64 {
	const m = 200
	ws := 2 * math.Pi * rate
	sum := 0.0
	for k := -m; k <= m; k++ {
		sum += cloughPenzien(w+float64(k)*ws, wg, zg, wf, zf)
	}
	return sum + math.Pow(2*zg*wg/ws, 2)*2/(m+0.5)
}

func TestSpectrumOfALongRealization(t *testing.T) {
	const (
		fg, zg, ff, zf = 2.5, 0.6, 0.25, 0.6
		n, segments    = 8192, 200
		rate           = 100.0 // half that of the grid, for twice the length
	)
	s, err := groundProcess(fg, zg, ff, zf, rate, 5)
	if err != nil {
		t.Fatal(err)
	}
	// Periodograms under a Hann window, segments apart. With the window's
	// power taken out, each is exponential about the density: the sum of m of
	// them over the density, doubled, is χ² with 2m degrees of freedom. The
	// window smears the spectrum as a kernel of ⅓ bin² about each bin does,
	// so the density is taken as (S₋₁ + 4S₀ + S₊₁)/6, which is right up to
	// fourth derivatives: 0.1 % from bin 9 on. Bins three apart are
	// independent under this window.
	power := make([]float64, n/2)
	window := make([]float64, n)
	gain := 0.0
	for i := range window {
		window[i] = 0.5 - 0.5*math.Cos(2*math.Pi*float64(i)/n)
		gain += window[i] * window[i]
	}
	fft := fourier.NewFFT(n)
	x, coeff := make([]float64, n), make([]complex128, n/2+1)
	for range segments {
		for i := range x {
			x[i] = s.draw() * window[i]
		}
		for k, c := range fft.Coefficients(coeff, x)[:n/2] {
			power[k] += (real(c)*real(c) + imag(c)*imag(c)) / gain
		}
	}
	// |X|²/n of a sampled process is 2π·rate·S(ω), S two-sided per rad/s. The
	// process runs in the time ωg·t with 2π·S₀ = 1, so at frequencies over ωg.
	wg := 2 * math.Pi * fg
	ratio := func(k int) float64 {
		r := rate / wg
		density := 0.0
		for i, weight := range []float64{1. / 6, 4. / 6, 1. / 6} {
			w := 2 * math.Pi * r * float64(k-1+i) / n
			density += weight * aliased(w, r, 1, zg, ff/fg, zf) / (2 * math.Pi)
		}
		return power[k] / (2 * math.Pi * r * density)
	}
	const first = 9 // 0.11 Hz
	check := func(label string, from, to, step int, tail float64) {
		sum, m := 0.0, 0
		for k := from; k < to; k += step {
			sum += ratio(k)
			m++
		}
		chi := distuv.ChiSquared{K: float64(2 * m * segments)}
		if low, high := chi.Quantile(tail), chi.Quantile(1-tail); 2*sum < low || 2*sum > high {
			t.Errorf("%s: %.4f of the density; %.4f to %.4f expected", label, sum/float64(m)/segments,
				low/chi.K, high/chi.K)
		} else if step > 1 {
			t.Logf("%s: %.4f of the density; %.4f to %.4f expected", label, sum/float64(m)/segments,
				low/chi.K, high/chi.K)
		}
	}
	for k := first; k < n/2; k++ {
		// 4087 bins, either tail: 1e-3 of all seeds would fail once.
		check(fmt.Sprintf("bin %d", k), k, k+1, 1, 1e-3/(2*4087))
	}
	for from := first; from < n/2; from *= 2 {
		to := min(2*from, n/2)
		check(fmt.Sprintf("%.2f to %.2f Hz", float64(from)*rate/n, float64(to)*rate/n), from, to, 3, 1e-4)
	}
}

func TestSemiCholesky(t *testing.T) {
	for label, tt := range map[string]struct{ s, want []float64 }{
		"definite":               {[]float64{4, 2, 2, 5}, []float64{2, 0, 1, 2}},
		"first is zero":          {[]float64{0, 0, 0, 9}, []float64{0, 0, 0, 3}},
		"second follows":         {[]float64{4, 6, 6, 9}, []float64{2, 0, 3, 0}},
		"all zero":               {[]float64{0, 0, 0, 0}, []float64{0, 0, 0, 0}},
		"below zero by rounding": {[]float64{1, 1, 1, 1 - 1e-16}, []float64{1, 0, 1, 0}},
	} {
		for i, got := range semiCholesky(2, tt.s) {
			if got != tt.want[i] {
				t.Errorf("%s: element %d is %v, want %v", label, i, got, tt.want[i])
			}
		}
	}
}
