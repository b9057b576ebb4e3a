package gauge

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// recorded is a record of n ticks of the given motion.
func recorded(r *Record, n int, motion func(k int) (x, y float64)) *Record {
	r.Start(motion(0))
	for k := 1; k <= n; k++ {
		r.Add(motion(k))
	}
	return r
}

// TestAlignmentOfASine: gain and phase lag of a sine over whole periods, late and
// early. The index is exact; the parabola through three samples of a cosine,
// cos ω(l−d) around l₀ = round(d) with f = d − l₀, has its vertex at
// l₀ + ½·tan(ωf)/tan(ω/2).
func TestAlignmentOfASine(t *testing.T) {
	const tick = 1.0 / 1024
	for _, s := range append([]sine{
		{period: 512, amplitude: 0.03, gain: 1, lag: 2 * math.Pi * 14 / 512},
		{period: 512, amplitude: 0.03, gain: 1, lag: -2 * math.Pi * 9 / 512},
		{period: 64, amplitude: 0.01, gain: 1.2, lag: 2 * math.Pi * 20.3 / 64},
		{period: 64, amplitude: 0.01, gain: 1.2, lag: -2 * math.Pi * 20.3 / 64},
	}, sines...) {
		n := 40 * s.period
		a := recorded(NewRecord(tick, n), n, s.at).Finish()
		omega := 2 * math.Pi / float64(s.period)
		d := s.lag / omega
		// Transforms of 10⁴ samples round to a few 10⁻¹⁵ of the largest, which is
		// the mean where it was not removed exactly.
		if !agrees(a.FEI.Amplitude, s.gain, 1e-12) || !within(a.FEI.Delay, d*tick, 1e-12) ||
			!agrees(a.FEI.Frequency, 1/(float64(s.period)*tick), 1e-11) {
			t.Errorf("%v: index %+v, want gain %v, delay %v", s, a.FEI, s.gain, d*tick)
		}
		whole := math.Round(d)
		vertex := whole + math.Tan(omega*(d-whole))/math.Tan(omega/2)/2
		// At the peak the coefficient is exact; beside it one sample more or less
		// overlaps, which changes the bend on one side by up to two parts in n and
		// moves the vertex by up to a tick in n. Half as much again for f ≠ 0.
		bound := 1.5 / float64(n)
		if !within(a.Delay/tick, vertex, bound) {
			t.Errorf("%v: correlation delay %v ticks, want %v ± %g", s, a.Delay/tick, vertex, bound)
		}
	}
}

// noise is band-limited noise that can be had at any time, in ticks: thirty sines
// of random amplitude and phase, with whole numbers of periods in n ticks from
// low to high.
type noise struct {
	n                         int
	periods, amplitude, phase []float64
}

func newNoise(n, low, high int, seed uint64) *noise {
	random := rand.New(rand.NewPCG(seed, 0))
	s := &noise{n: n}
	for i := range 30 {
		periods := math.Round(float64(low) + float64(high-low)*float64(i)/29)
		if i > 0 && periods == s.periods[len(s.periods)-1] {
			continue
		}
		s.periods = append(s.periods, periods)
		s.amplitude = append(s.amplitude, 0.002*math.Abs(random.NormFloat64()))
		s.phase = append(s.phase, 2*math.Pi*random.Float64())
	}
	return s
}

func (s *noise) at(time float64) (v float64) {
	for i, a := range s.amplitude {
		v += a * math.Sin(2*math.Pi*s.periods[i]*time/float64(s.n)+s.phase[i])
	}
	return v
}

// index is the closed form of the frequency evaluation index for gain and delay
// in ticks, and its equivalent frequency in cycles per tick.
func (s *noise) index(gain, delay float64) (complex128, float64) {
	var sum complex128
	var power, moment float64
	for i, a := range s.amplitude {
		f := s.periods[i] / float64(s.n)
		sum += complex(a*a, 0) * cmplx.Rect(gain, -2*math.Pi*f*delay)
		power += a * a
		moment += a * a * f
	}
	return sum / complex(power, 0), moment / power
}

