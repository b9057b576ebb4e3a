package report

import (
	"fmt"
	"math"

	"antelag/rtloop/gauge"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
	"antelag/scenarios/report/figure"
)

const (
	mm = 1e3  // of a metre
	kN = 1e-3 // of a newton
)

var (
	timeAxis = figure.Axis{Label: "time", Unit: "s"}
	moveAxis = figure.Axis{Label: "displacement", Unit: "mm"}
)

// motions shows, for each channel, what was wanted, asked for and done.
func (r *run) motions() Part {
	p := Part{Heading: "Tracking and force"}
	if r.rec.stride > 1 {
		p.Text = append(p.Text, fmt.Sprintf("The run is long: the pictures show one tick in %d. The figures in the tables come from every tick.", r.rec.stride))
	}
	for j := range r.s.Channels {
		c := &r.s.Channels[j]
		record := history{trace: r.rec.channels[j], time: r.rec.time, name: c.Name,
			near: r.rec.strongest(j, r.rec.loop.Window()), closest: r.rec.strongest(j, 0.3*r.rec.loop.Window()),
			acceptError: number(r.s.Accept, "peak_error"), tripError: number(c.Limits, "error"), tripForce: number(c.Limits, "force"), timeWord: "model time"}
		if r.v.Slowdown == 1 {
			record.timeWord = "time"
		}
		record.tick = r.rec.loop.Period() * float64(r.rec.stride)
		p.Pictures = append(p.Pictures, record.pictures()...)
	}
	return p
}

// number is a setting that may not be given, NaN then.
func number(v kind.Values, name string) float64 {
	if v.Has(name) {
		return v.Num(name)
	}
	return math.NaN()
}

// history is what there is to draw of one channel. What was not recorded is
// empty, a limit that is not there NaN.
type history struct {
	trace
	time                              []float64
	near, closest                     span // where the target is largest: some periods, and about one
	name                              string
	tick                              float64 // physical seconds from row to row
	acceptError, tripError, tripForce float64
	timeWord                          string
}

func (h *history) pictures() []Picture {
	if len(h.time) == 0 {
		return nil
	}
	out := []Picture{h.tracking(), h.subspace()}
	if len(h.force) > 0 {
		out = append(out, h.loops())
	}
	return out
}

// tracking draws target and measured, the stretch where the target is largest
// enlarged, and the error.
func (h *history) tracking() Picture {
	at := timeAxis
	at.Label = h.timeWord
	zoom := h.closest
	near := func(v []float64) []float64 { return v[zoom.from:zoom.to] }
	whole := figure.Panel{X: at, Y: moveAxis, Share: 1.1, Lines: []figure.Line{
		{Name: "target", X: h.time, Y: scaled(h.target, mm)}, {Name: "measured", X: h.time, Y: scaled(h.measured, mm)}}}
	wrong := figure.Panel{X: at, Y: figure.Axis{Label: "error", Unit: "mm"}, Share: 0.9,
		Lines: []figure.Line{{Name: "error, measured − target", X: h.time, Y: difference(h.measured, h.target, mm)}}}
	wrong.Levels = append(wrong.Levels, both("accepted", h.acceptError)...)
	wrong.Levels = append(wrong.Levels, both("trips at", h.tripError)...)
	nearby := at
	nearby.Low, nearby.High = h.time[zoom.from], h.time[zoom.to-1]
	close := figure.Panel{Title: "where the target is largest", X: nearby, Y: moveAxis, Share: 1.1, Lines: []figure.Line{
		{Name: "target", X: near(h.time), Y: scaled(near(h.target), mm)}, {Name: "measured", X: near(h.time), Y: scaled(near(h.measured), mm)}}}
	if len(h.command) > 0 {
		close.Lines = append(close.Lines, figure.Line{Name: "command", X: near(h.time), Y: scaled(near(h.command), mm)})
	}
	return Picture{Name: h.name + "-tracking",
		Caption: "Target and measured displacement, their error, and the stretch in whose middle the target is largest.",
		Figure:  figure.Figure{Title: "Channel " + h.name + ": target, measured and error", Panels: []figure.Panel{whole, wrong, close}}}
}

// both are the limits of an error either way; NaN is none. Of one far from the
// data the lower says no more than the upper.
func both(word string, limit float64) []figure.Level {
	if math.IsNaN(limit) {
		return nil
	}
	name := word + " ±" + quantity.Short(limit, quantity.Length)
	return []figure.Level{{Name: name, Value: limit * mm}, {Value: -limit * mm}}
}

