package identify

import (
	"fmt"
	"math"
	"testing"

	"antelag/plant"
)

// found says how far an estimate is from the truth, and whether that is within
// the tolerance or three standard errors.
func found(e Estimate, truth, tolerance float64) (off float64, ok bool) {
	off = e.Value - truth
	return off, math.Abs(off) <= max(tolerance, 3*e.Sigma)
}

// row finds a known actuator again and returns a line of the table; the second
// value says whether delay is within 0.1 ms, and lag and gain within 2 %, or
// three standard errors.
func row(t testing.TB, k known, name string, rate, duration, level float64) (string, bool) {
	t.Helper()
	u := motion(name, rate, duration)
	y := noisy(carried(build(t, 1/rate, plant.Ramp, k.kind, k.set), plant.NewSpecimen(), u), level, 0, 5)
	f := k.own(identified(t, Record{Command: u, Measured: y, Tick: 1 / rate}))
	delay, lag, gain := k.truth()
	dDelay, ok1 := found(f.Delay, delay, 1e-4)
	dLag, ok2 := found(f.Lag, lag, 0.02*lag)
	dGain, ok3 := found(f.Gain, gain, 0.02*gain)
	dTotal, ok4 := found(f.Total, delay+lag, 1e-4)
	vague := ""
	if f.Vague {
		vague = "vague"
	}
	return fmt.Sprintf("%-12s %-5s %4.0f Hz %3.0f dB  delay %+8.4f ± %8.4f ms  lag %+8.3f ± %8.3f %%  gain %+7.4f ± %7.4f %%  total %+8.4f ± %7.4f ms  %s",
		k.kind, name, rate, level, 1e3*dDelay, 1e3*f.Delay.Sigma, 100*dLag/lag, 100*f.Lag.Sigma/lag,
		100*dGain/gain, 100*f.Gain.Sigma/gain, 1e3*dTotal, 1e3*f.Total.Sigma, vague), ok1 && ok2 && ok3 && ok4
}

func TestKnownActuatorsAreFoundAgain(t *testing.T) {
	for _, k := range linear {
		for _, m := range motions {
			for _, level := range levels {
				if line, ok := row(t, k, m.name, 256, 15, level); !ok {
					t.Error(line)
				}
			}
		}
		if line, ok := row(t, k, "sweep", 2048, 8, -40); !ok {
			t.Error(line)
		}
	}
}

// BenchmarkTable prints the whole table, to 8192 Hz. Run it with -benchtime 1x.
func BenchmarkTable(b *testing.B) {
	for range b.N {
		for _, k := range linear {
			for _, rate := range []float64{256, 1024, 2048, 8192} {
				for _, m := range motions {
					for _, level := range levels {
						line, ok := row(b, k, m.name, rate, 30, level)
						fmt.Println(line, ok)
					}
				}
			}
		}
		for _, s := range servos {
			for _, rate := range []float64{256, 1024} {
				u, y := s.answer(b, rate)
				for _, level := range levels {
					line, _, _, ok := s.line(b, u, y, rate, level)
					fmt.Println(line, ok)
				}
			}
		}
	}
}

// A held command is there half a tick before a ramp to the same value would be,
// which must not be taken for less delay.
func TestStepsAreNoLessLate(t *testing.T) {
	k := linear[0]
	u := motion("noise", 256, 20)
	y := carried(build(t, 1.0/256, plant.Step, k.kind, k.set), plant.NewSpecimen(), u)
	r := identified(t, Record{Command: u, Measured: noisy(y, -50, 0, 1), Tick: 1.0 / 256, Hold: plant.Step})
	delay, lag, _ := k.truth()
	if _, ok := found(r.LagDelay.Delay, delay, 1e-4); !ok {
		t.Errorf("delay %s ms, want %v", r.LagDelay.Delay.text(1e3), delay*1e3)
	}
	if _, ok := found(r.LagDelay.Total, delay+lag, 1e-4); !ok {
		t.Errorf("total %s ms, want %v", r.LagDelay.Total.text(1e3), (delay+lag)*1e3)
	}
	for _, b := range r.Response {
		if math.Abs(b.Delay-phaseDelay(r.LagDelay, 2*math.Pi*b.Hz)) > 2e-4+4*b.DelaySigma {
			t.Errorf("%v Hz: delay %v ms beside a fit of %v ms", b.Hz, 1e3*b.Delay, 1e3*phaseDelay(r.LagDelay, 2*math.Pi*b.Hz))
		}
	}
}

