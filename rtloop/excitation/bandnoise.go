package excitation

import (
	"fmt"
	"math"
	"math/rand/v2"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var bandNoiseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name: "band-noise",
		Doc:  "steady Gaussian noise of flat spectrum between two frequencies, another for every seed",
		Equation: "x(t) = e(t) n(t), n stationary with rms σ and density ∝ 1/(1 + ((f² − f1 f2)/(f (f2 − f1)))^16); " +
			"e = (1 − cos π t/(1 s))/2 in the first second, then 1",
		Source: "common practice (white noise through a Butterworth band-pass of order 8)",
		Settings: []kind.Setting{
			kind.Driven("rms", "root mean square σ of the noise, after the fade-in of 1 s").Range(0, math.Inf(1)),
			kind.Number("low", quantity.Frequency, "frequency f1 at the lower edge, where half the power is left").
				Range(lowestFrequency, highestFrequency).Sample(`"0.5 Hz"`),
			kind.Number("high", quantity.Frequency, "frequency f2 at the upper edge, likewise; at least 1.01 times low").
				Range(lowestFrequency, highestFrequency).Sample(`"8 Hz"`),
		},
	},
	New: newBandNoise,
}

const (
	bandGrid  = 16   // grid instants in a period of the upper edge
	narrowest = 1.01 // high over low
	fadeIn    = 1.0  // s
)

// bandNoise is white Gaussian noise through a Butterworth band-pass of order
// n = 8 between f1 and f2, Hz, made steady from the first instant and faded in:
//
//	x(t) = σ·e(t)·n(t),   e(t) = (1 − cos(π·t/1 s))/2 for t < 1 s, else 1,
//
// so that a target starts at rest, without displacement or velocity. The
// filter runs on a grid of its own, 16 instants to a period of f2, from a
// state drawn out of its stationary covariance. Its samples y_j become the
// coefficients c_j = (8·y_j − y_{j−1} − y_{j+1})/6 of a cubic spline
// (B-splines on the grid), n(t) = Σ c_j·β³(t·r − j): n has a second derivative
// without jumps, as a target must. Below the upper edge the spline alters the
// power by less than 0.2 %; what it puts around the grid's rate r is below
// 1e-9 of it. σ is the rms over all positions between grid instants,
//
//	σ² = Σ_k β⁷(k)·E[c_j·c_{j+k}],
//
// β⁷ being β³ convolved with itself. The motion hangs on seed, settings and
// time, not on the step at which it is asked for. It never ends, and only the
// filter's state and four coefficients are kept.
type bandNoise struct {
	clock
	filter  bandpass
	rng     *rand.Rand
	rate    float64    // r, Hz
	scale   float64    // of y
	y       [2]float64 // the last two filter outputs, scaled, the older first
	c       [4]float64 // c_{j−1} … c_{j+2}
	j       int64      // grid interval of q
	q       [4]float64 // x = q0 + u·(q1 + u·(q2 + u·q3)), u from grid instant j
	fadeEnd float64    // s
}

func newBandNoise(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	low, high := v.Num("low"), v.Num("high")
	if !(high >= narrowest*low) {
		return nil, fmt.Errorf("high: %g Hz makes no band above low, %g Hz; it must be at least %g times that", high, low, narrowest)
	}
	s := &bandNoise{clock: clk, rate: bandGrid * high, fadeEnd: fadeIn}
	s.filter = newBandpass(low, high, s.rate)
	s.rng = rand.New(rand.NewPCG(c.Seed, excitationStream))
	steady := s.filter.stationarity(splineLags)
	s.scale = v.Num("rms") / math.Sqrt(splineVariance(steady.r))
	s.start(&steady)
	return s, nil
}

// start draws the state of the filter and the first coefficients.
func (s *bandNoise) start(steady *stationarity) {
	const n = bandStates
	l := semiCholesky(n, steady.p.RawMatrix().Data)
	var normal, state [n]float64
	for i := range normal {
		normal[i] = s.rng.NormFloat64()
		for k := range i + 1 {
			state[i] += l[i*n+k] * normal[k]
		}
	}
	s.filter.setState(&state)
	for range 2 + len(s.c) {
		s.advance()
	}
	s.j = 0
	s.polynomial()
}

// advance draws the next sample and moves the coefficients on by one.
func (s *bandNoise) advance() {
	y := s.scale * s.filter.step(s.rng.NormFloat64())
	s.c[0], s.c[1], s.c[2] = s.c[1], s.c[2], s.c[3]
	s.c[3] = (8*s.y[1] - s.y[0] - y) / 6
	s.y[0], s.y[1] = s.y[1], y
	s.j++
}

// polynomial writes the spline between grid instants j and j+1.
func (s *bandNoise) polynomial() {
	a, b, c, d := s.c[0], s.c[1], s.c[2], s.c[3]
	s.q = [4]float64{(a + 4*b + c) / 6, (c - a) / 2, (a - 2*b + c) / 2, (d - a + 3*(b-c)) / 6}
}

func (s *bandNoise) Fill(dst []float64) {
	for i := range dst {
		t := s.tick()
		p := t * s.rate
		j := int64(p)
		if j != s.j {
			for s.j < j {
				s.advance()
			}
			s.polynomial()
		}
		u := p - float64(j)
		x := s.q[0] + u*(s.q[1]+u*(s.q[2]+u*s.q[3]))
		if t < s.fadeEnd {
			x *= (1 - math.Cos(math.Pi*t/s.fadeEnd)) / 2
		}
		dst[i] = x
	}
}

// splineLags is how many lags of r(k) = E[y_j·y_{j+k}] the variance of the
// spline hangs on.
const splineLags = 6

// splineVariance is Σ_k β⁷(k)·E[c_j·c_{j+k}]: the variance of the spline,
// averaged over the positions between two grid instants. The autocorrelation
// of the weights (−1, 8, −1)/6 makes the covariance of c of that of y.
func splineVariance(r []float64) float64 {
	beta7 := [...]float64{2416. / 5040, 1191. / 5040, 120. / 5040, 1. / 5040}
	weights := [...]float64{66. / 36, -16. / 36, 1. / 36}
	lag := func(w []float64, k int) float64 { return w[max(k, -k)] }
	sum := 0.0
	for k := -3; k <= 3; k++ {
		for m := -2; m <= 2; m++ {
			sum += lag(beta7[:], k) * lag(weights[:], m) * lag(r, k+m)
		}
	}
	return sum
}
