package plant

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

const sensorTick = 1.0 / 2048

func makeSensor(prefix string, seed uint64, given set) (*Sensor, error) {
	v, err := SensorSettings.Resolve(num(given))
	if err != nil {
		return nil, err
	}
	return NewSensor(sensorTick, v, prefix, seed)
}

func sensor(t *testing.T, prefix string, seed uint64, given set) *Sensor {
	t.Helper()
	s, err := makeSensor(prefix, seed, given)
	if err != nil {
		t.Fatal(err)
	}
	s.Start(0)
	return s
}

func TestPerfectSensorReturnsTheTruthBitForBit(t *testing.T) {
	for _, s := range []*Sensor{
		NewPerfectSensor(),
		sensor(t, "force", 1, set{}),
		// What is set for the other sensor is not this one's.
		sensor(t, "force", 1, set{"displacement_noise": 1e-3, "displacement_gain": 2, "displacement_cutoff": 9}),
	} {
		s.Start(0.3)
		for _, x := range []float64{0, math.Copysign(0, -1), 1.0 / 3, -1e300, 5e-324, math.Inf(1), math.NaN()} {
			if got := s.Read(x); !same(got, x) {
				t.Errorf("%v became %v", x, got)
			}
		}
	}
}

func TestSensorGainAndBias(t *testing.T) {
	s := sensor(t, "force", 1, set{"force_gain": 1.02, "force_bias": -40})
	near(t, "reading", s.Read(5000), 1.02*5000-40, 1e-12)
	near(t, "at zero", s.Read(0), -40, 0)
}

// The mean of N values of noise is within 5σ/√N of zero, the rms within
// 5σ/√(2N) of σ, the correlation of successive values and that of two sensors
// within 5/√N of zero: five standard errors, which a right generator passes
// for all but one seed in a million, and this seed is fixed.
func TestSensorNoise(t *testing.T) {
	const count, rms, truth = 200000, 2e-5, 0.01
	root := math.Sqrt(count)
	d := sensor(t, "displacement", 7, set{"displacement_noise": rms})
	f := sensor(t, "force", 7, set{"force_noise": 50})
	other := sensor(t, "displacement", 8, set{"displacement_noise": rms})
	var sum, square, quartic, lag, cross, seeds, last float64
	for range count {
		x := (d.Read(truth) - truth) / rms
		sum += x
		square += x * x
		quartic += x * x * x * x
		lag += x * last
		cross += x * f.Read(0) / 50
		seeds += x * (other.Read(truth) - truth) / rms
		last = x
	}
	near(t, "mean", sum/count, 0, 5/root)
	near(t, "rms", math.Sqrt(square/count), 1, 5/(root*math.Sqrt2))
	// The fourth power of a Gaussian has mean 3 and variance 105 − 9.
	near(t, "fourth moment", quartic/count, 3, 5*math.Sqrt(96)/root)
	near(t, "correlation with the value before", lag/count, 0, 5/root)
	near(t, "correlation with the force sensor", cross/count, 0, 5/root)
	near(t, "correlation with another seed", seeds/count, 0, 5/root)
}

func TestSensorRepeatsBitForBit(t *testing.T) {
	given := set{"displacement_noise": 1e-4, "displacement_cutoff": 200, "displacement_gain": 0.99}
	a, b := sensor(t, "displacement", 3, given), sensor(t, "displacement", 3, given)
	readings := func(s *Sensor) (out [500]float64) {
		s.Start(0.02)
		for k := range out {
			out[k] = s.Read(0.02 * math.Cos(0.01*float64(k)))
		}
		return out
	}
	first := readings(a)
	if again := readings(a); again != first {
		t.Error("a second start does not repeat the first run")
	}
	if twin := readings(b); twin != first {
		t.Error("a second sensor of the same seed reads differently")
	}
	if other := readings(sensor(t, "displacement", 4, given)); other == first {
		t.Error("another seed reads the same")
	}
}

func TestSensorResolutionAndRange(t *testing.T) {
	for _, c := range []struct {
		name     string
		given    set
		in, want float64
	}{
		{"to the nearest quantum", set{"force_resolution": 20}, 49, 40},
		{"up", set{"force_resolution": 20}, 51, 60},
		{"below zero", set{"force_resolution": 20}, -51, -60},
		{"ties to even", set{"force_resolution": 20}, 50, 40},
		{"range alone", set{"force_range": 100}, 123, 100},
		{"range alone, inside", set{"force_range": 100}, 99.9, 99.9},
		{"range below", set{"force_range": 100}, -123, -100},
		{"range that is no multiple of the resolution", set{"force_range": 110, "force_resolution": 20}, 500, 110},
		{"4 bits over ±80", set{"force_range": 80, "force_bits": 4}, 24, 20},
		{"4 bits over ±80, next", set{"force_range": 80, "force_bits": 4}, 26, 30},
		{"4 bits, full scale", set{"force_range": 80, "force_bits": 4}, 81, 80},
		{"4 bits, full scale below", set{"force_range": 80, "force_bits": 4}, -1e9, -80},
		{"16 bits over ±1 N", set{"force_range": 1, "force_bits": 16}, 0.3, math.Round(0.3*32768) / 32768},
		{"gain and bias come first", set{"force_gain": 2, "force_bias": 3, "force_resolution": 10}, 11, 20},
	} {
		if got := sensor(t, "force", 1, c.given).Read(c.in); got != c.want {
			t.Errorf("%s: %v read as %v, want %v", c.name, c.in, got, c.want)
		}
	}
	// Rounding a signal that is spread evenly over whole quanta adds an error
	// of q/√12 rms (Bennett 1948), here known to five standard errors of N
	// uniform values: q/√12·(1 ± 5·√(1/5N)).
	const q, count = 1e-3, 100000
	s := sensor(t, "displacement", 1, set{"displacement_resolution": q})
	square := 0.0
	for k := range count {
		_, part := math.Modf(float64(k) * math.Sqrt2)
		x := 100 * q * part
		off := s.Read(x) - x
		square += off * off
	}
	near(t, "quantization error", math.Sqrt(square/count)/(q/math.Sqrt(12)), 1, 5*math.Sqrt(0.2/count))
}