// subspace draws measured against target over the strongest stretch, with the
// fitted ellipse, and the same with the error enlarged.
func (h *history) subspace() Picture {
	x, y := h.target[h.near.from:h.near.to], h.measured[h.near.from:h.near.to]
	t := gauge.NewTracking(len(x))
	t.Start(x[0], y[0])
	for k := range x[1:] {
		t.Add(x[k+1], y[k+1])
	}
	e := t.Subspace()
	most := 0.0
	for k := range x {
		most = math.Max(most, math.Max(math.Abs(x[k]), math.Abs(y[k])))
	}
	most *= mm
	ex, ey := ellipse(e)
	target := figure.Axis{Label: "target", Unit: "mm"}
	trail := figure.Panel{X: target, Y: figure.Axis{Label: "measured", Unit: "mm"}, Equal: true, Share: 1.6, Lines: []figure.Line{
		{Name: "measured", X: scaled(x, mm), Y: scaled(y, mm)}, {Name: "equal", X: []float64{-most, most}, Y: []float64{-most, most}},
		{Name: "fitted ellipse", X: ex, Y: ey}}}
	wrong := figure.Panel{Title: "the same, error enlarged", X: target, Y: figure.Axis{Label: "measured − target", Unit: "mm"}, Lines: []figure.Line{
		{Name: "error", X: scaled(x, mm), Y: difference(y, x, mm)}, {Name: "equal", X: []float64{-most, most}, Y: []float64{0, 0}},
		{Name: "fitted ellipse", X: ex, Y: difference(ey, ex, 1)}}}
	return Picture{Name: h.name + "-synchronization",
		Caption: fmt.Sprintf("Synchronization subspace where the target is largest: %s. Late measured displacements turn the trail into a loop that is run through counter-clockwise.", h.ellipseWords(e)),
		Figure:  figure.Figure{Title: "Channel " + h.name + ": synchronization subspace", Width: 120, Height: 138, Panels: []figure.Panel{trail, wrong}}}
}

func (h *history) ellipseWords(e gauge.Ellipse) string {
	late := e.Delay * h.tick
	if math.IsNaN(late) || math.IsNaN(e.AmplitudeRatio) {
		return "the motion is too small to say a delay"
	}
	word := "late"
	if late < 0 {
		word = "early"
	}
	return fmt.Sprintf("%.3f ms %s, amplitude %.2f %%", 1e3*math.Abs(late), word, 100*e.AmplitudeRatio)
}

// ellipse is the outline of a fitted ellipse, mm.
func ellipse(e gauge.Ellipse) (x, y []float64) {
	if !(e.Major > 0) {
		return nil, nil
	}
	sin, cos := math.Sincos(e.Tilt)
	for i := range 121 {
		s, c := math.Sincos(2 * math.Pi * float64(i) / 120)
		a, b := e.Major*c, e.Minor*s
		x = append(x, mm*(e.CenterX+a*cos-b*sin))
		y = append(y, mm*(e.CenterY+a*sin+b*cos))
	}
	return x, y
}

// loops draws force against displacement.
func (h *history) loops() Picture {
	p := figure.Panel{X: figure.Axis{Label: "measured displacement", Unit: "mm"}, Y: figure.Axis{Label: "measured force", Unit: "kN"},
		Lines: []figure.Line{{Name: "specimen", X: scaled(h.measured, mm), Y: scaled(h.force, kN)}}}
	if !math.IsNaN(h.tripForce) {
		p.Levels = []figure.Level{{Name: "trips at ±" + quantity.Short(h.tripForce, quantity.Force), Value: h.tripForce * kN}, {Value: -h.tripForce * kN}}
	}
	return Picture{Name: h.name + "-force", Caption: "Measured force against measured displacement over the whole run.",
		Figure: figure.Figure{Title: "Channel " + h.name + ": force against displacement", Width: 120, Height: 78, Panels: []figure.Panel{p}}}
}

// energyPart shows the energy margin over time and the balance.
func (r *run) energyPart() Part {
	p := Part{Heading: "Energy"}
	if r.s.Substructure == nil {
		return p
	}
	p.Text = []string{"Late force feeds energy into the loop. The energy margin is 1 less what the tracking error injected over what was damped, over a trailing window: 100 % when nothing is injected, 0 at the edge of instability, below 0 when the loop grows. It says so of this motion; a slow growth of a mode that this motion hardly moves can hide behind it."}
	panel := marginPanel(r.rec.time, r.rec.margin, number(r.s.Accept, "energy_margin"))
	if r.v.Slowdown != 1 {
		panel.X.Label = "model time"
	}
	p.Pictures = []Picture{{Name: "energy-margin", Caption: "Energy margin over the trailing window; blank while too little is damped to tell.",
		Figure: figure.Figure{Title: "Energy margin", Panels: []figure.Panel{panel}}}}
	p.Tables = []Table{energyTable(r.lane.Energy)}
	return p
}

// marginPanel draws an energy margin with its limit. How far below any margin a
// loop that blew up was is of no interest.
func marginPanel(time, margin []float64, limit float64) figure.Panel {
	low := 0.0
	for _, m := range margin {
		if m < low {
			low = m
		}
	}
	low = math.Max(low, -1)
	at := timeAxis
	if len(time) > 0 {
		at.Low, at.High = time[0], time[len(time)-1]
	}
	p := figure.Panel{X: at, Y: figure.Axis{Label: "energy margin", Unit: "%", Low: 100*low - 5, High: 110},
		Lines:  []figure.Line{{Name: "energy margin", X: time, Y: scaled(margin, 100)}},
		Levels: []figure.Level{{Name: "grows below 0", Value: 0}}}
	if !math.IsNaN(limit) {
		p.Levels = append(p.Levels, figure.Level{Name: "accepted ≥ " + quantity.Short(100*limit, quantity.None) + " %", Value: 100 * limit})
	}
	return p
}
