package report

import (
	"context"
	"crypto/sha256"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"

	"antelag/rtloop"
	"antelag/rtloop/runlog"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
	"antelag/scenarios/report/figure"
	"antelag/scenarios/study/replay"
)

// IsLog reports whether a name is that of a log and not of a scenario, by its
// ending.
func IsLog(name string) bool {
	name = strings.TrimSuffix(strings.ToLower(name), ".gz")
	switch filepath.Ext(name) {
	case ".csv", ".tsv", ".txt", ".dat", ".asc":
		return true
	}
	return false
}

// Record reports on the log of a test that has been. When ctx ends first the
// report is of what was read.
func Record(ctx context.Context, path string, o runlog.Options, progress func(done, of int64)) (*Test, error) {
	rep, err := replay.Of(ctx, path, replay.Options{Log: o, Progress: progress})
	if err != nil {
		return nil, err
	}
	o.Need = []runlog.Role{runlog.Target, runlog.Measured}
	kept, err := readRows(ctx, path, o)
	if err != nil {
		return nil, err
	}
	r := &record{rep: rep, rows: kept}
	source, err := r.source(path)
	if err != nil {
		return nil, err
	}
	t := &Test{
		Name: path, Title: filepath.Base(path), Word: recordWord, Pass: !rep.Interrupted,
		Question: "How closely did the actuators follow their targets in this record?", Verdict: r.verdict(),
	}
	if rep.Title != "" {
		t.Title += ": " + rep.Title
	}
	worst := r.worst()
	t.overview = []string{recordWord, "–", accept.Late(worst.Delay), accept.Share(worst.NRMSE), accept.Margin(rep.Energy.MarginMin), "–"}
	for _, p := range []Part{r.figures(), r.motions(), r.energy(), r.overTime(), r.assumptions(), source} {
		if !p.empty() {
			t.Parts = append(t.Parts, p)
		}
	}
	return t, nil
}

// record is a log that has been judged.
type record struct {
	rep  *replay.Report
	rows *rows
}

// readRows keeps the history of every channel.
func readRows(ctx context.Context, path string, o runlog.Options) (*rows, error) {
	in, err := runlog.Open(path, o)
	if err != nil {
		return nil, err
	}
	defer in.Close()
	r := newRows(len(in.Channels()))
	for in.Next() && ctx.Err() == nil {
		b := in.Block()
		for k := range b.N {
			if !r.keep() {
				continue
			}
			r.time = append(r.time, in.Start()+float64(b.First+int64(k))*in.Step())
			if b.Margin != nil {
				r.margin = append(r.margin, b.Margin[k])
			}
			for j := range b.Channels {
				t := &r.channels[j]
				for role, to := range map[runlog.Role]*[]float64{runlog.Target: &t.target, runlog.Command: &t.command, runlog.Measured: &t.measured, runlog.Force: &t.force} {
					if from := b.Channels[j][role]; from != nil {
						*to = append(*to, from[k])
					}
				}
			}
		}
	}
	return r, in.Err()
}

// worst is the channel with the largest tracking error.
func (r *record) worst() *rtloop.ChannelResult {
	worst := &r.rep.Channels[0].ChannelResult
	for i := range r.rep.Channels {
		if c := &r.rep.Channels[i].ChannelResult; c.NRMSE > worst.NRMSE {
			worst = c
		}
	}
	return worst
}

func (r *record) verdict() string {
	c := r.worst()
	text := fmt.Sprintf("Channel %s: delay %s, amplitude %s, tracking error %s rms and %s at most.",
		c.Name, accept.Late(c.Delay), accept.Amplitude(c.AmplitudeRatio), accept.Share(c.NRMSE), quantity.Format(float64(c.PeakError), quantity.Length))
	if r.rep.Interrupted {
		text = "INTERRUPTED; of what was read: " + text
	}
	return text
}

// figures shows the gauges of the whole record.
func (r *record) figures() Part {
	t := Table{Caption: "Gauges of the whole record",
		Head: []string{"channel", "delay", "amplitude", "error, rms", "error, peak", "peak target", "peak force", "tracking indicator at the end"}}
	at := Table{Caption: "Where it was worst", Head: []string{"channel", "figure", "value", "from", "to"}}
	for i := range r.rep.Channels {
		c := &r.rep.Channels[i]
		t.Rows = append(t.Rows, Row{c.Name, accept.Late(c.Delay), accept.Amplitude(c.AmplitudeRatio), accept.Share(c.NRMSE),
			quantity.Format(float64(c.PeakError), quantity.Length), quantity.Format(float64(c.PeakTarget), quantity.Length),
			quantity.Format(float64(c.PeakForce), quantity.Force), indicator(c.TrackingIndicator)})
		for _, m := range c.Worst {
			at.Rows = append(at.Rows, Row{c.Name, momentNames[m.Figure], momentValue(m), instant(m.Start), instant(m.End)})
		}
	}
	p := Part{Heading: "Tracking in figures", Tables: []Table{t}, Text: []string{"Delays are physical time, positive when late."}}
	if len(at.Rows) > 0 {
		p.Tables = append(p.Tables, at)
	}
	return p
}

