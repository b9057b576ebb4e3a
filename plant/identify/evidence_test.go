package identify

import (
	"fmt"
	"math"
	"testing"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// known is an actuator whose settings are to be found again.
type known struct {
	kind string
	set  kind.Values
}

var linear = []known{
	{"lag-delay", nums("delay", 0.0083, "lag", 0.0061, "gain", 0.97)},
	{"second-order", nums("delay", 0.004, "frequency", 22.0, "damping_ratio", 0.65, "gain", 0.97)},
}

func (k known) truth() (delay, lag, gain float64) {
	if k.kind == "second-order" {
		lag = 2 * k.set.Num("damping_ratio") / (2 * math.Pi * k.set.Num("frequency"))
	} else {
		lag = k.set.Num("lag")
	}
	return k.set.Num("delay"), lag, k.set.Num("gain")
}

// own is the fit of the kind that the actuator is of.
func (k known) own(r *Result) *Fit {
	if k.kind == "second-order" {
		return r.Second
	}
	return r.LagDelay
}

// coverage is the share of seeds for which the truth lies within 1.96 standard
// errors: 0.95 if they are honest.
type coverage struct {
	gain, delay, lag, total float64
	vague                   int
}

func cover(t testing.TB, k known, name string, rate, duration, level, memory float64, seeds int) (c coverage) {
	t.Helper()
	u := motion(name, rate, duration)
	y := carried(build(t, 1/rate, plant.Ramp, k.kind, k.set), plant.NewSpecimen(), u)
	delay, lag, gain := k.truth()
	hit := func(e Estimate, truth float64) float64 {
		if math.Abs(e.Value-truth) <= 1.96*e.Sigma {
			return 1 / float64(seeds)
		}
		return 0
	}
	for seed := range seeds {
		r := identified(t, Record{Command: u, Measured: noisy(y, level, memory, uint64(seed)), Tick: 1 / rate})
		f := k.own(r)
		if f.Vague {
			c.vague++
		}
		c.gain += hit(f.Gain, gain)
		c.delay += hit(f.Delay, delay)
		c.lag += hit(f.Lag, lag)
		c.total += hit(f.Total, delay+lag)
	}
	return c
}

func (c coverage) String() string {
	return fmt.Sprintf("gain %.3f  delay %.3f  lag %.3f  total %.3f  vague %d", c.gain, c.delay, c.lag, c.total, c.vague)
}

// BenchmarkCoverage prints, over 200 seeds, how often the truth lies within 1.96
// standard errors. Run it with -benchtime 1x; it takes some minutes.
func BenchmarkCoverage(b *testing.B) {
	for _, k := range linear {
		for _, m := range motions {
			b.Run(k.kind+"/"+m.name, func(b *testing.B) {
				for range b.N {
					for _, level := range levels {
						for _, memory := range []float64{0, 0.9} {
							c := cover(b, k, m.name, 256, 12, level, memory, 200)
							fmt.Printf("%-12s %-6s %4g dB memory %.1f: %s\n", k.kind, m.name, level, memory, c)
						}
					}
				}
			})
		}
	}
}
