package replay

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	"antelag/rtloop"
	"antelag/rtloop/runlog"
	"antelag/scenarios"
	"antelag/scenarios/accept"
)

// silence is what a ranking with the loop open leaves unsaid.
const silence = "the loop was open: the recorded target was played to the actuator and no force acted back on it, so nothing is said about stability"

// played is a recorded target as the motion of a rig.
type played struct {
	reader  *runlog.Reader
	channel int
	at      int // in the block
	last    float64
	told    func(bytes int64)
}

// Fill gives the next samples; behind the end the last one stands.
func (s *played) Fill(dst []float64) {
	for i := range dst {
		b := s.reader.Block()
		if s.at >= b.N {
			if s.reader.Next() {
				s.at = 0
				s.told(s.reader.Offset())
			} else {
				b.N = 0
			}
		}
		if s.at < b.N {
			s.last = b.Channels[s.channel][runlog.Target][s.at]
			s.at++
		}
		dst[i] = s.last
	}
}

// match finds the scenario's channel that a channel of the log is: the one of the
// same name, or the only one where the log names none.
func match(s *scenarios.Scenario, c runlog.Channel) (string, error) {
	names := s.ChannelNames()
	switch {
	case slices.Contains(names, c.Name):
		return c.Name, nil
	case c.Name == runlog.Unnamed && len(names) == 1:
		return names[0], nil
	case c.Name == runlog.Unnamed:
		return "", fmt.Errorf("%s has the channels %s; say which of them the log holds, like --map %s.target=…", s.Name, strings.Join(names, ", "), names[0])
	}
	return "", fmt.Errorf("%s has no channel %q as the log has; its channels are %s", s.Name, c.Name, strings.Join(names, ", "))
}

// checkAgainst finds out beforehand whether the scenario can be driven.
func (p *Replay) checkAgainst(s *scenarios.Scenario) error {
	for j, c := range p.reader.Channels() {
		name, err := match(s, c)
		if err != nil {
			return err
		}
		if _, err := s.OpenLoop(name, &played{reader: p.reader, channel: j}, p.tick, shortestTicks); err != nil {
			return fmt.Errorf("at the log's rate: %w", err)
		}
	}
	return nil
}

// against drives the scenario's actuators with the recorded targets. Each channel
// takes a pass through the log.
func (p *Replay) against(ctx context.Context, rep *Report, s *scenarios.Scenario, told func(pass, bytes int64)) error {
	a := &Against{Scenario: s.Name, OpenLoop: silence}
	if rate := s.Loop.Num("rate"); math.Abs(rate*p.tick-1) > 1e-6 {
		rep.Notes = append(rep.Notes, fmt.Sprintf("%s has %g ticks a second; it was driven at the log's rate, %.6g Hz", s.Name, rate, 1/p.tick))
	}
	for j, c := range p.reader.Channels() {
		name, err := match(s, c)
		if err != nil {
			return err
		}
		rig, err := p.drive(ctx, s, name, j, rep.Samples-1, func(bytes int64) { told(int64(j+1), bytes) })
		if err != nil {
			return err
		}
		out := AgainstChannel{Name: c.Name, Lanes: []accept.Lane{accept.JudgeTracking(recorded(&rep.Channels[j], rep.Time), s.Accept)}}
		out.Lanes[0].Ran = float64(rep.Time)
		for i, res := range rig.Results() {
			lane := accept.JudgeTracking(res, s.Accept)
			lane.Ran = rig.Lanes[i].Loop.Time()
			out.Lanes = append(out.Lanes, lane)
		}
		a.Channels = append(a.Channels, out)
		rep.Interrupted = rep.Interrupted || ctx.Err() != nil
	}
	rep.Against = a
	return nil
}

func (p *Replay) drive(ctx context.Context, s *scenarios.Scenario, name string, j int, ticks int64, told func(int64)) (*rtloop.Rig, error) {
	r, err := runlog.Open(p.path, p.options.Log)
	if err != nil {
		return nil, err
	}
	defer r.Close()
	rig, err := s.OpenLoop(name, &played{reader: r, channel: j, told: told}, p.tick, ticks)
	if err != nil {
		return nil, err
	}
	if err := rig.Run(ctx, nil); err != nil {
		return nil, err
	}
	return rig, r.Err()
}

// recorded is the record as a lane, to be ranked with the others.
func recorded(c *Channel, ran rtloop.Figure) rtloop.LaneResult {
	nan := rtloop.Figure(math.NaN())
	return rtloop.LaneResult{
		Name: Recorded, Outcome: rtloop.Completed, Channels: []rtloop.ChannelResult{c.ChannelResult},
		Energy:        rtloop.EnergyResult{Window: nan, MarginMin: nan, MarginFinal: nan, Injected: nan, Damped: nan, Specimen: nan, Input: nan, Kinetic: nan, Strain: nan, BalanceError: nan, AddedDamping: nan},
		ResponseError: nan,
	}
}
