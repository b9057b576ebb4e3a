package identify

import (
	"fmt"
	"testing"
)

func TestTry2(t *testing.T) {
	const rate = 2048.0
	for _, scale := range []float64{0.001, 0.1, 0.5, 1, 2} {
		for _, fr := range []float64{0, 1000} {
			for _, m := range motions {
				u := m.make(rate, 30)
				for k := range u {
					u[k] *= scale
				}
				set := nums("friction", fr)
				y := carried(build(t, 1/rate, 0, "servo-hydraulic", set), spring(t, 5e6), u)
				r := identified(t, Record{Command: u, Measured: y, Tick: 1 / rate})
				h := newHydraulic(t, set, 5e6, rmsSpeed(y, 1/rate))
				fmt.Printf("%s scale %g fric %g: LD tot %s phase %s SO phase %s truth band %.4f low %.4f | frf low %.4f tr %.4f high %.4f tr %.4f warn %v\n", m.name, scale, fr,
					r.LagDelay.Total.text(1e3), r.LagDelay.Phase.text(1e3), r.Second.Phase.text(1e3), 1e3*h.inBand(u, r), 1e3*h.delay(0.01),
					1e3*r.Response[0].Delay, 1e3*h.delay(r.Response[0].Hz), 1e3*r.Response[len(r.Response)-1].Delay, 1e3*h.delay(r.Band[1]), r.Warnings)
			}
		}
	}
}
