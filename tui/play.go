package tui

import (
	"math"
	"strings"
	"time"

	"antelag/rtloop/gauge"
	"antelag/rtloop/runlog"
)

// player plays a log: as its clock goes on it takes samples in, and keeps what
// the screen shows. It reads the log as it goes, so that it needs no more memory
// for a day than for a minute; to seek back it opens the log anew.
type player struct {
	path string
	opts PlayOptions

	reader *runlog.Reader
	names  []string // channels
	has    []runlog.Channel
	step   float64 // s from one sample to the next
	block  *runlog.Block
	at     int   // next sample of the block
	next   int64 // its number in the log
	goal   int64 // the number up to which the play has come, or seeks
	from   int64 // samples before this are passed over
	part   float64

	speed         float64
	paused, ended bool
	channel       int

	window   int // samples that the ellipse covers
	tracking *gauge.Tracking
	judged   int64   // samples that the gauges have taken since the last seek
	peak     float64 // largest |target| of the channel that was ever seen, m
	trail    trail
	margin   history
	delay    history
	sampled  int64 // samples until the next entry of the histories
	overview *overview
	events   []Event
	message  string
}

// How a log is played. The window of the ellipse is a choice of ours: two
// seconds hold a few periods of most structures.
const (
	playWindow    = 2.0 // s
	historyEvery  = 0.1 // s
	FastestPlay   = 64
	SlowestPlay   = 1.0 / 64
	seekBudget    = 40 * time.Millisecond // of a frame, to read on
	checkSamples  = 1024
	rulerSamples  = 2 // the fewest that a gauge can take
	longestWindow = 1 << 20
)

func newPlayer(path string, o PlayOptions) (*player, error) {
	p := &player{path: path, opts: o, speed: o.Speed}
	if err := p.open(); err != nil {
		return nil, err
	}
	p.step = p.reader.Step()
	for _, c := range p.reader.Channels() {
		p.names, p.has = append(p.names, c.Name), append(p.has, c)
	}
	p.window = min(max(rulerSamples, int(math.Ceil(playWindow/p.step))), longestWindow)
	p.trail.keep = min(max(16, int(math.Ceil(trailSeconds/p.step))), longestWindow)
	p.forget(0)
	return p, nil
}

func (p *player) open() error {
	r, err := runlog.Open(p.path, p.opts.Log)
	if err != nil {
		return err
	}
	p.reader, p.block, p.at, p.next = r, nil, 0, 0
	return nil
}

func (p *player) close() { _ = p.reader.Close() }

// forget begins to judge anew, from sample number from on.
func (p *player) forget(from int64) {
	p.from, p.judged, p.sampled = from, 0, 0
	p.tracking = gauge.NewTracking(p.window)
	p.trail = trail{view: p.trail.view + 1, keep: p.trail.keep}
	p.margin, p.delay = history{}, history{}
}

// seek goes to instant t, s. What is to be seen there needs the samples of the
// window before it.
func (p *player) seek(t float64) error {
	target := max(0, int64(math.Round((t-p.start())/p.step)))
	p.ended = false
	p.part = 0
	from := max(0, target-int64(max(p.window, p.trail.keep)))
	if from < p.next {
		p.close()
		if err := p.open(); err != nil {
			return err
		}
	}
	p.goal = target
	p.forget(from)
	return nil
}

// look selects another channel, and judges it over the same stretch.
func (p *player) look(channel int) error {
	p.channel, p.peak = (channel+len(p.names))%len(p.names), 0
	return p.seek(p.now())
}

func (p *player) start() float64 {
	if p.next == 0 {
		return 0
	}
	return p.reader.Start()
}

// tick is the physical time from one sample to the next, s.
func (p *player) tick() float64 { return p.step * p.opts.Slowdown }

// now is the instant that has been reached, or is sought, s.
func (p *player) now() float64 { return p.start() + float64(p.goal)*p.step }

// seeking reports whether the play has yet to reach where it should be.
func (p *player) seeking() bool {
	return !p.ended && p.next <= p.goal && p.goal-p.next > checkSamples*4
}

// advance lets so much time of the clock pass, and reports whether anything
// changed.
func (p *player) advance(passed time.Duration) (bool, error) {
	if !p.paused && !p.ended && !p.seeking() {
		p.part += passed.Seconds() * p.speed / p.tick()
		whole := math.Floor(p.part)
		p.part -= whole
		p.goal += int64(whole)
	}
	return p.take(seekBudget)
}

// take takes in samples up to the goal, for no longer than the budget.
func (p *player) take(budget time.Duration) (changed bool, err error) {
	began := time.Now()
	for n := 0; p.next <= p.goal && !p.ended; n++ {
		if n%checkSamples == checkSamples-1 && time.Since(began) > budget {
			return true, nil
		}
		if p.block == nil || p.at == p.block.N {
			if !p.reader.Next() {
				return true, p.end()
			}
			p.block, p.at = p.reader.Block(), 0
			if last := p.block.First + int64(p.block.N); last <= p.from {
				p.next, p.at = last, p.block.N
				continue
			}
		}
		if p.next >= p.from {
			p.sample()
		}
		p.at++
		p.next++
		changed = true
	}
	return changed, nil
}

