package identify

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"gonum.org/v1/gonum/dsp/fourier"

	"antelag/plant"
	"antelag/scenarios/kind"
)

// lateness is how late y, noise-free, is behind u by the record alone, without
// any model: from the cross-spectrum of the whole record in one piece, its ends
// faded, over the band.
type lateness struct {
	hz, weight []float64 // power of the velocity commanded
	cross      []complex128
}

func latenessOf(u, y []float64, tick float64, band [2]float64) lateness {
	n := len(u)
	fu, fy := faded(u), faded(y)
	var l lateness
	for i := range fu {
		hz := float64(i) / (float64(n) * tick)
		if hz < band[0] || hz > band[1] {
			continue
		}
		l.hz = append(l.hz, hz)
		l.weight = append(l.weight, (real(fu[i])*real(fu[i])+imag(fu[i])*imag(fu[i]))*hz*hz)
		l.cross = append(l.cross, fy[i]*cmplx.Conj(fu[i]))
	}
	return l
}

func faded(x []float64) []complex128 {
	n := len(x)
	m := mean(x)
	out := make([]float64, n)
	for k := range x {
		out[k] = (x[k] - m) * fade(float64(k), float64(n-1))
	}
	return fourier.NewFFT(n).Coefficients(nil, out)
}

// between is the phase delay between two frequencies, weighted, and the weight.
func (l lateness) between(low, high float64) (delay, weight float64) {
	sum := 0.0
	for i, hz := range l.hz {
		if hz >= low && hz <= high {
			sum += l.weight[i] * -cmplx.Phase(l.cross[i]) / (2 * math.Pi * hz)
			weight += l.weight[i]
		}
	}
	return sum / weight, weight
}

func (l lateness) inBand() float64 {
	delay, _ := l.between(0, math.Inf(1))
	return delay
}

// peak is where the cross-correlation of the two, limited to the band, is
// largest: where its slope is zero, by bisection about a first guess.
func (l lateness) peak(guess float64) float64 {
	slope := func(d float64) float64 {
		sum := 0.0
		for i, hz := range l.hz {
			omega := 2 * math.Pi * hz
			sum -= omega * imag(l.cross[i]*cmplx.Rect(1, omega*d))
		}
		return sum
	}
	lo, hi := guess-5e-3, guess+5e-3
	for range 60 {
		if mid := (lo + hi) / 2; slope(mid) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

// servo is a servo-hydraulic actuator on a spring under a command: at ordinary
// amplitudes, 20 mm at most, and where the orifice and the speed of the valve
// begin to tell.
type servo struct {
	name      string
	set       kind.Values
	stiffness float64
	motion    string
	scale     float64
	depends   bool // on the amplitude, so much that it is to be said
}

var servos = func() (all []servo) {
	for _, p := range []servo{
		{name: "the default", set: nums(), stiffness: 5e6, scale: 1},
		{name: "a soft specimen, no integral", set: nums("ki", 0.0), stiffness: 1e6, scale: 1},
		{name: "a stiff specimen", set: nums(), stiffness: 20e6, scale: 0.25},
	} {
		for _, m := range motions {
			p.motion = m.name
			all = append(all, p)
		}
	}
	return append(all,
		servo{"a slow valve, much friction", nums("valve_frequency", 40.0, "friction", 5e3), 5e6, "noise", 0.5, false},
		servo{"double amplitude", nums(), 5e6, "quake", 2, true},
		servo{"three quarters of the stall", nums(), 20e6, "quake", 0.5, true},
		servo{"as fast as the valve lets it", nums(), 5e6, "noise", 2, true})
}()

// answer is the command and what the plant makes of it, without noise.
func (s servo) answer(t testing.TB, rate float64) (u, y []float64) {
	u = scaled(motion(s.motion, rate, 20), s.scale)
	return u, carried(build(t, 1/rate, plant.Ramp, "servo-hydraulic", s.set), spring(t, s.stiffness), u)
}

// line compares the fit at one level of noise with the plant's own lateness, of
// the noise-free answer; ok says whether the two are within 0.1 ms or three
// standard errors.
func (s servo) line(t testing.TB, u, y []float64, rate, level float64) (text string, r *Result, l lateness, ok bool) {
	r = identified(t, Record{Command: u, Measured: noisy(y, level, 0, 3), Tick: 1 / rate})
	l = latenessOf(u, y, 1/rate, r.Band)
	own, phase := l.inBand(), r.Best().Phase
	off, ok := found(phase, own, 1e-4)
	_, plain := found(r.LagDelay.Phase, own, 1e-4)
	linear := newHydraulic(t, s.set, s.stiffness, rmsSpeed(y, 1/rate)).inBand(u, r)
	text = fmt.Sprintf("servo-hydraulic %-28s %-5s x%.2f %4.0f Hz %3.0f dB  late %8.4f ms by its own answer (%8.4f linearized), fit %+8.4f ± %7.4f ms, unexplained %.2f %%",
		s.name, s.motion, s.scale, rate, level, 1e3*own, 1e3*linear, 1e3*off, 1e3*phase.Sigma, 100*r.Best().NRMSE)
	return text, r, l, ok && plain
}

// Where a plant is not linear its truth is what its own answer says, without
// noise: the fit is as late as that, and so is the frequency response in each
// third of the band that the motion fills.
func TestServosAreAsLateAsTheirOwnAnswer(t *testing.T) {
	const rate = 256.0
	for _, s := range servos {
		u, y := s.answer(t, rate)
		for _, level := range levels {
			text, r, l, ok := s.line(t, u, y, rate, level)
			if !ok {
				t.Error(text)
			}
			// Two ways to say how late the motion as a whole is. Where the delay is
			// not the same at all frequencies they weigh it a little differently.
			if peak := l.peak(r.Best().Phase.Value); math.Abs(peak-l.inBand()) > 5e-5 {
				t.Errorf("%s: the correlation peaks at %.4f ms", text, 1e3*peak)
			}
			for i := range 3 {
				width := (r.Band[1] - r.Band[0]) / 3
				s.third(t, text, r, l, r.Band[0]+float64(i)*width, r.Band[0]+float64(i+1)*width)
			}
			if said := strings.Contains(strings.Join(r.Warnings, " "), "The delay depends on the amplitude"); s.depends && level < -30 && !said {
				t.Errorf("%s: no word of the amplitude; groups %+v, slope %+v, warnings %q", text, r.Groups, r.slope, r.Warnings)
			}
		}
	}
}

// third compares the delay of the frequency response between two frequencies with
// the plant's own, weighted alike, where a twentieth of the motion is.
func (s servo) third(t *testing.T, text string, r *Result, l lateness, low, high float64) {
	_, all := l.between(0, math.Inf(1))
	step := r.Response[1].Hz - r.Response[0].Hz
	var weight, own, delay, variance float64
	for _, b := range r.Response {
		d, w := l.between(b.Hz-step/2, b.Hz+step/2)
		if b.Hz < low || b.Hz > high || w == 0 {
			continue
		}
		weight += w
		own += w * d
		delay += w * b.Delay
		variance += w * w * b.DelaySigma * b.DelaySigma
	}
	if weight < all/20 {
		return
	}
	// A Hann window is one bin and a half wide: so many fewer are independent.
	e := Estimate{delay / weight, math.Sqrt(1.5*variance) / weight}
	if off, ok := found(e, own/weight, 1e-4); !ok {
		t.Errorf("%s: from %.2f to %.2f Hz the response is %+.4f ms off %.4f, ± %.4f", text, low, high, 1e3*off, 1e3*own/weight, 1e3*e.Sigma)
	}
}
