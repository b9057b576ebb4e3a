package rtloop

import (
	"math"
	"testing"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// BenchmarkTick is one lane of the standard case for every compensator: one
// storey, one channel, lag-delay actuator, bouc-wen specimen, every gauge.
func BenchmarkTick(b *testing.B) {
	for _, name := range compensator.Kinds.Names() {
		b.Run(name, func(b *testing.B) {
			l := standardLoop(b, name, testTicks)
			motion := standardMotion()
			b.ReportAllocs()
			b.ResetTimer()
			for i := range b.N {
				// A new test now and then: the record is worked out after a
				// test, not in its ticks.
				if i%testTicks == 0 {
					l.Start(motion[0])
				}
				l.Tick(motion[i&(len(motion)-1)])
			}
			b.StopTimer()
			if l.Outcome() != Running {
				b.Fatalf("the loop %v: %+v", l.Outcome(), l.trip)
			}
		})
	}
}

// testTicks is the length of one test of the benchmark: 128 s.
const testTicks = 1 << 18

// standardMotion is a ground acceleration that repeats: four sines without a
// common period, m/s².
func standardMotion() []Drive {
	motion := make([]Drive, 1<<14)
	for i := range motion {
		t := float64(i) / float64(len(motion))
		for k, f := range []float64{7, 11, 17, 29} {
			motion[i].X += 1.2 / float64(k+1) * math.Sin(2*math.Pi*f*t)
		}
	}
	return motion
}

const standardTick = 1.0 / 2048

func standardLoop(tb testing.TB, method string, ticks int64) *Loop {
	tb.Helper()
	const stiffness, yield, hardening = 1.5e6, 0.01, 0.1
	structure, err := substructure.FromStoreys(
		[]substructure.Storey{{Mass: 60e3, Stiffness: 4e6}},
		substructure.Damping{Ratios: []float64{0.03}},
		[]substructure.Attachment{{From: 0, To: 1, Stiffness: stiffness}})
	if err != nil {
		tb.Fatal(err)
	}
	l, err := NewLoop(Config{
		Tick: standardTick, Slowdown: 1, Drives: excitation.Ground, Structure: structure, Integrator: "CR",
		Channels: []Channel{{
			Name: "damper", Method: method,
			Compensator:  newCompensator(tb, standardTick, method, nil),
			Actuator:     newActuator(tb, plant.Timing{Tick: standardTick}, kind.Values{"delay": kind.Num(0.0083), "lag": kind.Num(0.006)}),
			Specimen:     plant.NewSpecimen(plant.NewBoucWen(stiffness, yield, hardening, 1, 0.5)),
			Displacement: plant.NewPerfectSensor(), Force: plant.NewPerfectSensor(), Limits: NoLimits,
		}},
		Window: 5 * 2 * math.Pi / structure.Frequencies()[0], Ticks: ticks, Judge: true,
	})
	if err != nil {
		tb.Fatal(err)
	}
	return l
}
