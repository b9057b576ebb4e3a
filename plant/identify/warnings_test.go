package identify

import (
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"antelag/plant"
)

// play is backlash: y follows u once the slack of half width b is taken up.
func play(u []float64, b float64) []float64 {
	y := make([]float64, len(u))
	for k := 1; k < len(u); k++ {
		y[k] = min(max(y[k-1], u[k]-b), u[k]+b)
	}
	return y
}

// slowed is y that cannot move faster than v.
func slowed(y []float64, v, tick float64) []float64 {
	out := make([]float64, len(y))
	for k := 1; k < len(y); k++ {
		out[k] = out[k-1] + min(max(y[k]-out[k-1], -v*tick), v*tick)
	}
	return out
}

func clipped(y []float64, top float64) []float64 {
	out := make([]float64, len(y))
	for k, v := range y {
		out[k] = min(max(v, -top), top)
	}
	return out
}

func scaled(y []float64, by float64) []float64 {
	out := make([]float64, len(y))
	for k, v := range y {
		out[k] = by * v
	}
	return out
}

func TestWarnings(t *testing.T) {
	const rate = 512.0
	ld := linear[0]
	through := func(u []float64) []float64 {
		return noisy(carried(build(t, 1/rate, plant.Ramp, ld.kind, ld.set), plant.NewSpecimen(), u), -50, 0, 4)
	}
	noise := motion("noise", rate, 20)
	sine := motion("sine", rate, 20)
	for _, c := range []struct {
		name              string
		command, measured []float64
		want              string // "" : none at all
	}{
		{"a good record", noise, through(noise), ""},
		{"a good sweep", motion("sweep", rate, 20), through(motion("sweep", rate, 20)), ""},
		{"a sine in the middle", sine[1000:9000], through(sine)[1000:9000], "Motion of one frequency, 2."},
		{"a sine from rest", sine, through(sine), "The motion is of one frequency, 2."},
		{"much noise", noise, noisy(through(noise), 0, 0.95, 1), "The coherence is below 0.9 at"},
		{"much left over", noise, noisy(through(noise), -14, 0, 1), "of the motion unexplained"},
		{"the wrong sign", noise, scaled(through(noise), -1), "runs against the command"},
		{"metres beside millimetres", noise, scaled(through(noise), 1000), "check the units of command and measured"},
		{"the target taken for the command", noise[:len(noise)-20], through(noise)[20:], "is ahead of the command"},
		{"a slow valve", noise, slowed(through(noise), 0.25, 1/rate), "its flow or valve saturates"},
		{"a short stroke", noise, clipped(through(noise), 0.008), "a stroke or range limit"},
		{"play", noise, through(play(noise, 3e-4)), "backlash or friction"},
		{"play under a sine", sine, through(play(sine, 3e-4)), "backlash or friction"},
	} {
		all := strings.Join(identified(t, Record{Command: c.command, Measured: c.measured, Tick: 1 / rate}).Warnings, "\n")
		if c.want == "" && all != "" || !strings.Contains(all, c.want) {
			t.Errorf("%s: warnings %q, want %q", c.name, all, c.want)
		}
	}
}

// With play the delay and gain of small motions differ from those of large ones.
func TestAmplitudeDependence(t *testing.T) {
	const rate = 512.0
	// Bursts of three sizes.
	u := motion("noise", rate, 30)
	for k := range u {
		u[k] *= []float64{0.1, 0.4, 1}[k*3/len(u)]
	}
	ld := linear[0]
	y := noisy(carried(build(t, 1/rate, plant.Ramp, ld.kind, ld.set), plant.NewSpecimen(), play(u, 1e-4)), -60, 0, 4)
	r := identified(t, Record{Command: u, Measured: y, Tick: 1 / rate})
	if len(r.Groups) < 3 {
		t.Fatalf("%d groups", len(r.Groups))
	}
	small, large := r.Groups[0], r.Groups[len(r.Groups)-1]
	if !(small.Gain < large.Gain-0.05) || !(small.Delay > large.Delay+1e-3) {
		t.Errorf("small motions %+v, large ones %+v", small, large)
	}
	if all := strings.Join(r.Warnings, "\n"); !strings.Contains(all, "The delay depends on the amplitude") {
		t.Errorf("warnings: %s", all)
	}
	// And without play they do not.
	y = noisy(carried(build(t, 1/rate, plant.Ramp, ld.kind, ld.set), plant.NewSpecimen(), u), -60, 0, 4)
	r = identified(t, Record{Command: u, Measured: y, Tick: 1 / rate})
	for _, g := range r.Groups {
		if math.Abs(g.Delay-r.LagDelay.Phase.Value) > 2e-4+5*g.DelaySigma {
			t.Errorf("without play: %+v beside %v", g, r.LagDelay.Phase)
		}
	}
}

