package replay

import (
	"path/filepath"

	"antelag/rtloop"
	"antelag/scenarios/quantity"
	"antelag/scenarios/report/figure"
)

// markersMost is how many windows still get a marker each.
const markersMost = 120

// Figure draws the windows over time: delay, amplitude, error, and, where there is
// force, the energy that the tracking error put in.
func (r *Report) Figure() figure.Figure {
	window := quantity.Format(r.Window, quantity.Time)
	panels := []figure.Panel{
		r.panel("delay, late above zero", figure.Axis{Label: "delay", Unit: "ms"}, 1e3, func(w *Window) rtloop.Figure { return w.Delay }),
		r.panel("amplitude of measured over target", figure.Axis{Label: "amplitude", Unit: "%"}, 100, func(w *Window) rtloop.Figure { return w.AmplitudeRatio }),
		r.panel("tracking error in windows of "+window, figure.Axis{Label: "error, rms", Unit: "%"}, 100, func(w *Window) rtloop.Figure { return w.NRMSE }),
	}
	panels[0].Levels = []figure.Level{{Reference: true, Name: "in time", Value: 0}}
	if r.Energy.Injected.Defined() {
		panels = append(panels, r.panel("energy put in by the tracking error in windows of "+window, figure.Axis{Label: "energy", Unit: "J"}, 1,
			func(w *Window) rtloop.Figure { return w.Injected }))
	}
	return figure.Figure{Title: filepath.Base(r.Log), Panels: panels}
}

// panel draws one figure of all channels, at the middle of each window.
func (r *Report) panel(title string, y figure.Axis, scale float64, of func(*Window) rtloop.Figure) figure.Panel {
	p := figure.Panel{Title: title, Y: y, X: figure.Axis{Label: "time", Unit: "s"}}
	if r.Time > 0 {
		p.X.Low, p.X.High = float64(r.Start), float64(r.Start+r.Time)
	}
	for _, c := range r.Channels {
		line := figure.Line{
			X: series(c.Windows, 1, func(w *Window) rtloop.Figure { return (w.Start + w.End) / 2 }),
			Y: series(c.Windows, scale, of),
		}
		if len(r.Channels) > 1 {
			line.Name = c.Name
		}
		line.Points = len(c.Windows) <= markersMost
		line.Joined = line.Points
		p.Lines = append(p.Lines, line)
	}
	return p
}