var momentNames = map[string]string{
	"peak_error_m": "error, peak", "nrmse": "error, rms", "delay_s": "delay", "amplitude_ratio": "amplitude", "injected_J": "energy injected",
}

func momentValue(m replay.Moment) string {
	switch m.Figure {
	case "delay_s":
		return accept.Late(m.Value)
	case "amplitude_ratio":
		return accept.Amplitude(m.Value)
	case "nrmse":
		return accept.Share(m.Value)
	case "injected_J":
		return quantity.Format(float64(m.Value), quantity.Energy)
	}
	return quantity.Format(float64(m.Value), quantity.Length)
}

func instant(f rtloop.Figure) string {
	if !f.Defined() {
		return "–"
	}
	return fmt.Sprintf("%.3f s", float64(f))
}

func (r *record) motions() Part {
	p := Part{Heading: "Tracking and force"}
	if r.rows.stride > 1 {
		p.Text = append(p.Text, fmt.Sprintf("The record is long: the pictures show one sample in %d. The figures in the tables come from every sample.", r.rows.stride))
	}
	nan := math.NaN()
	for j := range r.rows.channels {
		c := &r.rep.Channels[j]
		window := r.rep.Window
		if f := float64(c.FEI.Frequency); f > 0 {
			window = math.Min(window, 5/f/r.rep.Slowdown)
		}
		h := history{trace: r.rows.channels[j], time: r.rows.time, name: c.Name, acceptError: nan, tripError: nan, tripForce: nan, timeWord: "time of the log",
			near: r.rows.strongest(j, window), closest: r.rows.strongest(j, 0.3*window), tick: float64(r.rows.stride) / r.rep.Rate}
		p.Pictures = append(p.Pictures, h.pictures()...)
	}
	return p
}

// energy shows what the tracking error put in, and the margin where it was
// logged.
func (r *record) energy() Part {
	p := Part{Heading: "Energy"}
	e := &r.rep.Energy
	if e.Injected.Defined() {
		in := accept.SameUnit(e.Injected, e.Specimen)
		p.Tables = append(p.Tables, Table{Caption: "Energy over the whole record, from displacements and forces as they were measured", Head: []string{"energy", "value", "meaning"}, Rows: []Row{
			{"injected", in[0], "by the tracking error of the actuators"}, {"specimens", in[1], "taken by the specimens, stored and dissipated"},
			{"least energy margin", accept.Margin(e.MarginMin), "as it was logged"}}})
	}
	if e.MarginMin.Defined() && len(r.rows.margin) > 0 {
		panel := marginPanel(r.rows.time, r.rows.margin, math.NaN())
		panel.X.Label = "time of the log"
		p.Pictures = append(p.Pictures, Picture{Name: "energy-margin", Caption: "Energy margin as it was logged; blank while undefined.",
			Figure: figure.Figure{Title: "Energy margin", Panels: []figure.Panel{panel}}})
	}
	return p
}

// overTime shows how the gauges went.
func (r *record) overTime() Part {
	f := r.rep.Figure()
	f.Title = "Gauges over time"
	return Part{Heading: "Gauges over time", Pictures: []Picture{{Name: "windows", Figure: f,
		Caption: fmt.Sprintf("Each point is a window of %s.", quantity.Format(r.rep.Window, quantity.Time))}}}
}

func (r *record) assumptions() Part {
	p := Part{Heading: "Assumed, and not tested", List: []string{
		"The record is what the sensors said; their delays, noise and bias are in it.",
		"Target and measured are taken as sampled at the same instants. A converter or network that stamps one later than the other shows as delay.",
		"The response error against a perfect actuator cannot be told from a record: what the structure would have done is not in it.",
	}}
	if r.rep.Slowdown != 1 {
		p.List = append(p.List, fmt.Sprintf("A second of the log took %g physical seconds; delays are physical.", r.rep.Slowdown))
	} else {
		p.List = append(p.List, "A second of the log was taken for a physical second.")
	}
	for _, n := range r.rep.Notes {
		p.List = append(p.List, "In reading: "+n+".")
	}
	return p
}

// source is where the report comes from.
func (r *record) source(path string) (Part, error) {
	f, err := os.Open(path)
	if err != nil {
		return Part{}, err
	}
	defer f.Close()
	h := sha256.New()
	n, err := io.Copy(h, f)
	if err != nil {
		return Part{}, err
	}
	return Part{Heading: "Provenance", Tables: []Table{{Caption: "Where this report comes from", Head: []string{"what", "value"}, Rows: []Row{
		{"log", path}, {"size", fmt.Sprintf("%d bytes", n)}, {"SHA-256 of the log", fmt.Sprintf("%x", h.Sum(nil))},
		{"samples", fmt.Sprintf("%d, %s apart in time of the log", r.rep.Samples, quantity.Short(1/r.rep.Rate/r.rep.Slowdown, quantity.Time))},
		{"length", quantity.Short(float64(r.rep.Time), quantity.Time)}}}}}, nil
}
