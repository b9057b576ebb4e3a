package tui

import (
	"math"
	"time"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/scenarios/quantity"
)

// Invented snapshots, of the kind that a run gives.

var none = math.NaN()

// motion fills trace and subspace: a decaying 1.3 Hz motion of 30 mm that the
// actuator follows late by delay seconds and too small by the gain.
func motion(s *Snapshot, until, delay, gain float64) {
	target := func(t float64) float64 {
		return 0.03 * math.Sin(2*math.Pi*1.3*t) * math.Exp(-math.Pow((t-12)/9, 2)) * (1 + 0.3*math.Sin(2*math.Pi*3.7*t))
	}
	const step = 1.0 / 200
	for t := math.Max(0, until-8); t <= until; t += step {
		x, y := target(t), gain*target(t-delay)
		s.Trace.Time = append(s.Trace.Time, t)
		s.Trace.Target = append(s.Trace.Target, x)
		s.Trace.Command = append(s.Trace.Command, target(t+0.014))
		s.Trace.Measured = append(s.Trace.Measured, y)
		s.Trace.Lag = append(s.Trace.Lag, x-y)
	}
	n := max(0, len(s.Trace.Time)-400)
	s.Subspace.X, s.Subspace.Y = s.Trace.Target[n:], s.Trace.Measured[n:]
	phase := 2 * math.Pi * 1.3 * delay
	s.Subspace.Delay = delay
	s.Subspace.Ellipse = gauge.Ellipse{Major: 0.03 * math.Sqrt(1+gain*gain) * math.Cos(phase/2),
		Minor: 0.03 * math.Sqrt(1+gain*gain) * math.Abs(math.Sin(phase/2)),
		Tilt:  math.Atan(gain), AmplitudeRatio: gain, Phase: phase, Delay: delay * 2048}
	for t := 0.0; t <= until; t += 0.1 {
		m := none
		if t > 1 {
			m = 0.72 + 0.1*math.Sin(t) - 0.02*delay*1e3
		}
		s.Energy.Time = append(s.Energy.Time, t)
		s.Energy.History = append(s.Energy.History, m)
	}
}

func sampleRunningWell() *Snapshot {
	s := &Snapshot{
		Scenario: "archive", Title: "three-storey archive, viscous damper at the ground storey (invented)",
		Clock: Clock{Time: 12.345, Duration: 30, Rate: 2048, Slowdown: 1, Speed: 1},
		Lanes: []LaneView{
			{"configured", "polynomial", rtloop.Running, nil, 0.0262, 0.000412, 0.694, 0.0431, 1},
			{"inverse", "inverse", rtloop.Running, nil, 0.0518, -0.001234, 0.612, 0.0712, 2}},
		Channels: []string{"damper"},
		Trace:    Trace{ErrorLimit: 0.025},
		Energy:   EnergyView{Structure: true, Margin: 0.694, MarginMin: 0.412, AddedDamping: -0.00312, Limit: 0.3},
		Pace: PaceView{Ticks: 25283, Late: 3, P50: 4200, P99: 18300, P999: 41100, Max: 112400, Period: 488281,
			Granted: []string{"a thread of its own", "real-time priority (SCHED_FIFO) 50", "memory not locked: not permitted; a page fault may delay a tick"}},
		Editor: EditorView{Method: "polynomial", Cursor: 1, Settings: []SettingView{
			{"order", "3", "0 to 4", "order n of the polynomial", ""},
			{"delay", "14 ms", "0 to 200 ms", "assumed delay τ of the actuator", ""}},
			Kinds: []string{"none", "polynomial", "linear-acceleration", "taylor", "model-inverse", "inverse",
				"adaptive-inverse", "least-squares-polynomial", "delay-seeking", "adaptive-time-series"}},
		Verdict: VerdictView{Lane: "configured", Pass: true, Outcome: rtloop.Completed, Took: 31 * time.Millisecond,
			Rows: []VerdictRow{
				{"tracking error, rms", "7.31 %", "2.62 %", "≤ 5 %", true},
				{"delay", "14.012 ms late", "0.412 ms late", "≤ 1 ms", true},
				{"tracking error, peak", "4.812 mm", "1.907 mm", "≤ 3 mm", true},
				{"energy margin, least", "-12.4 %", "41.2 %", "≥ 30 %", true},
				{"response error, rms", "21.3 %", "4.31 %", "≤ 10 %", true}}},
		Curve: CurveView{Setting: "delay", Figure: "tracking error, rms", XDim: quantity.Time,
			Now: 0.014, Best: 0.0136, Limit: 0.05, SmallerWins: true},
		Events: []Event{{0, "started", false}, {5.1, "configured: delay 12 ms → 14 ms, from tick 10444", false}},
	}
	for x := 0.0; x <= 0.0301; x += 0.001 {
		y := math.Hypot(0.02, (x-0.0136)*8)
		s.Curve.X, s.Curve.Y = append(s.Curve.X, x), append(s.Curve.Y, y)
		s.Curve.Pass = append(s.Curve.Pass, y < 0.05)
	}
	motion(s, 12.345, 0.000412, 0.981)
	return s
}

