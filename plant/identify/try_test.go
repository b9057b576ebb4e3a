package identify

import (
	"fmt"
	"testing"
	"time"
)

func TestTry(t *testing.T) {
	for _, m := range motions {
		for _, rate := range []float64{256, 2048} {
			u := m.make(rate, 30)
			tick := 1 / rate
			for _, k := range []string{"lag-delay", "second-order", "servo-hydraulic"} {
				set := nums()
				switch k {
				case "lag-delay":
					set = nums("delay", 0.0083, "lag", 0.0061, "gain", 0.97)
				case "second-order":
					set = nums("delay", 0.004, "frequency", 22.0, "damping_ratio", 0.65, "gain", 0.97)
				}
				y0 := carried(build(t, tick, 0, k, set), spring(t, 5e6), u)
				for _, level := range []float64{-60, -40, -26} {
					y := noisy(y0, level, 0, 1)
					b := time.Now()
					r := identified(t, Record{Command: u, Measured: y, Tick: tick})
					l, s := r.LagDelay, r.Second
					fmt.Printf("%s %g %s %g | %v rest %v vague %v %v ev %.1f band %.2f-%.2f coh %.3f\n  LD g %s d %s l %s tot %s ph %s n %.4f\n  SO g %s d %s l %s tot %s f %s z %s n %.4f\n",
						m.name, rate, k, level, time.Since(b).Round(time.Millisecond), l.AtRest, l.Vague, s.Vague, r.Evidence, r.Band[0], r.Band[1], r.CoherenceMin,
						l.Gain.text(1), l.Delay.text(1e3), l.Lag.text(1e3), l.Total.text(1e3), l.Phase.text(1e3), l.NRMSE,
						s.Gain.text(1), s.Delay.text(1e3), s.Lag.text(1e3), s.Total.text(1e3), s.Frequency.text(1), s.Damping.text(1), s.NRMSE)
					for _, g := range r.Groups {
						fmt.Printf("    A %.4f v %.3f delay %.3f±%.3f gain %.4f±%.4f\n", g.Amplitude, g.Speed, g.Delay*1e3, g.DelaySigma*1e3, g.Gain, g.GainSigma)
					}
					for _, w := range r.Warnings {
						fmt.Println("   !", w)
					}
				}
			}
		}
	}
}
