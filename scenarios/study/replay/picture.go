package replay

import (
	"path/filepath"

	"antelag/rtloop"
	"antelag/scenarios/report/figure"
)

// Figure draws the windows over time: delay, amplitude, error, and, where there is
// force, the energy that the tracking error put in.
func (r *Report) Figure() figure.Figure {
	when := figure.Axis{Label: "time", Unit: "s"}
	panels := []figure.Panel{
		{Title: "delay, late above zero", X: when, Y: figure.Axis{Label: "delay", Unit: "ms"}},
		{Title: "amplitude of measured over target", X: when, Y: figure.Axis{Label: "amplitude", Unit: "%"}},
		{Title: "tracking error in each window", X: when, Y: figure.Axis{Label: "error, rms", Unit: "%"}},
	}
	of := []func(*Window) rtloop.Figure{
		func(w *Window) rtloop.Figure { return w.Delay },
		func(w *Window) rtloop.Figure { return w.AmplitudeRatio },
		func(w *Window) rtloop.Figure { return w.NRMSE },
	}
	scale := []float64{1e3, 100, 100}
	for _, c := range r.Channels {
		name := c.Name
		if len(r.Channels) == 1 {
			name = ""
		}
		middle := series(c.Windows, 1, func(w *Window) rtloop.Figure { return (w.Start + w.End) / 2 })
		for i := range of {
			panels[i].Lines = append(panels[i].Lines, figure.Line{Name: name, X: middle, Y: series(c.Windows, scale[i], of[i]), Points: true, Joined: true})
		}
	}
	if r.Energy.Injected.Defined() {
		panels = append(panels, r.injected(when))
	}
	return figure.Figure{Title: filepath.Base(r.Log), Panels: panels}
}

// injected draws what each window put in.
func (r *Report) injected(when figure.Axis) figure.Panel {
	p := figure.Panel{Title: "energy that the tracking error put into the structure, in each window", X: when, Y: figure.Axis{Label: "energy", Unit: "J"}}
	for _, c := range r.Channels {
		name := c.Name
		if len(r.Channels) == 1 {
			name = ""
		}
		p.Lines = append(p.Lines, figure.Line{
			Name: name, Points: true, Joined: true,
			X: series(c.Windows, 1, func(w *Window) rtloop.Figure { return (w.Start + w.End) / 2 }),
			Y: series(c.Windows, 1, func(w *Window) rtloop.Figure { return w.Injected }),
		})
	}
	return p
}