// A record that begins in the middle of a motion has a past that is not there.
func TestRecordsMayBeginInTheMiddle(t *testing.T) {
	for _, k := range linear {
		u := motion("noise", 512, 20)
		y := noisy(carried(build(t, 1.0/512, plant.Ramp, k.kind, k.set), plant.NewSpecimen(), u), -60, 0, 2)
		cut := 3 * 512
		f := k.own(identified(t, Record{Command: u[cut:], Measured: y[cut:], Tick: 1.0 / 512}))
		if f.AtRest {
			t.Errorf("%s: taken to begin at rest", k.kind)
		}
		delay, lag, gain := k.truth()
		for _, c := range []struct {
			name      string
			e         Estimate
			truth, by float64
		}{{"delay", f.Delay, delay, 1e-4}, {"lag", f.Lag, lag, 0.02 * lag}, {"gain", f.Gain, gain, 0.02}} {
			if _, ok := found(c.e, c.truth, c.by); !ok {
				t.Errorf("%s: %s %v ± %v, want %v", k.kind, c.name, c.e.Value, c.e.Sigma, c.truth)
			}
		}
	}
}

// Between two kinds of which one is the other with one parameter more, the
// plainer is right unless the record says otherwise very strongly.
func TestTheRightKindIsTaken(t *testing.T) {
	for _, k := range linear {
		for seed := range uint64(6) {
			u := motion("sweep", 256, 20)
			y := noisy(carried(build(t, 1.0/256, plant.Ramp, k.kind, k.set), plant.NewSpecimen(), u), -40, 0.5, seed)
			if r := identified(t, Record{Command: u, Measured: y, Tick: 1.0 / 256}); r.Best().Kind != k.kind {
				t.Errorf("seed %d: %s was taken for %s, evidence %.1f", seed, k.kind, r.Best().Kind, r.Evidence)
			}
		}
	}
}

// Over many seeds the error over its standard error must be standard normal,
// with white and with filtered noise. Of 30 squares of standard normals the mean
// lies between 0.51 and 1.75 in all but one case in a thousand to each side.
func TestStandardErrorsAreHonest(t *testing.T) {
	const seeds = 30
	for _, k := range linear {
		delay, lag, gain := k.truth()
		u := motion("noise", 128, 12)
		y := carried(build(t, 1.0/128, plant.Ramp, k.kind, k.set), plant.NewSpecimen(), u)
		for _, memory := range []float64{0, 0.9} {
			var z [4]float64
			for seed := range uint64(seeds) {
				f := k.own(identified(t, Record{Command: u, Measured: noisy(y, -40, memory, seed), Tick: 1.0 / 128}))
				for i, c := range []struct {
					e     Estimate
					truth float64
				}{{f.Gain, gain}, {f.Delay, delay}, {f.Lag, lag}, {f.Total, delay + lag}} {
					off := (c.e.Value - c.truth) / c.e.Sigma
					z[i] += off * off / seeds
				}
			}
			for i, name := range []string{"gain", "delay", "lag", "total"} {
				if z[i] < 0.51 || z[i] > 1.75 {
					t.Errorf("%s, noise of memory %v: mean square of error over standard error of the %s is %.2f", k.kind, memory, name, z[i])
				}
			}
		}
	}
}

// BenchmarkIdentify is the fit of the longest stretch that is taken, 2^18 samples.
func BenchmarkIdentify(b *testing.B) {
	const rate = 2048.0
	u := sweep(rate, (1<<18)/rate, 0.2, 8, 0.008)
	y := noisy(carried(build(b, 1/rate, plant.Ramp, linear[0].kind, linear[0].set), plant.NewSpecimen(), u), -60, 0, 1)
	b.ReportAllocs()
	for b.Loop() {
		identified(b, Record{Command: u, Measured: y, Tick: 1 / rate})
	}
}
