package study

import (
	"bytes"
	"testing"

	"antelag/scenarios"
)

// Every sort of study has its picture, the same bytes from the same runs.
func TestPictures(t *testing.T) {
	wild := scenarios.Change{Path: "spring.actuator.gain", Value: "9"}
	for _, c := range []struct {
		name   string
		s      *scenarios.Scenario
		r      Request
		panels int
		lines  int
		maps   bool
	}{
		{"draws", scene(t, short), Request{Draws: 30}, 2, 1, false},
		{"one setting", scene(t, short), Request{Over: []string{"spring.compensator.delay=2 ms:20 ms:7"}}, 2, 1, false},
		{"one setting, drawn", scene(t, short), Request{Over: []string{"spring.compensator.delay=2 ms:20 ms:3"}, Draws: 20}, 2, 2, false},
		{"two settings", scene(t, short), Request{Over: []string{"spring.compensator.delay=2 ms:20 ms:3", "spring.actuator.gain=0.9:9:3"}}, 1, 0, true},
		{"three settings", scene(t, short), Request{Over: []string{"spring.compensator.delay=2 ms:20 ms:2", "spring.actuator.gain=0.9:1:2", "loop.seed=1:2:2"}}, 2, 1, false},
		{"nothing completed", scene(t, short, wild), Request{Draws: 5}, 2, 1, false},
		{"nothing judged", scene(t, tracking, scenarios.Change{Path: "accept.peak_error", Value: "10 m"}), Request{Over: []string{"actuator.actuator.gain=0.9:1.1:3:log"}}, 1, 1, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			st := studyOf(t, c.s, c.r)
			sum := summed(st, all(t, st, 2))
			f := sum.Picture()
			if len(f.Panels) != c.panels || len(f.Panels[0].Lines) != c.lines || (f.Panels[0].Map != nil) != c.maps {
				t.Errorf("%d panels, %d lines", len(f.Panels), len(f.Panels[0].Lines))
			}
			var a, b bytes.Buffer
			for _, to := range []*bytes.Buffer{&a, &b} {
				if err := sum.Picture().Write(to, "png"); err != nil {
					t.Fatal(err)
				}
			}
			if !bytes.Equal(a.Bytes(), b.Bytes()) {
				t.Error("two pictures of the same runs differ")
			}
		})
	}
}