// TestFractionalDelays of band-limited noise, early and late, for target motions
// that are searched at every tick and at every second to sixteenth.
func TestFractionalDelays(t *testing.T) {
	const n, tick = 4096, 1.0 / 1024
	for _, high := range []int{12, 40, 100, 200, 500} {
		s := newNoise(n, 4, high, uint64(high))
		for _, delay := range []float64{0, 0.25, -0.5, 3.5, -7.8, 13.337, -21.9, 40} {
			const gain = 0.93
			a := recorded(NewRecord(tick, n), n, func(k int) (x, y float64) {
				return s.at(float64(k)), gain * s.at(float64(k)-delay)
			}).Finish()
			index, f := s.index(gain, delay)
			want := FEI{cmplx.Abs(index), -cmplx.Phase(index) / (2 * math.Pi * f / tick), f / tick}
			if !agrees(a.FEI.Amplitude, want.Amplitude, 1e-11) ||
				!within(a.FEI.Delay, want.Delay, 1e-13) ||
				!agrees(a.FEI.Frequency, want.Frequency, 1e-11) {
				t.Errorf("to %d, delay %v: index %+v, want %+v", high, delay, a.FEI, want)
			}
			// Around its peak the autocorrelation is 1 − m₂l²/2 + m₄l⁴/24, of which
			// the parabola at an offset f puts the vertex off by
			// (m₄/m₂)·f(1−4f²)/12 ≤ ω²/62 ticks, ω the fastest. The ends of the
			// record add a tick or two in n, as for a sine.
			fastest := 2 * math.Pi * float64(high) / n
			bound := fastest*fastest/62 + 2.0/n
			if !within(a.Delay/tick, delay, bound) {
				t.Errorf("to %d, delay %v: by correlation %v ± %g", high, delay, a.Delay/tick, bound)
			}
		}
	}
}

// TestPeriodicMotionMeansTheNearestPeak: the correlation of a sine peaks again
// every period; none of those is the actuator's delay.
func TestPeriodicMotionMeansTheNearestPeak(t *testing.T) {
	const tick = 1.0 / 1024
	for _, period := range []int{10, 33, 64, 200} {
		for _, share := range []float64{-0.4, -0.1, 0, 0.1, 0.4} {
			s := sine{period: period, amplitude: 1, gain: 1, lag: 2 * math.Pi * share}
			a := recorded(NewRecord(tick, 10_000), 10_000, s.at).Finish()
			// Within what the parabola is off by at ten samples a period.
			if want := share * float64(period); !within(a.Delay/tick, want, 0.02) {
				t.Errorf("period %d: delay %v ticks, want %v", period, a.Delay/tick, want)
			}
		}
	}
}

// TestNoAlignmentIsNaN: of signals that are zero, constant, too short, opposed
// or further apart than the lags searched.
func TestNoAlignmentIsNaN(t *testing.T) {
	zero := func(int) float64 { return 0 }
	constant := func(int) float64 { return 0.1 }
	moving := func(k int) float64 { return math.Sin(float64(k) / 10) }
	opposed := func(k int) float64 { return -math.Exp(-math.Pow(float64(k-500)/200, 2)) }
	pulse := func(k int) float64 { return math.Exp(-math.Pow(float64(k-500)/200, 2)) }
	for _, c := range []struct {
		name             string
		x, y             func(int) float64
		n                int
		index, delay, by bool // defined: amplitude, index delay, correlation delay
	}{
		{"no ticks", moving, moving, 0, false, false, false},
		{"one tick", moving, moving, 1, false, false, false},
		{"two ticks", moving, moving, 2, true, true, false},
		{"zero", zero, zero, 1000, false, false, false},
		{"constant", constant, constant, 1000, false, false, false},
		{"constant target", constant, moving, 1000, false, false, false},
		{"zero measured", moving, zero, 1000, true, false, false},
		{"constant measured", moving, constant, 1000, true, false, false},
		{"opposed", pulse, opposed, 1000, true, true, false},
		{"moving", moving, moving, 1000, true, true, true},
	} {
		for _, segment := range []int{segment, 256} {
			a := recorded(newRecord(0.001, c.n, segment), c.n, func(k int) (float64, float64) { return c.x(k), c.y(k) }).Finish()
			if segment == 256 && c.name == "opposed" {
				continue // a part of a pulse is another signal
			}
			if math.IsNaN(a.FEI.Amplitude) == c.index || math.IsNaN(a.FEI.Frequency) == c.index ||
				math.IsNaN(a.FEI.Delay) == c.delay || math.IsNaN(a.Delay) == c.by {
				t.Errorf("%s, segments of %d: %+v", c.name, segment, a)
			}
		}
	}
}

