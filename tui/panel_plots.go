package tui

import (
	"math"

	"antelag/rtloop"
	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

// The series, the same in every panel. Each differs from the others in its
// pattern too, so that it is known without colour.
var (
	targetKey   = canvas.Key{Name: "target", Ink: canvas.Target, Style: canvas.Solid}
	measuredKey = canvas.Key{Name: "measured", Ink: canvas.Measured, Style: canvas.Dashed}
	commandKey  = canvas.Key{Name: "command", Ink: canvas.Command, Style: canvas.Dotted}
	errorKey    = canvas.Key{Name: "error", Ink: canvas.Error, Style: canvas.Solid}
	delayKey    = canvas.Key{Name: "delay", Ink: canvas.Measured, Style: canvas.Solid}
	marginKey   = canvas.Key{Name: "margin", Ink: canvas.Measured, Style: canvas.Solid}
)

// plots is what drawing keeps from frame to frame: the scales, and memory.
type plots struct {
	trace, lag, subspace, energy, curve, delay canvas.Plot

	traceScale, lagScale, subspaceScale, energyScale, curveScale, delayScale canvas.Scale

	shown    shown
	curveOf  string
	buffers  [5][]float64
	timeSpan float64 // s, of the longest trace so far
}

// shown is whose data the scales have seen.
type shown struct {
	scenario      string
	lane, channel int
}

func (p *plots) init() {
	// A tenth of a millimetre is little for any actuator: rest does not magnify
	// the noise of sensors.
	const least = 1e-4
	p.traceScale = canvas.Scale{Symmetric: true, MinSpan: least}
	p.lagScale = canvas.Scale{Symmetric: true, MinSpan: least / 10}
	p.subspaceScale = canvas.Scale{Symmetric: true, MinSpan: least}
	p.delayScale = canvas.Scale{MinSpan: 1e-3}
}

// follow lets the scales start anew when another lane or channel is looked at.
func (p *plots) follow(s *Snapshot) {
	now := shown{s.Scenario, s.Lane, s.Channel}
	if now == p.shown {
		return
	}
	p.shown, p.timeSpan = now, 0
	for _, scale := range []*canvas.Scale{&p.traceScale, &p.lagScale, &p.subspaceScale, &p.energyScale, &p.delayScale} {
		scale.Reset()
	}
}

// scaled returns the values times factor in buffer i, clipped to ±most where
// they are numbers.
func (p *plots) scaled(i int, values []float64, factor, most float64) []float64 {
	out := p.buffers[i][:0]
	for _, v := range values {
		if v-v == 0 {
			v = math.Max(-most, math.Min(v, most))
		}
		out = append(out, v*factor)
	}
	p.buffers[i] = out
	return out
}

// hugeLength is beyond any test, m: a loop that diverges is not drawn further.
const hugeLength = 1e3

// lengthAxis brings a scale up to date with lengths in SI and returns the
// axis for it, in the unit that suits, and the factor into that unit. Beyond most
// nothing is shown.
func lengthAxis(scale *canvas.Scale, most float64, series ...[]float64) (canvas.Axis, float64) {
	lo, hi := canvas.Extent(series...)
	lo, hi = scale.Update(math.Max(lo, -most), math.Min(hi, most))
	factor, unit := unitFor(math.Max(math.Abs(lo), math.Abs(hi)), quantity.Length)
	if unit == "µm" {
		factor, unit = 1e3, "mm" // steel is read in millimetres
	}
	return canvas.Axis{Lo: lo * factor, Hi: hi * factor, Unit: unit}, factor
}

// reach is how far lengths are drawn: all of them, but of a loop that has
// diverged only what went before, and where the end begins.
func (p *plots) reach(s *Snapshot) float64 {
	if l := s.lane(); l != nil && l.Outcome == rtloop.Diverged {
		if m := 20 * median(s.Trace.Target, p.buffers[4]); m > 0 {
			return math.Min(m, hugeLength)
		}
	}
	return hugeLength
}

// timeAxis is the axis of a window that slides with the data: as wide as it
// ever was, so that a restart does not stretch it.
func (p *plots) timeAxis(t []float64) canvas.Axis {
	lo, hi := canvas.Extent(t)
	if !defined(lo) {
		return canvas.Axis{Lo: 0, Hi: 1, Unit: "s"}
	}
	p.timeSpan = math.Max(p.timeSpan, hi-lo)
	if p.timeSpan <= 0 {
		return canvas.Axis{Lo: lo, Hi: lo + 1, Unit: "s"}
	}
	if lo == 0 || hi < p.timeSpan {
		return canvas.Axis{Lo: lo, Hi: lo + p.timeSpan, Unit: "s"}
	}
	return canvas.Axis{Lo: hi - p.timeSpan, Hi: hi, Unit: "s"}
}

// last is the newest value, NaN if there is none.
func last(values []float64) float64 {
	if len(values) == 0 {
		return math.NaN()
	}
	return values[len(values)-1]
}
