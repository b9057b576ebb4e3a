package scenarios

import "testing"

func TestAlone(t *testing.T) {
	s, err := Load("piperack")
	if err != nil {
		t.Fatal(err)
	}
	alone, err := s.Alone("high-adaptive")
	if err != nil {
		t.Fatal(err)
	}
	if len(alone.Lanes) != 0 || alone.Channels[0].Compensator.Kind.Name != "polynomial" || alone.Channels[1].Compensator.Kind.Name != "adaptive-inverse" {
		t.Errorf("lanes %v, compensators %s and %s", alone.Lanes, alone.Channels[0].Compensator.Kind.Name, alone.Channels[1].Compensator.Kind.Name)
	}
	if same, err := s.Alone(Configured); err != nil || same.Channels[1].Compensator.Kind.Name != "polynomial" || len(same.Lanes) != 0 {
		t.Errorf("the configured lane alone: %v", err)
	}
	if len(s.Lanes) != 1 {
		t.Error("Alone changed the scenario it was called on")
	}
	if _, err := s.Alone("nobody"); err == nil {
		t.Error("a lane that is not there")
	}
}

func TestWithLane(t *testing.T) {
	s, err := Load("piperack")
	if err != nil {
		t.Fatal(err)
	}
	for _, from := range []string{Configured, "high-adaptive"} {
		more, err := s.WithLane("copy", from, "brace-high")
		if err != nil {
			t.Fatal(err)
		}
		last := more.Lanes[len(more.Lanes)-1]
		want := s.Channels[1].Compensator
		if from != Configured {
			want = s.Lanes[0].Compensator
		}
		if last.Name != "copy" || last.Channel != "brace-high" || last.Compensator.Kind != want.Kind || last.Compensator.Values.Num("delay") != want.Values.Num("delay") {
			t.Errorf("copy of %s: %+v", from, last)
		}
		changed, err := more.With(Change{"lane.copy.compensator.delay", "11 ms"})
		if err != nil || changed.Lanes[1].Compensator.Values.Num("delay") != 0.011 {
			t.Errorf("the copy cannot be set: %v", err)
		}
	}
	if _, err := s.WithLane("high-adaptive", Configured, "brace-low"); err == nil {
		t.Error("two lanes of one name")
	}
}
