// Package tui is the dashboard: a loop running at its real rate in real time,
// what it does as it happens, and the verdict of the whole scenario after every
// change. State, update and drawing are apart: the engine runs the loop in a
// thread of its own and is never waited for; the state is changed by keys and by
// what the engine reports; a Snapshot is what one frame shows; each panel draws
// a snapshot into a rectangle and knows nothing else.
package tui

import (
	"time"

	"antelag/rtloop"
	"antelag/rtloop/gauge"
	"antelag/scenarios/quantity"
)

// Snapshot is all that one frame shows. Panels read it and change nothing.
type Snapshot struct {
	Scenario string // file or name
	Title    string
	Clock    Clock
	Lanes    []LaneView // in the order of the scenario
	Lane     int        // the selected one
	Channels []string
	Channel  int // the selected one
	Trace    Trace
	Subspace SubspaceView
	Energy   EnergyView
	Pace     PaceView
	Editor   EditorView
	Verdict  VerdictView
	Curve    CurveView
	Events   []Event     // oldest first
	Message  string      // of the last key, for the bottom line: what happened, or why not
	Prompt   *Prompt     // a question that takes the keys, nil if none
	Record   *RecordView // of a log that is played; nil for a loop
}

// Clock says where the run stands.
type Clock struct {
	Time, Duration float64 // model seconds
	Rate           float64 // ticks a physical second, as the scenario says
	Slowdown       float64
	Speed          float64 // ticks released a second over Rate; 1 is the real rate
	Paused         bool
	Ended          bool // the motion is over, or no lane runs any more
}

// LaneView is one lane as it stands.
type LaneView struct {
	Name     string
	Method   string // compensator of the selected channel
	Outcome  rtloop.Outcome
	Trip     *rtloop.Trip
	NRMSE    float64 // so far; NaN where undefined, as all figures here
	Delay    float64 // of the synchronization subspace now, s, positive late
	Margin   float64 // energy margin now
	Response float64 // response error so far
	Rank     int     // 1 is best
}

// Trace is the last seconds of the selected channel of the selected lane; the
// slices are parallel, oldest first, and may be empty.
type Trace struct {
	Time                           []float64 // model s
	Target, Command, Measured, Lag []float64 // m; Lag is target − measured
	Dropped                        int64     // samples that the screen did not get; ticks are never dropped
	ErrorLimit                     float64   // trip limit on the error, m; +Inf if none
}

// SubspaceView is the synchronization subspace of the selected channel.
type SubspaceView struct {
	X, Y    []float64 // trail: target and measured, m, oldest first
	Ellipse gauge.Ellipse
	Delay   float64 // s, positive late; NaN where undefined
	Resting bool    // the motion is too small to say anything
}

// EnergyView is the energy of the selected lane, all channels together.
type EnergyView struct {
	Structure    bool      // false where there is no energy to judge
	Missing      string    // why there is none
	Margin       float64   // now
	MarginMin    float64   // so far
	AddedDamping float64   // now, of critical
	Time         []float64 // model s
	History      []float64 // margin at Time, NaN where undefined
	Limit        float64   // acceptance limit, NaN if none
}

// PaceView is how punctually ticks are released.
type PaceView struct {
	Ticks, Late, Overruns, Shifts int64
	P50, P99, P999, Max           time.Duration
	Period                        time.Duration
	Granted                       []string // what the system granted and, with a reason behind a colon, refused
}

// EditorView is the settings of the selected lane and channel.
type EditorView struct {
	Method   string
	Settings []SettingView
	Cursor   int // −1 is the compensator's kind
	Editing  bool
	Text     string // typed so far while editing
	Problem  string // why the typed text was refused
	Kinds    []string
}

// SettingView is one setting as the editor shows it.
type SettingView struct {
	Name, Value, Range, Doc string
	Adapts                  string // what an adaptive method has made of it, "" if nothing
}

// VerdictView is the verdict of the whole scenario with the settings as they
// are, and as they were before the last edit.
type VerdictView struct {
	Working bool // a new one is being computed
	Lane    string
	Pass    bool
	Outcome rtloop.Outcome
	Ending  string // how it ended, in words, where it did not complete
	Rows    []VerdictRow
	Took    time.Duration
}

// VerdictRow is one acceptance limit.
type VerdictRow struct {
	Label   string
	Was     string // before the last edit, "" if there was none
	Is      string
	Allowed string
	Pass    bool
}

// CurveView is a verdict figure against the setting under the cursor.
type CurveView struct {
	Working     bool
	Setting     string
	Figure      string // what stands upwards
	X, Y        []float64
	Pass        []bool
	XDim, YDim  quantity.Dim
	Now, Best   float64 // setting now, and where the curve is best; NaN if unknown
	Limit       float64 // acceptance limit of the figure, NaN if none
	SmallerWins bool    // the figure is better when smaller
}

// Event is something that happened, for the log of the session.
type Event struct {
	Time float64 // model s
	Text string
	Bad  bool
}

// Prompt is a question in the bottom line.
type Prompt struct {
	Question, Text string
}

// RecordView is what a log that is played says so far.
type RecordView struct {
	Seeking               bool
	Since                 float64 // s, from when on the figures are; NaN: nothing yet
	NRMSE                 float64
	PeakError, PeakTarget float64   // m
	Time, Delay           []float64 // delay of the synchronization subspace over time, s
	Without               string    // what the log does not have
}