// end is the end of the log.
func (p *player) end() error {
	if err := p.reader.Err(); err != nil {
		return err
	}
	p.ended = true
	p.goal = max(0, p.next-1)
	for _, n := range p.reader.Notes() {
		p.say(false, n)
	}
	return nil
}

// sample takes one sample of the selected channel in.
func (p *player) sample() {
	s := &p.block.Channels[p.channel]
	value := func(r runlog.Role) float64 {
		if v := s[r]; v != nil {
			return v[p.at]
		}
		return math.NaN()
	}
	t := p.reader.Start() + float64(p.next)*p.step
	x, y := value(runlog.Target), value(runlog.Measured)
	p.trail.add(&sample{p.trail.view, t, x, value(runlog.Command), y})
	if defined(x) && defined(y) {
		p.peak = math.Max(p.peak, math.Abs(x))
		if p.judged == 0 {
			p.tracking.Start(x, y)
		} else {
			p.tracking.Add(x, y)
		}
		p.judged++
	}
	if p.sampled--; p.sampled > 0 || p.judged == 0 {
		return
	}
	p.sampled = max(1, int64(historyEvery/p.step))
	p.delay.add(t, p.delayNow())
	if p.block.Margin != nil {
		p.margin.add(t, p.block.Margin[p.at])
	}
}

// delayNow is the delay of the ellipse, s, NaN while it says nothing.
func (p *player) delayNow() float64 {
	if p.judged < rulerSamples || p.tracking.AtRestFor(p.peak) {
		return math.NaN()
	}
	return p.tracking.Subspace().Delay * p.tick()
}

func (p *player) setSpeed(factor float64) {
	speed := p.speed * factor
	if factor == 0 {
		speed = 1
	}
	if speed > FastestPlay || speed < SlowestPlay {
		p.message = map[bool]string{true: "no faster than this", false: "no slower than this"}[factor > 1]
		return
	}
	p.speed = speed
	p.message = speedWords(speed)
}

func (p *player) say(bad bool, text string) {
	p.events = append(p.events, Event{Time: p.now(), Text: text, Bad: bad})
}

// overview is what the whole log says, once it has been read.
type overview struct {
	end   float64 // s
	worst []Moment
}

// nextWorst goes to the next of the moments where it was worst.
func (p *player) nextWorst() error {
	if p.overview == nil || len(p.overview.worst) == 0 {
		p.message = "the whole log has not been judged yet"
		return nil
	}
	to := p.overview.worst[0]
	for _, m := range p.overview.worst {
		if m.Time > p.now()+p.step/2 {
			to = m
			break
		}
	}
	p.message = to.Text
	return p.seek(to.Time)
}

// snapshot is what one frame shows.
func (p *player) snapshot() *Snapshot {
	nan := math.NaN()
	s := &Snapshot{
		Scenario: p.path, Title: "recorded test", Channels: p.names, Channel: p.channel,
		Clock: Clock{Time: p.now(), Duration: nan, Rate: 1 / p.tick(), Slowdown: p.opts.Slowdown, Speed: p.speed, Paused: p.paused, Ended: p.ended},
		Trace: Trace{Time: newest(p.trail.time, p.trail.keep), Target: newest(p.trail.target, p.trail.keep),
			Command: newest(p.trail.command, p.trail.keep), Measured: newest(p.trail.measured, p.trail.keep),
			Lag: newest(p.trail.lag, p.trail.keep), ErrorLimit: math.Inf(1)},
		Energy: EnergyView{Structure: len(p.margin.time) > 0, Missing: "the log has no energy margin", Margin: last(p.margin.margin),
			MarginMin: least(p.margin.margin), AddedDamping: nan, Limit: nan, Time: p.margin.time, History: p.margin.margin},
		Events: p.events, Message: p.message,
		Record: &RecordView{Seeking: p.seeking(), Since: nan, NRMSE: nan, PeakError: nan, PeakTarget: nan,
			Time: p.delay.time, Delay: p.delay.margin},
	}
	n := min(p.window, p.trail.keep)
	s.Subspace = SubspaceView{X: newest(p.trail.target, n), Y: newest(p.trail.measured, n), Delay: nan, Resting: true}
	if p.judged >= rulerSamples {
		s.Subspace.Ellipse, s.Subspace.Delay, s.Subspace.Resting = p.tracking.Subspace(), p.delayNow(), p.tracking.AtRestFor(p.peak)
		r := s.Record
		r.Since = p.reader.Start() + float64(p.from)*p.step
		r.NRMSE, r.PeakError, r.PeakTarget = p.tracking.NRMSE(), p.tracking.PeakError(), p.tracking.PeakTarget()
	}
	if p.overview != nil {
		s.Clock.Duration = p.overview.end
	}
	s.Record.Without = p.without()
	return s
}

// without names what the log does not have of the channel.
func (p *player) without() string {
	var out []string
	for _, r := range []runlog.Role{runlog.Command, runlog.Force} {
		if !p.has[p.channel].Has[r] {
			out = append(out, r.String())
		}
	}
	return strings.Join(out, ", ")
}

// least is the smallest of the values that are defined, NaN if none is.
func least(values []float64) float64 {
	low := math.NaN()
	for _, v := range values {
		if defined(v) && !(low <= v) {
			low = v
		}
	}
	return low
}
