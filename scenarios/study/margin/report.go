package margin

import (
	"math"
	"math/cmplx"

	"antelag/rtloop"
	"antelag/rtloop/stability"
)

var undefined = rtloop.Figure(math.NaN())

// Report is how far a loop is from growing by itself. SI; null for what has no value.
type Report struct {
	Scenario       string        `json:"scenario"`
	Lane           string        `json:"lane"`
	AfterRun       bool          `json:"after_run"` // adaptive compensators as they were after the run
	SpectralRadius rtloop.Figure `json:"spectral_radius"`
	Stable         bool          `json:"stable"`
	Mode           Mode          `json:"mode"`  // the least damped
	Modes          []Mode        `json:"modes"` // of the structure, the least damped first
	Channels       []Channel     `json:"channels"`
	Together       Margins       `json:"together"` // all channels changed alike
	// Limiting is the channel that can bear the least extra delay; "" where none
	// has a limit.
	Limiting    string   `json:"limiting_channel"`
	States      int      `json:"states"`      // values that the loop carries from tick to tick; 0 where they were not counted
	Eigenvalues bool     `json:"eigenvalues"` // the spectral radius is that of the whole state matrix
	Notes       []string `json:"notes"`       // what was taken for linear that is not
}

// Mode is one way in which the loop moves by itself.
type Mode struct {
	Frequency rtloop.Figure   `json:"frequency_hz"` // model time
	Damping   rtloop.Figure   `json:"damping_ratio"`
	Shape     []rtloop.Figure `json:"shape"`     // size of each level's motion, the largest 1
	Phase     []rtloop.Figure `json:"phase_rad"` // of each level, the largest 0; positive leads
}

// Channel is one channel's margins, the others as they are.
type Channel struct {
	Name string `json:"name"`
	Margins
	// CriticalDelay is the actuator's delay with the margin added, s.
	CriticalDelay rtloop.Figure `json:"critical_delay_s"`
}

// Margins are the changes at which the spectral radius is 1.
type Margins struct {
	// DelayMargin is the least extra delay at which stability is lost, physical
	// seconds; of a loop that grows as it is, negative, by how much quicker the
	// actuator would have to be. Null: no such delay, up to the longest that an
	// actuator may have, or down to none.
	DelayMargin rtloop.Figure `json:"delay_margin_s"`
	// GainMargin is the least gain above 1 of the measured force at which stability
	// is lost; of a loop that grows as it is, the largest gain below 1 at which it
	// would not. Null: no such gain, up to LargestGain.
	GainMargin rtloop.Figure `json:"gain_margin"`
	// Delays and Gains are all the changes of stability that were found, the first
	// loss first: stability may come back further out.
	Delays []Change `json:"delay_changes"`
	Gains  []Change `json:"gain_changes"`
}

// Change is a place where stability is lost or regained.
type Change struct {
	At        rtloop.Figure `json:"at"`           // extra delay, s, or gain
	Frequency rtloop.Figure `json:"frequency_hz"` // at which the loop swings there, model time
	Stable    bool          `json:"stable"`       // whether it is stable beyond
}

// LargestGain is up to which gain of the measured force margins are looked for.
const LargestGain = 100

func newMode(m stability.Mode) Mode {
	out := Mode{Frequency: rtloop.Figure(m.Frequency), Damping: rtloop.Figure(m.Damping)}
	for _, x := range m.Shape {
		out.Shape = append(out.Shape, rtloop.Figure(cmplx.Abs(x)))
		out.Phase = append(out.Phase, rtloop.Figure(cmplx.Phase(x)))
	}
	return out
}

func size(poles []complex128) float64 {
	if len(poles) == 0 {
		return 0
	}
	return cmplx.Abs(poles[0])
}

// LeastDelay returns the least delay margin over the channels and all together, s:
// +Inf where there is no limit, and never above 0 for a loop that grows as it is.
func (r *Report) LeastDelay() float64 {
	least := math.Inf(1)
	if !r.Stable {
		least = 0
	}
	take := func(m *Margins) {
		if m.DelayMargin.Defined() {
			least = min(least, float64(m.DelayMargin))
		}
	}
	for i := range r.Channels {
		take(&r.Channels[i].Margins)
	}
	take(&r.Together)
	return least
}

// limiting names the channel with the least delay margin.
func (r *Report) limiting() string {
	name, least := "", math.Inf(1)
	for i := range r.Channels {
		if m := r.Channels[i].DelayMargin; m.Defined() && float64(m) < least {
			name, least = r.Channels[i].Name, float64(m)
		}
	}
	return name
}