func sampleTripped() *Snapshot {
	s := sampleRunningWell()
	s.Trace, s.Subspace = Trace{ErrorLimit: 0.025}, SubspaceView{}
	s.Energy.Time, s.Energy.History = nil, nil
	motion(s, 12.345, 0.11, 1.12)
	s.Lanes[0].Outcome = rtloop.Tripped
	s.Lanes[0].Trip = &rtloop.Trip{Limit: "error", Channel: "damper", Value: 0.02531, Allowed: 0.025, Time: 12.345}
	s.Lanes[0].Rank, s.Lanes[1].Rank = 2, 1
	s.Energy.Margin, s.Energy.MarginMin, s.Energy.AddedDamping = -0.412, -1.3, -0.0412
	s.Verdict.Pass, s.Verdict.Outcome = false, rtloop.Tripped
	s.Verdict.Ending = "TRIPPED at 12.345 s of 30 s, channel damper: error 25.31 mm, allowed 25 mm"
	for i := range s.Verdict.Rows {
		s.Verdict.Rows[i].Was, s.Verdict.Rows[i].Is = s.Verdict.Rows[i].Is, s.Verdict.Rows[i].Was
		s.Verdict.Rows[i].Pass = false
	}
	s.Events = append(s.Events, Event{12.345, "configured TRIPPED, damper: error 25.31 mm, allowed 25 mm", true})
	s.Message = "a limit was passed: r restarts"
	return s
}

func sampleDiverged() *Snapshot {
	s := sampleTripped()
	s.Lanes[0].Outcome = rtloop.Diverged
	s.Lanes[0].Trip = &rtloop.Trip{Limit: "displacement", Value: rtloop.Figure(none), Time: 12.345}
	s.Trace.ErrorLimit = math.Inf(1)
	n := len(s.Trace.Time)
	for i := n - 40; i < n; i++ {
		f := math.Exp(float64(i-n+40) * 20)
		s.Trace.Measured[i] *= f
		s.Trace.Command[i] *= f
		s.Trace.Lag[i] = s.Trace.Target[i] - s.Trace.Measured[i]
	}
	s.Lanes[0].NRMSE, s.Lanes[0].Margin, s.Lanes[0].Response = 1e7, -1e9, 3e120
	s.Energy.Margin, s.Energy.MarginMin, s.Energy.AddedDamping = -1e9, -1e12, -4e3
	s.Subspace.Ellipse.Major, s.Subspace.Ellipse.Tilt = math.Inf(1), none
	s.Subspace.Delay = none
	s.Verdict.Ending = "DIVERGED at 12.345 s of 30 s, displacement is no number any more"
	s.Verdict.Outcome = rtloop.Diverged
	s.Clock.Ended = true
	return s
}

func sampleRecorded() *Snapshot {
	s := sampleRunningWell()
	s.Scenario, s.Title, s.Lanes, s.Trace.ErrorLimit = "yesterday.csv", "recorded test", nil, math.Inf(1)
	s.Energy.Limit, s.Energy.AddedDamping = none, none
	s.Record = &RecordView{Since: 8.25, NRMSE: 0.0312, PeakError: 0.00143, PeakTarget: 0.0312, Time: s.Energy.Time, Without: "command"}
	for _, t := range s.Energy.Time {
		s.Record.Delay = append(s.Record.Delay, 0.004+0.003*math.Sin(t/2))
	}
	s.Message = "late by 7.1 ms"
	return s
}

func sampleAtRest() *Snapshot {
	s := sampleRunningWell()
	s.Subspace.Resting = true
	s.Lanes[0].Delay, s.Lanes[1].Delay = none, none
	return s
}

func samplePaused() *Snapshot {
	s := sampleRunningWell()
	s.Clock.Paused, s.Clock.Speed, s.Clock.Slowdown = true, 0.25, 4
	s.Message = "paused: . is a single tick"
	s.Verdict.Working = true
	s.Curve.Working, s.Curve.X, s.Curve.Y, s.Curve.Pass = true, nil, nil, nil
	s.Trace.Dropped = 312
	return s
}

func sampleEditing() *Snapshot {
	s := sampleRunningWell()
	s.Editor.Editing, s.Editor.Text = true, "12.5 m"
	return s
}

func sampleRefused() *Snapshot {
	s := sampleAdaptive()
	s.Editor.Editing, s.Editor.Text = true, "0.4 kN"
	s.Editor.Problem = `"0.4 kN" is a force, delay is a time: write it as "14 ms"`
	return s
}

