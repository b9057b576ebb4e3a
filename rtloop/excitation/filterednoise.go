package excitation

import (
	"errors"
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var filteredNoiseKind = kind.Entry[New]{
	Kind: kind.Kind{
		Name: "filtered-noise",
		Doc:  "an artificial ground motion: filtered white noise under an envelope, another for every seed",
		Equation: "z̈ + 2ζg ωg ż + ωg² z = −w, a = z̈ + w; ÿ + 2ζf ωf ẏ + ωf² y = a; " +
			"x(t) = peak · e(t) ÿ(t) / max |e ÿ|, w white noise; e rising, level and falling in straight lines, or " +
			"saragoni-hart: e = exp(b (ln τ + 1 − τ)), τ = t/(ε tn), b = −ε ln η/(1 + ε (ln ε − 1)), tn = rise + strong + decay",
		Source: "Kanai 1957, Tajimi 1960 (ground filter); Clough & Penzien 1975 (high-pass); Saragoni & Hart 1974 (envelope)",
		Settings: []kind.Setting{
			kind.Driven("peak", "largest absolute value of the whole history; a negative one turns it over"),
			kind.Number("ground_frequency", quantity.Frequency, "frequency ωg/2π of the ground filter").
				Default(2.5).Range(lowestFrequency, highestFrequency),
			kind.Number("ground_damping", quantity.None, "damping ratio ζg of the ground filter").
				Default(0.6).Range(0.01, 2),
			kind.Number("highpass_frequency", quantity.Frequency, "frequency ωf/2π of the high-pass filter").
				Default(0.25).Range(lowestFrequency, highestFrequency),
			kind.Number("highpass_damping", quantity.None, "damping ratio ζf of the high-pass filter").
				Default(0.6).Range(0.01, 2),
			kind.Number("rise", quantity.Time, "time in which the motion grows from nothing").
				Default(2).Range(0, longest),
			kind.Number("strong", quantity.Time, "time for which it keeps its strength").
				Default(10).Range(0, longest),
			kind.Number("decay", quantity.Time, "time in which it dies away; nothing follows").
				Default(8).Range(0, longest),
			kind.Word("envelope", "how the strength runs: in straight lines, or along the smooth curve of Saragoni & Hart over the same time tn = rise + strong + decay",
				trapezoidWord, saragoniWord),
			kind.Number("epsilon", quantity.None, "with envelope saragoni-hart: the part ε of tn after which the strength is greatest").
				Default(0.2).Range(0.05, 0.7),
			kind.Number("eta", quantity.None, "with envelope saragoni-hart: the part η of the greatest strength that is left at tn").
				Default(0.05).Range(0.001, 0.5),
		},
	},
	New: newFilteredNoise,
}

// filteredNoise is white noise w through the ground filter of Kanai and Tajimi
// and the high-pass of Clough and Penzien, under an envelope e(t), scaled:
//
//	z̈ + 2ζg·ωg·ż + ωg²·z = −w,   a = z̈ + w = −(2ζg·ωg·ż + ωg²·z)
//	ÿ + 2ζf·ωf·ẏ + ωf²·y = a,    x(t) = scale·e(t)·ÿ(t)
//
// so that the spectral density of ÿ, two-sided, is
//
//	S(ω) = S₀ · (ωg⁴ + (2ζg·ωg·ω)²)/((ωg²−ω²)² + (2ζg·ωg·ω)²)
//	          · ω⁴/((ωf²−ω²)² + (2ζf·ωf·ω)²).
//
// Frequencies in rad/s, x in what is driven. The scale makes the largest |x|
// within the run's duration the peak, found by a first pass over the same
// realization. The process is sampled exactly on a grid of its own, 200 Hz or
// 40 samples to the shorter filter period if that is finer, and x is linear
// between grid instants: the motion hangs on seed, settings and duration, not
// on the step at which it is asked for. It starts at zero when the envelope
// rises, stops at the envelope's end, and keeps only the present state.
type filteredNoise struct {
	clock
	process *sampler
	env     envelope
	rate    float64 // of the grid, Hz
	scale   float64
	n       int64   // grid index of the end; zero from there on
	j       int64   // grid index of a
	a, b    float64 // x at j and j+1
}

const (
	gridRate         = 200 // Hz, the coarsest grid
	samplesPerPeriod = 40  // grid samples in a period of either filter
)

func newFilteredNoise(c Context, v kind.Values) (Source, error) {
	clk, err := c.clock()
	if err != nil {
		return nil, err
	}
	fg, ff := v.Num("ground_frequency"), v.Num("highpass_frequency")
	s := &filteredNoise{
		clock: clk,
		rate:  math.Max(gridRate, samplesPerPeriod*math.Max(fg, ff)),
	}
	lines := &trapezoid{v.Num("rise"), v.Num("strong"), v.Num("decay")}
	if lines.length() == 0 {
		return nil, errors.New("strong: rise, strong and decay are all zero, so nothing would move")
	}
	s.env = lines
	if v.Text("envelope") == saragoniWord {
		s.env = newSaragoniHart(v.Num("epsilon"), v.Num("eta"), lines.length())
	}
	s.process, err = groundProcess(fg, v.Num("ground_damping"), ff, v.Num("highpass_damping"), s.rate, c.Seed)
	if err != nil {
		return nil, fmt.Errorf("ground_frequency: the filters cannot be solved: %w", err)
	}
	s.n = int64(math.Ceil(s.env.length() * s.rate))
	peak := s.findPeak(c.Duration)
	if !(peak > 0) {
		return nil, fmt.Errorf("rise: nothing moves within the duration of %g s", c.Duration)
	}
	s.scale = v.Num("peak") / peak
	s.rewind()
	return s, nil
}

// groundProcess is the process ÿ of unit white noise, 2π·S₀ = 1 in time made
// dimensionless by the ground frequency. The states are ż·ωg, z·ωg², ẏ·ωg and
// y·ωg² in the time ωg·t, which keeps them of one size; only the scale of ÿ,
// which the peak sets anyway, changes by that.
func groundProcess(fg, zg, ff, zf, rate float64, seed uint64) (*sampler, error) {
	r := ff / fg // ωf/ωg
	a := []float64{
		-2 * zg, -1, 0, 0,
		1, 0, 0, 0,
		-2 * zg, -1, -2 * zf * r, -r * r,
		0, 0, 1, 0,
	}
	b := []float64{-1, 0, 0, 0}
	out := []float64{-2 * zg, -1, -2 * zf * r, -r * r}
	return newSampler(a, b, out, 1, 2*math.Pi*fg/rate, seed)
}

// rewind goes back to t = 0.
func (s *filteredNoise) rewind() {
	s.process.restart()
	s.j = 0
	s.a = s.grid(0)
	s.b = s.grid(1)
}

// grid draws x at grid instant j, the one after the last drawn.
func (s *filteredNoise) grid(j int64) float64 {
	if j >= s.n {
		return 0
	}
	return s.scale * s.env.at(float64(j)/s.rate) * s.process.draw()
}

// seek goes forward to the grid interval j.
func (s *filteredNoise) seek(j int64) {
	for s.j < j {
		s.j++
		s.a, s.b = s.b, s.grid(s.j+1)
	}
}

// findPeak returns the largest |x| at scale 1 from t = 0 to the end of the
// run. Between grid instants x is linear, so only these and the end count.
func (s *filteredNoise) findPeak(duration float64) float64 {
	s.scale = 1
	s.rewind()
	end := math.Min(duration*s.rate, float64(s.n))
	last := int64(end)
	peak := math.Abs(s.a)
	for s.j < last {
		s.seek(s.j + 1)
		peak = math.Max(peak, math.Abs(s.a))
	}
	return math.Max(peak, math.Abs(s.a+(end-float64(last))*(s.b-s.a)))
}

func (s *filteredNoise) Fill(dst []float64) {
	for i := range dst {
		p := s.tick() * s.rate
		if p >= float64(s.n) {
			dst[i] = 0
			continue
		}
		j := int64(p)
		if j != s.j {
			s.seek(j)
		}
		dst[i] = s.a + (p-float64(j))*(s.b-s.a)
	}
}
