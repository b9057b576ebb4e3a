package excitation

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func TestBandpassEqualsSciPy(t *testing.T) {
	// scipy.signal.butter and sosfilt; testdata/bandpass.py wrote the vectors.
	var vectors struct {
		Cases []struct {
			Low, High, Rate     float64
			Impulse, Covariance []float64
		}
	}
	readVectors(t, "testdata/bandpass.json", &vectors)
	if len(vectors.Cases) < 4 {
		t.Fatalf("only %d cases", len(vectors.Cases))
	}
	for _, v := range vectors.Cases {
		f := newBandpass(v.Low, v.High, v.Rate)
		steady := f.stationarity(len(v.Covariance))
		// Ours has another constant gain: the first sample of SciPy's tells it.
		gain := v.Impulse[0] / f.step(1)
		peak := largest(v.Impulse)
		worst := 0.0
		for k := 1; k < len(v.Impulse); k++ {
			worst = max(worst, math.Abs(gain*f.step(0)-v.Impulse[k])/peak)
		}
		// Both round some 16 times a sample, 1e-16 each, and what is rounded
		// stays for as long as the filter rings, f/(f2 − f1) up to 20 periods.
		if worst > 1e-12 {
			t.Errorf("%g to %g Hz: impulse responses differ by %.2g of the peak", v.Low, v.High, worst)
		}
		// Doubling squares Φ 20 times at most for these bands, each time twice
		// the relative error: 1e-16·2²⁰.
		for k, want := range v.Covariance {
			if d := math.Abs(gain*gain*steady.r[k]-want) / v.Covariance[0]; d > 1e-10 {
				t.Errorf("%g to %g Hz: covariance at lag %d differs by %.2g of the variance", v.Low, v.High, k, d)
			}
		}
		t.Logf("%g to %g Hz: impulse response within %.2g of the peak, variance within %.2g",
			v.Low, v.High, worst, math.Abs(gain*gain*steady.r[0]/v.Covariance[0]-1))
	}
}

func readVectors(t *testing.T, file string, into any) {
	t.Helper()
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, into); err != nil {
		t.Fatal(err)
	}
}

// bands are extremes of what the settings allow, and bands between.
var bands = []struct{ low, high float64 }{
	{0.5, 8}, {1, 1.01}, {5, 6}, {0.001, 200}, {198, 200}, {0.001, 0.00101}, {0.1, 30},
}

// butterworth is the closed form of |H(f)|², 1 in the middle of the band.
func butterworth(f, low, high, rate float64) float64 {
	o, o1, o2 := math.Tan(math.Pi*f/rate), math.Tan(math.Pi*low/rate), math.Tan(math.Pi*high/rate)
	return 1 / (1 + math.Pow((o*o-o1*o2)/(o*(o2-o1)), 16))
}

// overBand integrates y(f)·|H(f)|² over frequency. Along ln f, in steps of a
// thousandth of the relative width or of 1e-3, it is smooth and falls to
// nothing at both ends, where equal steps are exact beyond all powers; the
// filter's upper skirt is cut off at the Nyquist frequency, where it is zero.
func overBand(low, high, rate float64, y func(f float64) float64) float64 {
	step := math.Min(1e-3, (high-low)/low/1000)
	middle, sum := math.Sqrt(low*high), 0.0
	reach := func(sign float64) {
		for k := 0; ; k++ {
			x := middle * math.Exp(sign*step*(float64(k)+0.5))
			if x >= rate/2 {
				return
			}
			h := butterworth(x, low, high, rate)
			if h < 1e-22 {
				return
			}
			sum += y(x) * h * x * step
		}
	}
	reach(1)
	reach(-1)
	return sum
}

func TestBandpassCovarianceIsThatOfTheClosedFormDensity(t *testing.T) {
	for _, b := range bands {
		rate := bandGrid * b.high
		f := newBandpass(b.low, b.high, rate)
		r := f.stationarity(splineLags).r
		variance := overBand(b.low, b.high, rate, func(float64) float64 { return 1 })
		for k := range r {
			want := overBand(b.low, b.high, rate, func(x float64) float64 { return math.Cos(2 * math.Pi * x * float64(k) / rate) }) / variance
			// Doubling squares Φ some 25 times for the slowest of these bands,
			// each time twice the relative error: 1e-16·2²⁵ and a margin.
			if math.Abs(r[k]/r[0]-want) > 3e-8 {
				t.Errorf("%g to %g Hz: correlation %v at lag %d, closed form %v", b.low, b.high, r[k]/r[0], k, want)
			}
		}
		// The variance itself: |H|² is (Ω2 − Ω1)ⁿ/Π g_low² times the sections'
		// own gain, squared, and one-sided density of unit white noise 2/rate.
		gain := 1.0
		for i := range f.low {
			// a3·a1⁻¹ is g², see newSection.
			gain *= f.low[i].a3 / f.low[i].a1
		}
		gain /= math.Pow(warped(b.high, rate)-warped(b.low, rate), bandOrder)
		if want := gain * gain * variance * 2 / rate; math.Abs(r[0]/want-1) > 1e-6 {
			t.Errorf("%g to %g Hz: variance %v, closed form %v", b.low, b.high, r[0], want)
		}
	}
}

func TestOneStepKeepsTheCovarianceOfTheBandpass(t *testing.T) {
	for _, b := range bands {
		f := newBandpass(b.low, b.high, bandGrid*b.high)
		p := f.stationarity(1).p
		var states [bandStates][bandStates]float64 // P's columns, one step on
		for j := range bandStates {
			var s [bandStates]float64
			mat.Col(s[:], j, p)
			f.setState(&s)
			f.step(0)
			states[j] = f.state()
		}
		f.setState(new([bandStates]float64))
		f.step(1)
		noise := f.state()
		// Φ·P stands in states, transposed; Φ·(Φ·P)ᵀ + b·bᵀ must be P.
		for j := range bandStates {
			var s [bandStates]float64
			for i := range bandStates {
				s[i] = states[i][j]
			}
			f.setState(&s)
			f.step(0)
			next := f.state()
			for i := range bandStates {
				got := next[i] + noise[i]*noise[j]
				// As in the test above for what the doubling loses.
				if size := math.Sqrt(p.At(i, i) * p.At(j, j)); math.Abs(got-p.At(i, j)) > 3e-8*size {
					t.Errorf("%g to %g Hz: element %d,%d goes from %v to %v", b.low, b.high, i, j, p.At(i, j), got)
				}
			}
		}
		l := semiCholesky(bandStates, p.RawMatrix().Data)
		worst := 0.0
		for i := range bandStates {
			for j := range bandStates {
				sum := 0.0
				for k := range bandStates {
					sum += l[i*bandStates+k] * l[j*bandStates+k]
				}
				worst = max(worst, math.Abs(sum-p.At(i, j))/math.Sqrt(p.At(i, i)*p.At(j, j)))
			}
		}
		// A pivot taken for rounding may leave its square root behind, 3e-8.
		if worst > 1e-7 {
			t.Errorf("%g to %g Hz: L·Lᵀ is off P by %.2g", b.low, b.high, worst)
		}
	}
}