// sampleAdaptive is a method with more settings than some screens have rows, some of
// which it adapts.
func sampleAdaptive() *Snapshot {
	s := sampleRunningWell()
	s.Lanes[0].Method = "adaptive-time-series"
	s.Editor.Method = "adaptive-time-series"
	s.Editor.Cursor = 0
	s.Editor.Settings = []SettingView{
		{"delay", "14 ms", "0 to 200 ms", "actuator delay assumed at the start", "13.62 ms"},
		{"gain", "1", "0.5 to 2", "actuator gain g assumed at the start", "0.9913"},
		{"window", "1 s", "50 ms to 10 s", "length of the moving window of the fit", ""},
		{"cutoff", "20 Hz", "1 to 500 Hz", "cutoff of the low-pass on command and measured", ""},
		{"threshold", "1 mm", "0.001 mm to 1 m", "rms of measured over the window below which nothing is learned", ""},
		{"amplitude_min", "0.7", "0.1 to 10", "smallest coefficient a₀", ""},
		{"amplitude_max", "1.4", "0.1 to 10", "largest coefficient a₀", ""},
		{"delay_min", "0 s", "0 to 200 ms", "smallest delay that may be adapted to", ""},
		{"delay_max", "60 ms", "0 to 200 ms", "largest delay that may be adapted to", ""},
		{"amplitude_rate", "0.5 Hz", "0 to 1000 Hz", "fastest change of a₀, in units a second", ""},
		{"delay_rate", "0.1", "0 to 1000", "fastest change of the delay, in seconds a second", ""},
	}
	return s
}

func sampleDrivenTarget() *Snapshot {
	s := sampleRunningWell()
	s.Scenario, s.Title = "tracking", "actuator alone, sweep from 0.1 Hz to 20 Hz (invented)"
	s.Energy = EnergyView{Missing: noEnergy, Margin: none, MarginMin: none, AddedDamping: none, Limit: none}
	for i := range s.Lanes {
		s.Lanes[i].Margin, s.Lanes[i].Response = none, none
	}
	s.Verdict.Rows = s.Verdict.Rows[:3]
	s.Trace.ErrorLimit = math.Inf(1)
	return s
}

func sampleManyLanes() *Snapshot {
	s := sampleAdaptive()
	s.Channels, s.Channel = []string{"first-storey damper", "second-storey damper", "roof"}, 1
	s.Lanes = nil
	for i, method := range s.Editor.Kinds {
		s.Lanes = append(s.Lanes, LaneView{Name: method + "-14", Method: method, NRMSE: 0.02 * float64(i+1),
			Delay: 0.001 * float64(3-i), Margin: 0.8 - 0.1*float64(i), Response: 0.03 * float64(i+1), Rank: 1 + (i+7)%10})
	}
	s.Lanes[4].Outcome = rtloop.Tripped
	s.Lanes[4].Trip = &rtloop.Trip{Limit: "velocity", Channel: "roof", Value: 1.2, Allowed: 1, Time: 7.012}
	s.Lane = 9
	s.Editor.Cursor = 10
	s.Curve.Setting, s.Curve.XDim, s.Curve.Figure, s.Curve.YDim, s.Curve.Limit = "delay_rate", quantity.None, "delay", quantity.Time, 0.001
	return s
}

// sampleAtStart is the first frame, before any tick.
func sampleAtStart() *Snapshot {
	s := sampleRunningWell()
	s.Clock.Time = 0
	s.Trace, s.Subspace = Trace{ErrorLimit: 0.025}, SubspaceView{Delay: none, Ellipse: gauge.Ellipse{Tilt: none, AmplitudeRatio: none, Phase: none, Delay: none}}
	s.Energy = EnergyView{Structure: true, Margin: none, MarginMin: none, AddedDamping: none, Limit: 0.3}
	s.Pace = PaceView{Period: 488281}
	s.Verdict = VerdictView{Working: true}
	s.Curve = CurveView{Working: true, Setting: "delay", Figure: "tracking error, rms", Now: 0.014, Best: none, Limit: 0.05}
	s.Events = nil
	for i := range s.Lanes {
		l := &s.Lanes[i]
		l.NRMSE, l.Delay, l.Margin, l.Response = none, none, none, none
	}
	return s
}

// sampleNothing is a snapshot in which no number is one.
func sampleNothing() *Snapshot {
	s := sampleAtStart()
	s.Clock = Clock{none, none, none, none, none, false, true}
	bad := []float64{none, math.Inf(1), none, math.Inf(-1), none}
	s.Trace = Trace{Time: bad, Target: bad, Command: bad, Measured: bad, Lag: bad, ErrorLimit: none}
	s.Subspace.X, s.Subspace.Y = bad, bad
	s.Subspace.Ellipse = gauge.Ellipse{CenterX: none, CenterY: none, Major: none, Minor: none, Tilt: none, AmplitudeRatio: none, Phase: none, Delay: none}
	s.Energy.Time, s.Energy.History, s.Energy.Limit = bad, bad, none
	s.Curve = CurveView{X: bad, Y: bad, Pass: make([]bool, 5), Now: none, Best: none, Limit: none}
	s.Pace = PaceView{Ticks: 1}
	return s
}

// sampleAsking is a question in the bottom line.
func sampleAsking() *Snapshot {
	s := sampleRunningWell()
	s.Prompt = &Prompt{"write the settings to the file", "archive-tuned.toml"}
	return s
}
