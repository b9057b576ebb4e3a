package report

import (
	"context"
	"fmt"
	"math"

	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/scenarios/report/figure"
)

// The frequency response is measured, not modelled: the very compensator and
// actuator that ran are driven by sines, tick by tick, and their answers fitted.

// probe is a channel on the bench: a compensator before an actuator that pushes
// a specimen.
type probe struct {
	compensator compensator.Compensator
	actuator    plant.Actuator
	specimen    *plant.Specimen
	tick        float64 // s, physical
	driven      bool    // acceleration is known at the tick's end, not its start
}

// answer is what came of one frequency: how command answers target, measured
// answers command, and measured answers target.
type answer struct {
	hz                              float64
	compensator, actuator, together phasor
}

// phasor is an answer to a sine.
type phasor struct {
	amplitude float64
	delay     float64 // s, positive when late, within half a period
}

const (
	// probing settles for so many periods, and so many seconds, then measures.
	settlePeriods  = 2.0
	settleTime     = 0.5
	measurePeriods = 2.0
	perDecade      = 24
)

// at drives the channel by a sine of so many Hz and metres.
func (p *probe) at(hz, amplitude float64) answer {
	omega := 2 * math.Pi * hz
	period := 1 / hz
	settle := int(math.Ceil((settlePeriods*period + settleTime) / p.tick))
	measure := max(8, int(math.Round(measurePeriods*period/p.tick)))
	p.compensator.Start(0, 0)
	y := p.actuator.Start(0, p.specimen)
	var target, command, measured fit
	for k := 1; k <= settle+measure; k++ {
		sin, cos := math.Sincos(omega * float64(k) * p.tick)
		// The sine grows from rest over the first period: the actuator is not
		// asked to jump.
		grow := math.Min(1, float64(k)*p.tick/period)
		in := compensator.Input{X: grow * amplitude * sin, V: grow * amplitude * omega * cos, Y: y, R: p.specimen.Force()}
		late := omega * float64(k-1) * p.tick
		if p.driven {
			late = omega * float64(k) * p.tick
		}
		in.A = -grow * amplitude * omega * omega * math.Sin(late)
		u := p.compensator.Command(in)
		y, _ = p.actuator.Advance(u, p.specimen)
		if k > settle {
			target.add(sin, cos, in.X)
			command.add(sin, cos, u)
			measured.add(sin, cos, y)
		}
	}
	x, u, v := target.solve(), command.solve(), measured.solve()
	return answer{hz: hz, compensator: answered(u, x, omega), actuator: answered(v, u, omega), together: answered(v, x, omega)}
}

// fit finds a·sin + b·cos + c in a signal by least squares.
type fit struct{ n, s, c, ss, cc, sc, ys, yc, y float64 }

func (f *fit) add(sin, cos, y float64) {
	f.n++
	f.s += sin
	f.c += cos
	f.ss += sin * sin
	f.cc += cos * cos
	f.sc += sin * cos
	f.ys += y * sin
	f.yc += y * cos
	f.y += y
}

// solve returns a + jb, so that the signal is Im((a + jb)·e^(jωt)) + c.
func (f *fit) solve() complex128 {
	// Without the mean: centred sums.
	ss, cc, sc := f.ss-f.s*f.s/f.n, f.cc-f.c*f.c/f.n, f.sc-f.s*f.c/f.n
	ys, yc := f.ys-f.y*f.s/f.n, f.yc-f.y*f.c/f.n
	det := ss*cc - sc*sc
	return complex((ys*cc-yc*sc)/det, (yc*ss-ys*sc)/det)
}

// answered is output over input.
func answered(out, in complex128, omega float64) phasor {
	h := out / in
	return phasor{math.Hypot(real(h), imag(h)), (0 - math.Atan2(imag(h), real(h))) / omega}
}

// unwrap adds whole periods where a delay jumps by about one from a frequency to
// the next, so that a curve of it has no false steps.
func unwrap(all []answer, of func(*answer) *phasor) {
	for i := 1; i < len(all); i++ {
		period := 1 / all[i].hz
		p, was := of(&all[i]), of(&all[i-1])
		// It is the phase that is continuous.
		turn := was.delay*all[i-1].hz - p.delay*all[i].hz
		p.delay += math.Round(turn) * period
	}
}

// band is where the response is of interest: from well below the first mode to
// well above what the compensation can reach.
func (r *run) band() (low, high float64) {
	rate := r.v.Rate
	low, high = 0.2, 20.0
	if st := r.rec.loop.Structure(); st != nil {
		f := st.Frequencies()
		low = math.Max(0.05, math.Min(low, f[0]/(2*math.Pi)/r.v.Slowdown/2))
		high = math.Max(high, math.Min(1.5*f[len(f)-1]/(2*math.Pi)/r.v.Slowdown, 50))
	}
	high = math.Min(high, rate/8)
	return math.Min(low, high/10), high
}