// TestNotANumberStaysOne: samples of a run that diverged give NaN, not a number
// and not a panic.
func TestNotANumberStaysOne(t *testing.T) {
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e300} {
		for _, part := range []int{segment, 256} {
			for _, both := range []bool{true, false} {
				a := recorded(newRecord(0.001, 1000, part), 1000, func(k int) (x, y float64) {
					x, y = math.Sin(float64(k)/10), math.Cos(float64(k)/10)
					if k == 700 {
						y = bad
						if both {
							x = -bad
						}
					}
					return x, y
				}).Finish()
				if bad == 1e300 {
					continue // overflows or not: no panic is all there is to ask
				}
				if !math.IsNaN(a.Delay) || !math.IsNaN(a.FEI.Amplitude) || !math.IsNaN(a.FEI.Delay) {
					t.Errorf("%v in both: %v, segments of %d: %+v", bad, both, part, a)
				}
			}
		}
	}
}

// TestLagsSearched: half a second or a quarter of the record; a delay beyond has
// no peak inside.
func TestLagsSearched(t *testing.T) {
	const n, width = 4000, 60.0
	pulse := func(k int, at float64) float64 { return math.Exp(-math.Pow((float64(k)-at)/width, 2)) }
	for _, c := range []struct {
		tick, delay float64
		found       bool
	}{
		{0.001, 495, true}, {0.001, -495, true}, {0.001, 520, false}, {0.001, -520, false},
		{0.0001, 900, true}, {0.0001, 1100, false},
	} {
		a := recorded(NewRecord(c.tick, n), n, func(k int) (x, y float64) {
			return pulse(k, 2000), pulse(k, 2000+c.delay)
		}).Finish()
		if got := a.Delay / c.tick; c.found != within(got, c.delay, 0.001) || !c.found && !math.IsNaN(got) {
			t.Errorf("tick %v: delay %v, want %v, found: %v", c.tick, got, c.delay, c.found)
		}
	}
}

// TestMoreTicksThanExpected: the number of ticks is a hint, not a limit.
func TestMoreTicksThanExpected(t *testing.T) {
	s := sines[0]
	want := recorded(NewRecord(0.001, 5000), 5000, s.at).Finish()
	for _, hint := range []int{-1, 0, 1, 100, 4999, 1e7} {
		if got := recorded(NewRecord(0.001, hint), 5000, s.at).Finish(); got.Delay != want.Delay || got.FEI != want.FEI {
			t.Errorf("hint %d: %+v, want %+v", hint, got, want)
		}
	}
	r := recorded(NewRecord(0.001, 1), 77, sines[1].at)
	if got := recorded(r, 5000, s.at).Finish(); got.Delay != want.Delay || got.FEI != want.FEI {
		t.Errorf("second run: %+v, want %+v", got, want)
	}
}

func TestRecordAddDoesNotAllocate(t *testing.T) {
	r := NewRecord(0.001, 2000)
	r.Start(0, 0)
	k := 0.0
	if n := testing.AllocsPerRun(1500, func() { k++; r.Add(k, -k) }); n != 0 {
		t.Errorf("%v allocations a tick", n)
	}
}
