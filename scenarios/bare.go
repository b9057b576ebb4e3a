package scenarios

import (
	"slices"

	"antelag/rtloop"
)

// Parts of what Build builds, for those who need no more.

// BuildBare is Build for a rig that has no lanes yet.
func (s *Scenario) BuildBare() (*rtloop.Rig, error) {
	_, rig, err := s.bare()
	return rig, err
}

func (s *Scenario) bare() (*builder, *rtloop.Rig, error) {
	b, motion, err := s.builder(nil)
	if err != nil {
		return nil, nil, err
	}
	rig := &rtloop.Rig{Motion: motion, Ticks: b.ticks, Step: b.step()}
	rig.Reference, err = b.reference()
	return b, rig, err
}

// BuildLane makes one lane by name, to run on the rig of a scenario that has the
// same motion: on nothing but its loop is time spent.
func (s *Scenario) BuildLane(name string, on *rtloop.Rig) (*rtloop.Lane, error) {
	if err := s.CheckLane(name); err != nil {
		return nil, err
	}
	b, _, err := s.builder(on.Motion)
	if err != nil {
		return nil, err
	}
	return b.named(s.laneIndex(name))
}

// BuildLoop builds the loop of one lane alone, without motion, reference and
// gauges: for studies of the loop itself. It is at rest at zero once started.
func (s *Scenario) BuildLoop(lane string) (*rtloop.Loop, error) {
	if err := s.CheckLane(lane); err != nil {
		return nil, err
	}
	b := &builder{s: s, bare: true}
	if s.Substructure != nil {
		if err := b.buildStructure(); err != nil {
			return nil, b.structureError(err)
		}
	}
	b.window = b.energyWindow()
	if err := b.check(); err != nil {
		return nil, err
	}
	return b.lane(s.laneIndex(lane))
}

// laneIndex is the index of an alternative lane, -1 for the configured one.
func (s *Scenario) laneIndex(name string) int {
	return slices.IndexFunc(s.Lanes, func(l Lane) bool { return l.Name == name })
}
