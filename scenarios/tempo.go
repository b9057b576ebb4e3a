package scenarios

import "antelag/rtloop"

// Perfect is the name of the lane whose actuators do at once what they are
// told.
const Perfect = "perfect actuator"

// BuildTempo makes what it takes to tell what synchronization costs a slowed
// test from what slowness itself costs: the motion, the reference response at
// real speed, the configured lane, and, where there is a structure, a lane
// without gauges that is as slow but has perfect actuators and sensors. All
// three loops have the same model step.
func (s *Scenario) BuildTempo() (*rtloop.Rig, error) {
	b, rig, err := s.bare()
	if err != nil {
		return nil, err
	}
	lane, err := b.named(-1)
	if err != nil {
		return nil, err
	}
	rig.Lanes = []*rtloop.Lane{lane}
	if b.structure == nil {
		return rig, nil
	}
	perfect := &rtloop.Lane{Name: Perfect}
	if perfect.Loop, err = b.perfectLoop(b.tick(), s.Loop.Num("slowdown")); err != nil {
		return nil, err
	}
	rig.Lanes = append(rig.Lanes, perfect)
	return rig, nil
}
