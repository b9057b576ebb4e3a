package accept

import (
	"context"
	"encoding/json"
	"testing"

	"antelag/scenarios"
)

// Lanes that share motion and reference come to the very figures of Run.
func TestTogetherIsRun(t *testing.T) {
	var tests []*scenarios.Scenario
	for _, delay := range []string{"10 ms", "14 ms", "40 ms"} {
		s, err := scenarios.Load("archive", scenarios.Change{Path: "damper.compensator.delay", Value: delay}, scenarios.Change{Path: "loop.duration", Value: "3 s"})
		if err != nil {
			t.Fatal(err)
		}
		if s, err = s.Alone(scenarios.Configured); err != nil {
			t.Fatal(err)
		}
		tests = append(tests, s)
	}
	together, err := Together(context.Background(), tests)
	if err != nil {
		t.Fatal(err)
	}
	for i, s := range tests {
		v, err := Run(context.Background(), s, Options{})
		if err != nil {
			t.Fatal(err)
		}
		got, err := json.Marshal(together[i])
		if err != nil {
			t.Fatal(err)
		}
		want, err := json.Marshal(v.Lanes[0])
		if err != nil {
			t.Fatal(err)
		}
		if string(got) != string(want) {
			t.Errorf("scenario %d:\ntogether %s\nalone    %s", i, got, want)
		}
	}
}

func TestTogetherEndsWithItsContext(t *testing.T) {
	s, err := scenarios.Load("archive")
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if lanes, err := Together(ctx, []*scenarios.Scenario{s}); lanes != nil || err != context.Canceled {
		t.Errorf("got %v, %v", lanes, err)
	}
}
