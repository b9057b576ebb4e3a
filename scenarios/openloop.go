package scenarios

import (
	"maps"
	"slices"

	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/scenarios/kind"
)

// OpenLoop builds one channel of the scenario with the loop open: the given target
// drives its actuator, once with the compensator of every lane that is for it, the
// configured one first. Specimen, sensors and limits are the scenario's; structure
// and excitation are left out, so that no force acts back on the target. tick is
// the physical time between the target's samples, s, instead of the scenario's own,
// and ticks how many follow the first.
func (s *Scenario) OpenLoop(channel string, target excitation.Source, tick float64, ticks int64) (*rtloop.Rig, error) {
	j := slices.IndexFunc(s.Channels, func(c Channel) bool { return c.Name == channel })
	if j < 0 {
		return nil, &kind.UnknownError{What: "channel", Got: channel, Known: s.ChannelNames()}
	}
	rate, err := loopSection.Setting("rate")
	if err == nil {
		err = rate.Check(kind.Num(1 / tick))
	}
	if err != nil {
		return nil, err
	}
	here := *s
	here.Substructure, here.Excitation.Drives = nil, excitation.Target
	here.Loop = maps.Clone(s.Loop)
	here.Loop["rate"], here.Loop["slowdown"] = kind.Num(1/tick), kind.Num(1)
	here.Loop["duration"] = kind.Num(float64(ticks) * tick)
	b := &builder{s: &here, ticks: ticks}
	b.window = b.energyWindow()
	rig := &rtloop.Rig{Motion: target, Ticks: ticks, Step: tick}
	for i := -1; i < len(s.Lanes); i++ {
		lane := &rtloop.Lane{Name: Configured}
		if i >= 0 {
			if lane.Name = s.Lanes[i].Name; s.Lanes[i].Channel != "" && s.Lanes[i].Channel != channel {
				continue
			}
		}
		c, err := b.compensated(i, j)
		if err != nil {
			return nil, err
		}
		if lane.Loop, err = b.loop(b.config([]rtloop.Channel{c})); err != nil {
			return nil, err
		}
		rig.Lanes = append(rig.Lanes, lane)
	}
	return rig, nil
}