// response measures and draws compensator × actuator of every channel.
func (r *run) response(ctx context.Context) Part {
	p := Part{Heading: "Frequency response of compensator and actuator"}
	low, high := r.band()
	n := 1 + int(math.Round(perDecade*math.Log10(high/low)))
	for j := range r.s.Channels {
		bench, amplitude := r.probe(j), r.amplitude(j)
		var all []answer
		for i := range n {
			if ctx.Err() != nil {
				break
			}
			hz := low * math.Pow(high/low, float64(i)/float64(n-1))
			// Never faster than the velocity limit, or half a metre a second.
			fastest := 0.5
			if v := number(r.s.Channels[j].Limits, "velocity"); v > 0 {
				fastest = v / 2
			}
			all = append(all, bench.at(hz, math.Min(amplitude, fastest/(2*math.Pi*hz))))
		}
		if len(all) < 2 {
			break
		}
		for _, of := range phasors {
			unwrap(all, of.get)
		}
		p.Pictures = append(p.Pictures, r.responsePicture(j, all, amplitude))
	}
	if len(p.Pictures) > 0 {
		p.Text = append(p.Text, "Measured on the compensator and the actuator that ran, by driving them with sines, the actuator on its specimen; adaptive compensators with the coefficients that they had at the end of the run. Where both together keep the amplitude at 100 % and the delay at 0, the test is what it should be.")
	}
	return p
}

// phasors name the three curves.
var phasors = []struct {
	name string
	get  func(*answer) *phasor
}{
	{"compensator", func(a *answer) *phasor { return &a.compensator }},
	{"actuator", func(a *answer) *phasor { return &a.actuator }},
	{"together", func(a *answer) *phasor { return &a.together }},
}

func (r *run) responsePicture(j int, all []answer, amplitude float64) Picture {
	hz := figure.Axis{Label: "frequency", Unit: "Hz", Log: true}
	size := figure.Panel{X: hz, Y: figure.Axis{Label: "amplitude", Unit: "%", Low: 0, High: math.NaN()}}
	late := figure.Panel{X: hz, Y: figure.Axis{Label: "delay", Unit: "ms"}}
	for _, of := range phasors {
		var f, a, d []float64
		for i := range all {
			q := of.get(&all[i])
			f, a, d = append(f, all[i].hz), append(a, 100*q.amplitude), append(d, 1e3*q.delay)
		}
		size.Lines = append(size.Lines, figure.Line{Name: of.name, X: f, Y: a})
		late.Lines = append(late.Lines, figure.Line{Name: of.name, X: f, Y: d})
	}
	size.Y.High = ceiling(all)
	var f, a, d []float64
	ran := r.rec.response[j]
	if r.lane.Outcome != rtloop.Completed {
		ran = nil // a piece of a run, perhaps one that grew, says little
	}
	for _, b := range inside(ran, all[0].hz, all[len(all)-1].hz) {
		f, a, d = append(f, b.Frequency), append(a, 100*b.Amplitude), append(d, 1e3*b.Delay)
	}
	if len(f) > 0 {
		size.Lines = append(size.Lines, figure.Line{Name: "together, in this run", X: f, Y: a, Points: true})
		late.Lines = append(late.Lines, figure.Line{Name: "together, in this run", X: f, Y: d, Points: true})
	}
	if st := r.rec.loop.Structure(); st != nil {
		for i, w := range st.Frequencies() {
			if i < 3 {
				f := w / (2 * math.Pi) / r.v.Slowdown
				size.Levels = append(size.Levels, figure.Level{Name: fmt.Sprintf("mode %d", i+1), Value: f, Vertical: true, Reference: true})
				late.Levels = append(late.Levels, figure.Level{Value: f, Vertical: true, Reference: true})
			}
		}
	}
	name := r.s.Channels[j].Name
	caption := fmt.Sprintf("Sines of at most %.3g mm.", amplitude*mm)
	if len(f) > 0 {
		caption += " Points: how measured answered target in this run, by thirds of an octave."
	}
	return Picture{Name: name + "-response",
		Caption: caption,
		Figure:  figure.Figure{Title: "Channel " + name + ": frequency response", Panels: []figure.Panel{size, late}}}
}

// ceiling of the amplitude axis, %: a predictor that extrapolates wildly at high
// frequencies must not flatten what matters.
func ceiling(all []answer) float64 {
	most := 0.0
	for i := range all {
		for _, of := range phasors {
			most = math.Max(most, of.get(&all[i]).amplitude)
		}
	}
	return 100 * math.Min(math.Max(1.1, 1.05*most), 2)
}

func inside(bands []gauge.Band, low, high float64) []gauge.Band {
	var out []gauge.Band
	for _, b := range bands {
		if b.Frequency >= low && b.Frequency <= high {
			out = append(out, b)
		}
	}
	return out
}

// probe takes the parts of channel j, which have run, to the bench: the actuator
// on its specimen, and the compensator with the coefficients that it ended with.
func (r *run) probe(j int) *probe {
	c := r.rec.loop.Part(j)
	return &probe{compensator: compensator.Frozen(c.Compensator), actuator: c.Actuator, specimen: c.Specimen,
		tick: r.rec.loop.Period(), driven: r.s.Substructure == nil}
}

// amplitude of the sines, m: a fifth of the peak target, so that a yielding
// specimen or a valve works as in the test's smaller cycles.
func (r *run) amplitude(j int) float64 {
	if peak := float64(r.lane.Channels[j].PeakTarget); peak > 0 {
		return peak / 5
	}
	return 1e-3
}
