package scenarios

import (
	"antelag/compensator"
	"antelag/plant"
	"antelag/rtloop"
)

// reference builds the loop that the others are compared with: a perfect
// actuator, perfect sensors, no compensator, at real speed, with the model
// step of the test.
func (b *builder) reference() (*rtloop.Loop, error) {
	if b.structure == nil {
		return nil, nil
	}
	return b.perfectLoop(b.step(), 1)
}

// perfectLoop builds a loop of perfect channels, without gauges, of so many
// physical seconds a tick at a slowdown.
func (b *builder) perfectLoop(tick, slowdown float64) (*rtloop.Loop, error) {
	var channels []rtloop.Channel
	for i := range b.s.Channels {
		specimen, err := b.specimen(i)
		if err != nil {
			return nil, err
		}
		c, err := perfect(tick, b.tick())
		if err != nil {
			return nil, err
		}
		c.Name, c.Specimen = b.s.Channels[i].Name, specimen
		channels = append(channels, c)
	}
	cfg := b.config(channels)
	cfg.Tick, cfg.Slowdown, cfg.Judge, cfg.Memory = tick, slowdown, false, 0
	return b.loop(cfg)
}

// perfect is a channel whose actuator does at once what it is told. Without a
// compensator to speak of, the latter's tick does not matter.
func perfect(tick, physical float64) (rtloop.Channel, error) {
	actuator, err := buildPart(&plant.Actuators, "lag-delay", nil)
	if err != nil {
		return rtloop.Channel{}, err
	}
	c := rtloop.Channel{Method: "none", Displacement: plant.NewPerfectSensor(), Force: plant.NewPerfectSensor(), Limits: rtloop.NoLimits}
	if c.Actuator, err = actuator.New(plant.Timing{Tick: tick}, actuator.values); err != nil {
		return rtloop.Channel{}, err
	}
	none, err := buildPart(&compensator.Kinds, "none", nil)
	if err != nil {
		return rtloop.Channel{}, err
	}
	c.Compensator, err = none.New(physical, none.values)
	return c, err
}