func TestSensorFilterFrequencyResponse(t *testing.T) {
	const rate, most = 2048, 10000
	for _, cutoff := range []float64{20, 150, 400} {
		for _, q := range []int{1, 20, 150, 900} {
			s := sensor(t, "displacement", 1, set{"displacement_cutoff": cutoff})
			got := measure(q, rate, rate, s.Read)
			w := 2 * math.Pi * float64(q)
			model := func(s complex128) complex128 { return 1 / (1 + s/complex(2*math.Pi*cutoff, 0)) }
			want := sampled(w, sensorTick, most, model)
			// The aliases left out fall off with the cube: below 1/(π³M²)·f_c/rate.
			if off := cmplx.Abs(got - want); !(off < 1e-10) {
				t.Errorf("%v Hz at %d Hz: got %v, want %v, off by %.2g", cutoff, q, got, want, off)
			}
			if q == 1 { // far below the rate the hold takes nothing: (w·h)²/12 is 8e-7
				g := 1 / math.Sqrt(1+1/(cutoff*cutoff))
				near(t, fmt.Sprintf("|F| of %v Hz at 1 Hz", cutoff), cmplx.Abs(got), g, 1e-6)
				near(t, "phase", cmplx.Phase(got), -math.Atan(1/cutoff), 1e-6)
			}
		}
	}
	// At rest it stays at rest.
	s := sensor(t, "displacement", 1, set{"displacement_cutoff": 30, "displacement_gain": 1.1, "displacement_bias": 0.001})
	s.Start(0.02)
	first := s.Read(0.02)
	near(t, "at rest", first, 0.023, 1e-17)
	for range 100 {
		if got := s.Read(0.02); got != first {
			t.Fatalf("reads %v at rest, then %v", first, got)
		}
	}
}

func TestSensorRefusesBadSettingsByName(t *testing.T) {
	for _, c := range []struct {
		given set
		says  string
	}{
		{set{"force_bits": 12, "force_range": 1e5, "force_resolution": 10}, "force_bits: is given beside force_resolution"},
		{set{"force_bits": 12}, "force_range: is missing"},
		{set{"force_bits": 3, "force_range": 1}, "force_bits: "},
		{set{"force_bits": 12.5, "force_range": 1}, "force_bits: "},
		{set{"force_range": 0}, "force_range: "},
		{set{"force_noise": -1}, "force_noise: "},
		{set{"force_cutoff": -1}, "force_cutoff: "},
		{set{"force_gain": 0}, "force_gain: "},
		{set{"force_gian": 1}, `did you mean "force_gain"`},
	} {
		if _, err := makeSensor("force", 1, c.given); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%v: error %v, want one that says %q", c.given, err, c.says)
		}
	}
	v, err := SensorSettings.Resolve(kind.Values{})
	if err != nil {
		t.Fatal(err)
	}
	for _, tick := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := NewSensor(tick, v, "force", 1); err == nil || !strings.HasPrefix(err.Error(), "tick: ") {
			t.Errorf("tick %v: error %v", tick, err)
		}
	}
}

func TestSensorReadsWithoutAllocating(t *testing.T) {
	s := sensor(t, "force", 1, set{"force_noise": 50, "force_cutoff": 100, "force_bits": 16, "force_range": 1e6})
	if n := testing.AllocsPerRun(500, func() { s.Read(1234) }); n != 0 {
		t.Errorf("%v allocations in a reading", n)
	}
}

func BenchmarkSensor(b *testing.B) {
	for name, given := range map[string]set{
		"perfect": {}, "noise": {"force_noise": 50},
		"all": {"force_noise": 50, "force_cutoff": 100, "force_bits": 16, "force_range": 1e6},
	} {
		b.Run(name, func(b *testing.B) {
			s, err := makeSensor("force", 1, given)
			if err != nil {
				b.Fatal(err)
			}
			for b.Loop() {
				s.Read(1234)
			}
		})
	}
}
