package tui

import (
	"cmp"
	"math"
	"slices"
	"time"

	"antelag/compensator"
	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// snapshot is what a frame shows now. Its slices are the session's own: it
// holds until the session hears or does something else.
func (s *session) snapshot() *Snapshot {
	st := &s.seen.status
	slow := s.now.Loop.Num("slowdown")
	out := &Snapshot{
		Scenario: s.now.Name, Title: s.now.Title,
		Clock: Clock{
			Time: st.time, Duration: s.now.Loop.Num("duration"), Rate: s.now.Loop.Num("rate"),
			Slowdown: slow, Speed: s.speed, Paused: s.paused, Ended: st.ended,
		},
		Lanes: s.laneViews(), Lane: s.lane,
		Channels: s.now.ChannelNames(), Channel: s.channel,
		Trace: s.trace(), Subspace: s.subspace(), Energy: s.energy(), Pace: s.paceView(),
		Editor: s.editor(), Verdict: s.verdict(), Curve: s.curveView(),
		Events: s.events, Message: s.message, Prompt: s.prompt,
	}
	if s.copying != nil {
		out.Message = s.message + " …"
	}
	return out
}

func (s *session) laneViews() []LaneView {
	st := &s.seen.status
	out := make([]LaneView, len(s.now.Lanes)+1)
	for i := range out {
		part := partOf(s.now, i, s.channel).in(s.now)
		v := &out[i]
		*v = LaneView{Name: s.laneName(i), Method: part.Kind.Name, NRMSE: math.NaN(), Delay: math.NaN(), Margin: math.NaN(), Response: math.NaN()}
		if i < len(st.lanes) {
			l := &st.lanes[i]
			v.Outcome, v.Trip, v.NRMSE, v.Delay, v.Margin, v.Response = l.outcome, l.trip, l.nrmse, l.delay, l.margin, l.response
		}
	}
	rank(out)
	return out
}

// rank puts those that run before those that stopped, of the latter those that
// ran longer first; then the smaller error of the response, or, where there is
// none, of the tracking.
func rank(lanes []LaneView) {
	order := make([]*LaneView, len(lanes))
	for i := range lanes {
		order[i] = &lanes[i]
	}
	slices.SortStableFunc(order, func(a, b *LaneView) int {
		return cmp.Or(-cmp.Compare(lasted(a), lasted(b)), compareFloat(laneError(a), laneError(b)))
	})
	for i, l := range order {
		l.Rank = i + 1
	}
}

func lasted(l *LaneView) float64 {
	if l.Trip != nil {
		return l.Trip.Time
	}
	return math.Inf(1)
}

func laneError(l *LaneView) float64 {
	for _, f := range []float64{l.Response, l.NRMSE} {
		if !math.IsNaN(f) {
			return f
		}
	}
	return math.Inf(1)
}

func (s *session) trace() Trace {
	t, n := &s.seen.trail, s.seen.trail.keep
	limit := math.Inf(1)
	if l := s.now.Channels[s.channel].Limits; l.Has("error") {
		limit = l.Num("error")
	}
	return Trace{
		Time: newest(t.time, n), Target: newest(t.target, n), Command: newest(t.command, n),
		Measured: newest(t.measured, n), Lag: newest(t.lag, n), Dropped: s.seen.dropped, ErrorLimit: limit,
	}
}

// subspace is the trail over the window of the ellipse, as far as it is kept.
func (s *session) subspace() SubspaceView {
	t, e := &s.seen.trail, s.seen.status.ellipse
	n := t.keep
	if len(t.time) > 1 {
		if dt := t.time[len(t.time)-1] - t.time[len(t.time)-2]; dt > 0 {
			n = min(n, int(s.seen.window/dt)+1)
		}
	}
	return SubspaceView{
		X: newest(t.target, n), Y: newest(t.measured, n), Ellipse: e,
		Delay: s.delayOf(e), Resting: s.seen.status.resting,
	}
}

// noEnergy is said where the energy margin would stand.
const noEnergy = "The target is driven: there is no structure whose energy could be judged."

func (s *session) energy() EnergyView {
	nan := math.NaN()
	v := EnergyView{
		Structure: s.now.Substructure != nil, Missing: noEnergy, Margin: nan, MarginMin: nan, AddedDamping: nan,
		Limit: limitOf(s.now, "energy_margin"),
	}
	if s.lane < len(s.seen.status.lanes) {
		l := &s.seen.status.lanes[s.lane]
		v.Margin, v.MarginMin, v.AddedDamping = l.margin, l.marginMin, l.added
	}
	if s.lane < len(s.seen.energy) {
		h := &s.seen.energy[s.lane]
		v.Time, v.History = newest(h.time, margins), newest(h.margin, margins)
	}
	return v
}

func (s *session) paceView() PaceView {
	r := &s.seen.pace
	return PaceView{
		Ticks: r.Ticks, Late: r.Late, Overruns: r.Overruns, Shifts: r.Shifts,
		P50: r.P50, P99: r.P99, P999: r.P999, Max: r.Max,
		Period: time.Duration(math.Round(r.Period * 1e9)), Granted: r.Granted,
	}
}

func (s *session) editor() EditorView {
	in := s.part().in(s.now)
	v := EditorView{
		Method: in.Kind.Name, Cursor: s.cursor, Editing: s.editing, Text: s.typing, Problem: s.problem,
		Kinds: compensator.Kinds.Names(),
	}
	for i := range in.Kind.Settings {
		k := &in.Kind.Settings[i]
		view := SettingView{Name: k.Name, Value: "–", Range: k.Allowed(), Doc: k.Doc}
		if value, given := in.Values[k.Name]; given {
			view.Value = k.FormatValue(value)
			view.Adapts = s.adapted(k, value)
		}
		v.Settings = append(v.Settings, view)
	}
	return v
}

// adapted is what the running method has made of a setting, "" where that is
// what was set.
func (s *session) adapted(k *kind.Setting, set kind.Value) string {
	const same = 1e-4 // relative: what would be written alike
	for i := range s.seen.status.coefficients {
		c := &s.seen.status.coefficients[i]
		if c.Name == k.Name && math.Abs(c.Value-set.Num) > same*math.Abs(set.Num) {
			return quantity.Format(c.Value, c.Dim)
		}
	}
	return ""
}

func (s *session) verdict() VerdictView {
	lane := s.laneName(s.lane)
	out := VerdictView{Lane: lane, Working: true}
	v := s.verdicts[lane]
	if v == nil {
		return out
	}
	out.Working, out.Took = v.of != s.now, v.took
	if v.err != nil {
		out.Working, out.Ending = false, v.err.Error()
		return out
	}
	if v.is == nil {
		return out
	}
	out.Pass, out.Outcome = v.is.Pass, v.is.Outcome
	if v.is.Outcome != rtloop.Completed {
		out.Ending = v.is.Ending(s.now.Loop.Num("duration"))
	}
	for i := range v.is.Accept {
		j := &v.is.Accept[i]
		row := VerdictRow{Label: j.Label(), Is: j.Found(), Allowed: j.Allowed(), Pass: j.Pass}
		if v.was != nil && i < len(v.was.Accept) {
			row.Was = v.was.Accept[i].Found()
		}
		out.Rows = append(out.Rows, row)
	}
	return out
}

func (s *session) curveView() CurveView {
	nan := math.NaN()
	out := CurveView{
		Figure: accept.Label(s.figure), Now: nan, Best: nan,
		Limit: limitOf(s.now, s.figure), SmallerWins: s.figure != "energy_margin",
	}
	if k := s.setting(); k != nil {
		out.Setting, out.XDim = k.Name, k.Dim
	}
	c := s.curve
	if c == nil {
		return out
	}
	out.Working, out.Now = c.working, c.vary.now
	have := map[float64]accepted{}
	for i := range c.points {
		p := &c.points[i]
		y, dim := p.lane.Figure(s.figure)
		if s.figure != "energy_margin" {
			y = math.Abs(y)
		}
		if !completed(&p.lane) {
			y = nan
		}
		out.X, out.Y, out.Pass, out.YDim = append(out.X, p.x), append(out.Y, y), append(out.Pass, p.lane.Pass), dim
		have[p.x] = accepted{p.lane.Pass, score(p, s.figure)}
	}
	if len(out.X) > 0 {
		if best := out.X[bestOf(out.X, have)]; !math.IsInf(have[best].score, 1) {
			out.Best = best
		}
	}
	return out
}
