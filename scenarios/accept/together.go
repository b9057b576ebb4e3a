package accept

import (
	"context"

	"antelag/rtloop"
	"antelag/scenarios"
)

// Together runs the configured lanes of several scenarios beside each other and
// judges each by its own scenario's limits. The scenarios must be the same but
// for their compensators: they share the motion and the reference response of
// the first, which then are computed once. Everything happens in the calling
// goroutine, so that the other cores are left alone. Each lane comes to the same
// bits as in Run. When ctx ends first there are no lanes but its error.
func Together(ctx context.Context, tests []*scenarios.Scenario) ([]Lane, error) {
	rig, err := gather(tests)
	if err != nil {
		return nil, err
	}
	if err := rig.Open(); err != nil {
		return nil, err
	}
	const between = 256 // ticks from one look at ctx to the next
	for more := true; more; {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		for i := 0; i < between && more; i++ {
			more = rig.Advance()
		}
	}
	if err := rig.Close(); err != nil {
		return nil, err
	}
	lanes := make([]Lane, len(tests))
	for i, l := range rig.Lanes {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		res := l.Loop.Result()
		res.Name, res.ResponseError = l.Name, rtloop.Figure(l.ResponseError())
		lanes[i] = judge(res, tests[i].Accept)
		lanes[i].Ran = l.Loop.Time()
	}
	return lanes, nil
}

// gather puts the configured lanes of all tests on the rig of the first.
func gather(tests []*scenarios.Scenario) (*rtloop.Rig, error) {
	var rig *rtloop.Rig
	for _, s := range tests {
		next, err := s.Build()
		if err != nil {
			return nil, err
		}
		if rig == nil {
			rig = next
			rig.Lanes = rig.Lanes[:1]
			continue
		}
		rig.Lanes = append(rig.Lanes, next.Lanes[0])
	}
	return rig, nil
}
