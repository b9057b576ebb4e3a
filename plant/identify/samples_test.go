package identify

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// motions are commands, m, as a test would make them; all invented.
var motions = []struct {
	name string
	make func(rate, duration float64) []float64
}{
	{"sine", func(rate, duration float64) []float64 {
		return sampled(rate, duration, func(t float64) float64 { return 0.01 * math.Sin(2*math.Pi*2*t) })
	}},
	{"sweep", func(rate, duration float64) []float64 { return sweep(rate, duration, 0.2, 12, 0.008) }},
	{"noise", func(rate, duration float64) []float64 { return bandNoise(rate, duration, 0.2, 10, 0.004, 3) }},
	{"quake", func(rate, duration float64) []float64 { return quake(rate, duration, 0.02, 5) }},
}

func motion(name string, rate, duration float64) []float64 {
	for _, m := range motions {
		if m.name == name {
			return m.make(rate, duration)
		}
	}
	panic(name)
}

func sampled(rate, duration float64, of func(t float64) float64) []float64 {
	u := make([]float64, int(rate*duration))
	for k := range u {
		u[k] = of(float64(k) / rate)
	}
	return u
}

// sweep is a sine whose frequency grows exponentially.
func sweep(rate, duration, from, to, amplitude float64) []float64 {
	c := math.Log(to/from) / duration
	return sampled(rate, duration, func(t float64) float64 {
		return amplitude * math.Sin(2*math.Pi*from*(math.Exp(c*t)-1)/c)
	})
}

// bandNoise is a sum of sines between two frequencies, faded in and out.
func bandNoise(rate, duration, low, high, rms float64, seed uint64) []float64 {
	random := rand.New(rand.NewPCG(seed, 11))
	const lines = 150
	var phase, freq [lines]float64
	for i := range lines {
		phase[i] = 2 * math.Pi * random.Float64()
		freq[i] = low + (high-low)*(float64(i)+random.Float64())/lines
	}
	return sampled(rate, duration, func(t float64) float64 {
		sum := 0.0
		for i := range lines {
			sum += math.Sin(2*math.Pi*freq[i]*t + phase[i])
		}
		return rms * math.Sqrt(2.0/lines) * sum * fade(t, duration)
	})
}

func fade(t, duration float64) float64 {
	edge := min(t, duration-t) / (0.05 * duration)
	return math.Sin(math.Pi / 2 * min(max(edge, 0), 1))
}

// quake is the displacement of an oscillator of 1.5 Hz and 4 % damping under
// noise of a bandwidth of 8 Hz that grows and dies as ground motions do.
func quake(rate, duration, peak float64, seed uint64) []float64 {
	random := rand.New(rand.NewPCG(seed, 12))
	const inner = 8
	dt := 1 / (rate * inner)
	omega, zeta := 2*math.Pi*1.5, 0.04
	var x, v, a1, a2 float64
	u := make([]float64, int(rate*duration))
	top := 0.0
	for k := range u {
		t := float64(k) / rate
		envelope := t / 4 * math.Exp(1-t/4)
		for range inner {
			w := random.NormFloat64() * math.Sqrt(1/dt)
			a1 += dt * 2 * math.Pi * 8 * (w*envelope - a1)
			a2 += dt * 2 * math.Pi * 8 * (a1 - a2)
			v += dt * (-a2 - 2*zeta*omega*v - omega*omega*x)
			x += dt * v
		}
		u[k] = x
		top = max(top, math.Abs(x))
	}
	for k := range u {
		u[k] *= peak / top
	}
	return u
}

// build makes an actuator of the table.
func build(t testing.TB, tick float64, hold plant.Hold, name string, set kind.Values) plant.Actuator {
	t.Helper()
	entry, err := plant.Actuators.Find(name)
	if err != nil {
		t.Fatal(err)
	}
	v, err := entry.Resolve(set)
	if err != nil {
		t.Fatal(err)
	}
	a, err := entry.New(plant.Timing{Tick: tick, Hold: hold}, v)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func nums(pairs ...any) kind.Values {
	v := kind.Values{}
	for i := 0; i < len(pairs); i += 2 {
		v[pairs[i].(string)] = kind.Num(pairs[i+1].(float64))
	}
	return v
}

func spring(t testing.TB, k float64) *plant.Specimen {
	t.Helper()
	entry, err := plant.Elements.Find("spring")
	if err != nil {
		t.Fatal(err)
	}
	e, err := entry.New(nums("stiffness", k))
	if err != nil {
		t.Fatal(err)
	}
	return plant.NewSpecimen(e)
}

// carried is what an actuator makes of a command.
func carried(a plant.Actuator, s *plant.Specimen, u []float64) []float64 {
	y := make([]float64, len(u))
	y[0] = a.Start(u[0], s)
	for k := 1; k < len(u); k++ {
		y[k], _ = a.Advance(u[k], s)
	}
	return y
}

// noisy adds white noise of a level below the motion's rms, dB, behind a
// low-pass with the memory e from sample to sample (0: none).
func noisy(y []float64, level, e float64, seed uint64) []float64 {
	random := rand.New(rand.NewPCG(seed, 99))
	out := make([]float64, len(y))
	rms := spread(y) * math.Pow(10, level/20)
	state := random.NormFloat64()
	for k := range y {
		state = e*state + math.Sqrt(1-e*e)*random.NormFloat64()
		out[k] = y[k] + rms*state
	}
	return out
}

func identified(t testing.TB, rec Record) *Result {
	t.Helper()
	r, err := Identify(context.Background(), rec, Options{})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func (e Estimate) text(scale float64) string {
	return fmt.Sprintf("%.4f±%.4f", e.Value*scale, e.Sigma*scale)
}
