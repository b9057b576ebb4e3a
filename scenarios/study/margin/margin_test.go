package margin

import (
	"context"
	"fmt"
	"math"
	"testing"

	"antelag/scenarios"
)

// oneStorey is m = 100 t, 1.5 Hz, 3 %, of whose stiffness a share is specimen behind
// a pure delay.
func oneStorey(tb testing.TB, rate, damping, share, delay float64, more string, changes ...scenarios.Change) *scenarios.Scenario {
	tb.Helper()
	k := 100e3 * math.Pow(2*math.Pi*1.5, 2)
	text := fmt.Sprintf(`
[loop]
rate = "%v Hz"
duration = "10 s"
[substructure]
damping_ratio = %v
[[substructure.storey]]
mass = "100 t"
stiffness = "%.17g N/m"
[excitation]
kind = "release"
drives = "ground"
amplitude = "10 mm"
[[channel]]
name = "c"
between = [0, 1]
[channel.actuator]
kind = "lag-delay"
delay = "%.17g s"
[[channel.specimen]]
kind = "spring"
stiffness = "%.17g N/m"
[channel.compensator]
%s
`, rate, damping, (1-share)*k, delay, share*k, more)
	s, err := scenarios.Parse("test.toml", []byte(text), ".", changes...)
	if err != nil {
		tb.Fatal(err)
	}
	return s
}

func TestCriticalDelays(t *testing.T) {
	for share, want := range map[float64]float64{0.5: 12.763041e-3, 0.2: 32.324155e-3, 0.8: 7.965210e-3, 1: 6.370017e-3} {
		for _, delay := range []float64{0, 2e-3, 50e-3} {
			r, err := Of(context.Background(), oneStorey(t, 4096, 0.03, share, delay, `kind = "none"`), Options{})
			if err != nil {
				t.Fatal(err)
			}
			got := float64(r.Channels[0].CriticalDelay)
			t.Logf("share %g, delay %g: critical %.9g (%.1e), %+v, radius %v, gains %v", share, delay, got, got/want-1, r.Channels[0].Delays, r.SpectralRadius, r.Channels[0].Gains)
			if math.Abs(got/want-1) > 1e-4 {
				t.Errorf("share %g: critical delay %.9g s, want %.9g", share, got, want)
			}
		}
	}
}

func BenchmarkMap(b *testing.B) {
	s, err := scenarios.Load("archive")
	if err != nil {
		b.Fatal(err)
	}
	for _, text := range []string{"damper.actuator.delay=0:40 ms:60,damper.compensator.delay=0:40 ms:60",
		"damper.specimen[1].stiffness=0:40 kN/mm:60,substructure.storey[0].mass=20 t:90 t:60"} {
		x, y, err := ParseMap(s, text)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(text, func(b *testing.B) {
			for b.Loop() {
				if _, err := Map(context.Background(), s, x, y, Options{}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
