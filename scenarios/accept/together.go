package accept

import (
	"context"
	"math"

	"antelag/rtloop"
	"antelag/scenarios"
)

// Together runs the configured lanes of several scenarios beside each other and
// judges each by its own scenario's limits. The scenarios must have the same
// motion and the same reference response, which are those of the first and then
// are computed once: compensators, actuators, sensors and limits may differ, the
// rest may not. Everything happens in the calling goroutine, so that the other
// cores are left alone. Each lane comes to the same bits as in Run. When ctx
// ends first there are no lanes but its error.
func Together(ctx context.Context, tests []*scenarios.Scenario) ([]Lane, error) {
	b := NewBatch(scenarios.Configured)
	for _, s := range tests {
		if err := b.Add(s); err != nil {
			return nil, err
		}
	}
	return b.Run(ctx)
}

// Batch gathers lanes that run together, of the same name each.
type Batch struct {
	lane  string
	rig   *rtloop.Rig
	tests []*scenarios.Scenario
}

// NewBatch returns a batch without lanes.
func NewBatch(lane string) *Batch { return &Batch{lane: lane} }

// Len returns how many lanes the batch has.
func (b *Batch) Len() int { return len(b.tests) }

// Add puts the scenario's lane into the batch. On an error the batch is as it
// was.
func (b *Batch) Add(s *scenarios.Scenario) error {
	rig := b.rig
	if rig == nil {
		var err error
		if rig, err = s.BuildBare(); err != nil {
			return err
		}
	}
	lane, err := s.BuildLane(b.lane, rig)
	if err != nil {
		return err
	}
	rig.Lanes = append(rig.Lanes, lane)
	b.rig, b.tests = rig, append(b.tests, s)
	return nil
}

// Run runs the batch, once, and returns its lanes in the order in which they
// were added.
func (b *Batch) Run(ctx context.Context) ([]Lane, error) {
	if b.rig == nil {
		return nil, nil
	}
	if err := b.rig.Open(); err != nil {
		return nil, err
	}
	for more := true; more; {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		more = b.rig.AdvanceBlock()
	}
	if err := b.rig.Close(); err != nil {
		return nil, err
	}
	lanes := make([]Lane, len(b.tests))
	for i, l := range b.rig.Lanes {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		res := l.Loop.Result()
		res.Name, res.ResponseError = l.Name, rtloop.Figure(l.ResponseError())
		if b.rig.Reference != nil && b.rig.Reference.Outcome() == rtloop.Diverged {
			res.ResponseError = rtloop.Figure(math.NaN()) // also where both failed in the same tick
		}
		lanes[i] = judge(res, b.tests[i].Accept)
		lanes[i].Ran = l.Loop.Time()
	}
	return lanes, nil
}
