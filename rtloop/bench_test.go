package rtloop

import (
	"math"
	"sync"
	"testing"
	"time"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop/excitation"
	"antelag/rtloop/substructure"
	"antelag/scenarios/kind"
)

// BenchmarkTick is one lane of the standard case for every compensator: one
// storey, one channel, lag-delay actuator, bouc-wen specimen, every gauge. Where
// there is a C compiler the same lane with polynomial, fused by hand in C, runs
// beside them as fused-C, and the polynomial line says how many times its time
// ours is, ×C.
func BenchmarkTick(b *testing.B) {
	program := ""
	if compiler := cCompiler(); compiler != "" {
		program = buildFused(b, compiler)
	}
	var once sync.Once // b.N grows in several runs of one function
	for _, name := range compensator.Kinds.Names() {
		b.Run(name, func(b *testing.B) {
			if name != "polynomial" || program == "" {
				benchmarkLane(b, name, nil)
				if name == "polynomial" {
					once.Do(func() { b.Log(noCompiler) })
				}
				return
			}
			// C before every test, and the fastest lap on either side, so that
			// what else the machine does falls on neither.
			c := math.Inf(1)
			ours := benchmarkLane(b, name, func() {
				c = min(c, runFused(b, program, testTicks, 1)["ns_per_tick"])
			})
			if ours > 0 {
				b.ReportMetric(ours/c, "×C")
			}
		})
	}
	if program != "" {
		b.Run("fused-C", func(b *testing.B) {
			b.ReportMetric(runFused(b, program, testTicks, 1+b.N/testTicks)["ns_per_tick"], "ns/op")
		})
	}
}

// benchmarkLane runs b.N ticks and returns the time of a tick, ns, in the
// fastest lap, which is once through the motion; 0 if there was none. The first
// lap of a test does not count: its window is not full yet. What is to be done
// before every test, if anything, is not timed.
func benchmarkLane(b *testing.B, method string, before func()) float64 {
	l := standardLoop(b, method, testTicks)
	motion := standardMotion()
	lap := len(motion) // a power of two
	var fastest, began time.Duration
	b.ReportAllocs()
	b.ResetTimer()
	for i := range b.N {
		if i&(lap-1) == 0 {
			took := b.Elapsed() - began
			if i%testTicks != lap && i > 0 && (fastest == 0 || took < fastest) {
				fastest = took
			}
			// A new test now and then: the record is worked out after a test,
			// not in its ticks.
			if i%testTicks == 0 {
				if before != nil {
					b.StopTimer()
					before()
					b.StartTimer()
				}
				l.Start(motion[0])
			}
			began = b.Elapsed()
		}
		l.Tick(motion[i&(lap-1)])
	}
	b.StopTimer()
	if l.Outcome() != Running {
		b.Fatalf("the loop %v: %+v", l.Outcome(), l.trip)
	}
	return float64(fastest.Nanoseconds()) / float64(lap)
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
