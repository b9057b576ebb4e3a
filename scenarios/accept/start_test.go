package accept

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/rtloop"
	"antelag/scenarios"
)

// A record that begins beyond all reason: the loop has diverged before it has
// begun, and none of it stands in the figures.
func TestStartsBeyondReason(t *testing.T) {
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "far.txt"), []byte("0 1e15\n1 1e15\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	s, err := scenarios.Parse("far.toml", []byte(`
[loop]
rate = "1 kHz"
duration = "0.1 s"
[excitation]
drives = "target"
kind = "record"
file = "far.txt"
unit = "m"
[[channel]]
[channel.actuator]
kind = "servo-hydraulic"
[[channel.specimen]]
kind = "cubic"
stiffness = "1 kN/mm"
cubic = "1e12 N/m^3"
[channel.compensator]
kind = "taylor"
[accept]
peak_error = "1 m"
`), dir)
	if err != nil {
		t.Fatal(err)
	}
	v, err := Run(context.Background(), s, Options{})
	if err != nil {
		t.Fatal(err)
	}
	l := &v.Lanes[0]
	if l.Outcome != rtloop.Diverged || l.Trip.Limit != "target" || l.Trip.Time != 0 || l.Ran != 0 || l.Pass {
		t.Errorf("%s, %+v after %g s, pass %v", l.Outcome, l.Trip, l.Ran, l.Pass)
	}
	if c := l.Channels[0]; c.PeakTarget != 0 || c.PeakCommand != 0 || c.PeakForce != 0 {
		t.Errorf("peaks %+v", c)
	}
	if err := sound(v); err != nil {
		t.Error(err)
	}
	var text strings.Builder
	if err := v.WriteText(&text, false); err != nil || !strings.Contains(text.String(), "DIVERGED at 0.000 s") {
		t.Errorf("%v: %s", err, text.String())
	}
}
