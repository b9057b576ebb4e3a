package main

import "testing"

// Without a terminal there is one clear line and exit 2; bad input is named
// before that.
func TestBenchWithoutATerminal(t *testing.T) {
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"bench", "archive"}, "bench needs a terminal on stdin and stdout; antelag run archive runs the scenario without one"},
		{[]string{"bench"}, "bench takes one SCENARIO: a file, or one of"},
		{[]string{"bench", "archive", "tank"}, "bench takes one SCENARIO"},
		{[]string{"bench", "nowhere"}, "nowhere: there is no such file"},
		{[]string{"bench", "archive", "--set", "damper.compensator.delay=9 s"}, "9 s is above 500 ms"},
	} {
		antelag(t, t.TempDir(), c.args...).refused(t, c.want)
	}
}