// From a long record the fit takes the stretch that moves the most, and says so.
func TestLongRecords(t *testing.T) {
	const rate = 512.0
	u := motion("noise", rate, 20)
	for k := range u {
		if k < len(u)/2 {
			u[k] *= 0.1
		}
	}
	y := noisy(carried(build(t, 1/rate, plant.Ramp, linear[0].kind, linear[0].set), plant.NewSpecimen(), u), -50, 0, 4)
	r, err := Identify(context.Background(), Record{Command: u, Measured: y, Tick: 1 / rate}, Options{Most: 4096})
	if err != nil {
		t.Fatal(err)
	}
	if r.Fitted != 4096 || r.From < len(u)/2-2 || r.Samples != len(u) {
		t.Errorf("fitted %d from %d of %d", r.Fitted, r.From, r.Samples)
	}
	if len(r.Warnings) == 0 || !strings.HasPrefix(r.Warnings[0], "The fit took 4096 of 10240 samples") {
		t.Errorf("warnings %q", r.Warnings)
	}
	if _, ok := found(r.LagDelay.Total, 0.0144, 1e-4); !ok {
		t.Errorf("total %s", r.LagDelay.Total.text(1e3))
	}
}

func TestRecordsThatTellNothing(t *testing.T) {
	good := motion("noise", 256, 2)
	still := make([]float64, len(good))
	holed := scaled(good, 1)
	holed[17] = math.NaN()
	for _, c := range []struct {
		name string
		rec  Record
		want string
	}{
		{"unequal", Record{Command: good, Measured: good[1:], Tick: 0.01}, "512 samples of the command but 511 of the measured displacement"},
		{"short", Record{Command: good[:63], Measured: good[:63], Tick: 0.01}, "63 samples; a fit takes at least 64"},
		{"no tick", Record{Command: good, Measured: good}, "tick: 0 s is no time step"},
		{"a hole", Record{Command: holed, Measured: good, Tick: 0.01}, "sample 17: command NaN and measured "},
		{"no command", Record{Command: still, Measured: good, Tick: 0.01}, "the command never moves"},
		{"no answer", Record{Command: good, Measured: still, Tick: 0.01}, "the measured displacement never moves"},
		{"out of this world", Record{Command: scaled(good, 1e200), Measured: good, Tick: 0.01}, "are none of an actuator"},
	} {
		if _, err := Identify(context.Background(), c.rec, Options{}); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Identify(ctx, Record{Command: good, Measured: good, Tick: 0.01}, Options{}); err != context.Canceled {
		t.Errorf("cancelled: %v", err)
	}
}

// Whatever stands in the record: no panic, and numbers that are numbers.
func FuzzIdentify(f *testing.F) {
	f.Add(uint64(1), uint16(200), 0.001, 0.01, 3.0, byte(0))
	f.Add(uint64(2), uint16(64), 1.0, 1e-6, 0.0, byte(1))
	f.Add(uint64(3), uint16(900), 1e-7, 5.0, 100.0, byte(2))
	f.Add(uint64(4), uint16(500), 0.002, 0.0, -1.0, byte(7))
	f.Fuzz(func(t *testing.T, seed uint64, n uint16, tick, size, gain float64, how byte) {
		random := rand.New(rand.NewPCG(seed, 1))
		rec := Record{Tick: tick, Hold: plant.Hold(how & 1)}
		walk := 0.0
		for k := range int(n) % 2048 {
			walk += random.NormFloat64()
			u := walk * size
			switch how >> 1 & 3 {
			case 1:
				u = size * math.Sin(float64(k)*gain)
			case 2:
				u = size * float64(k/100%2)
			}
			rec.Command = append(rec.Command, u)
			y := gain * u
			if how&8 != 0 {
				y += random.NormFloat64()
			}
			if how&16 != 0 && k > 10 {
				y = rec.Command[k-10] * gain
			}
			rec.Measured = append(rec.Measured, y)
		}
		r, err := Identify(context.Background(), rec, Options{})
		if err != nil {
			return
		}
		b := r.Best()
		for _, e := range []Estimate{b.Gain, b.Delay, b.Lag, b.Total, b.Phase, b.Offset} {
			if math.IsNaN(e.Value) || math.IsInf(e.Value, 0) || e.Sigma < 0 {
				t.Fatalf("%+v", b)
			}
		}
		for name, v := range b.Settings() {
			if math.IsNaN(v.Num) {
				t.Fatalf("%s is no number", name)
			}
		}
	})
}
