package main

import (
	"bytes"
	"fmt"
	"runtime"
	"strings"
	"testing"
	"time"

	"antelag/rtloop/pace"
)

// The shape of pace --json.
type paceJSON struct {
	Rate     float64 `json:"rate_hz"`
	Time     float64 `json:"time_s"`
	Ticks    int64   `json:"ticks"`
	Late     int64   `json:"late"`
	Overruns int64   `json:"overruns"`
	Shifts   int64   `json:"shifts"`
	Lateness *struct {
		P50  float64 `json:"p50"`
		P90  float64 `json:"p90"`
		P99  float64 `json:"p99"`
		P999 float64 `json:"p999"`
		Max  float64 `json:"max"`
	} `json:"lateness_s"`
	Granted []string `json:"granted"`
	Holds   bool     `json:"holds"`
}

// paced reads what pace --json printed and checks it against itself and the
// exit code. Whether this machine holds the rate is its own affair.
func paced(t *testing.T, o outcome) paceJSON {
	t.Helper()
	var j paceJSON
	strictly(t, o.out, &j)
	if o.err != "" || (o.code == exitGood) != j.Holds || o.code != exitGood && o.code != exitFail {
		t.Errorf("exit %d, holds %v\n%s", o.code, j.Holds, o.err)
	}
	if j.Holds != (j.Ticks > 0 && j.Overruns == 0) || j.Late > j.Ticks || j.Overruns > j.Late || j.Shifts > j.Overruns ||
		j.Time != float64(j.Ticks)/j.Rate || len(j.Granted) == 0 || (j.Lateness == nil) != (j.Ticks == 0) {
		t.Errorf("%+v", j)
	}
	const rounded = 1 + 1e-9 // periods are whole numbers of nanoseconds here
	if l := j.Lateness; l != nil && (l.P50 < 0 || l.P50 > l.P90 || l.P90 > l.P99 || l.P99 > l.P999 || l.P999 > l.Max ||
		(l.Max > rounded/j.Rate) != (j.Overruns > 0) || (l.Max > 0.1*rounded/j.Rate) != (j.Late > 0)) {
		t.Errorf("%+v of %+v", *l, j)
	}
	return j
}

// Every tick that the time has room for is released, none skipped, at rates
// that a machine holds and at one that none does.
func TestPace(t *testing.T) {
	t.Parallel()
	for args, ticks := range map[string]int64{
		"--rate=1000Hz --time=0.25s":   250,
		"--rate=2kHz --time=100ms":     200,
		"--rate=100kHz --time=20.01ms": 2001,
		"--rate=10Hz --time=0.1s":      1,
	} {
		start := time.Now()
		o := antelag(t, t.TempDir(), append(strings.Fields("pace --json"), strings.Fields(args)...)...)
		took := time.Since(start).Seconds()
		j := paced(t, o)
		if j.Ticks != ticks || took < j.Time {
			t.Errorf("%s: %d ticks in %g s, want %d", args, j.Ticks, took, ticks)
		}
	}
	o := antelag(t, t.TempDir(), "pace", "--time", "0.1 s")
	said := map[int]string{exitGood: "This machine holds 2048 Hz", exitFail: "This machine does not hold 2048 Hz: "}[o.code]
	if said == "" || !strings.HasPrefix(o.out, said) || o.err != "" || !strings.Contains(o.out, " of 205, by more than the period, 488 µs") {
		t.Errorf("exit %d\n%s%s", o.code, o.out, o.err)
	}
}

func TestPaceRefused(t *testing.T) {
	t.Parallel()
	for args, want := range map[string]string{
		"--rate=2048":               `--rate: "2048" has no unit; it must be a frequency (Hz)`,
		"--rate=2s":                 `--rate: "2s" is a time (s); it must be a frequency (Hz)`,
		"--rate=fast":               "--rate: ",
		"--rate=NaN":                "--rate: ",
		"--rate=0Hz":                "--rate: 0Hz is below 1 Hz",
		"--rate=-5Hz":               "--rate: -5Hz is below 1 Hz",
		"--rate=200kHz":             "--rate: 200kHz is above 100000 Hz",
		"--time=10":                 `--time: "10" has no unit; it must be a time (s)`,
		"--time=0s":                 "--time: 0s is below ",
		"--rate=2Hz --time=499ms":   "--time: 499ms is below 500 ms",
		"--time=8d":                 "--time: 8d is above ",
		"--rtae=2Hz":                "unknown flag: --rtae",
		"archive":                   `pace takes no argument; there is "archive"`,
		"--rate=2Hz --time=-1s":     "--time: -1s is below 500 ms",
		"--json --rate=1e400Hz":     "--rate: ",
		"--json --time=1s --rate= ": "--rate: no value given",
	} {
		antelag(t, t.TempDir(), append([]string{"pace"}, strings.Fields(args)...)...).refused(t, want)
	}
}

func TestPaceText(t *testing.T) {
	const us, ms = time.Microsecond, time.Millisecond
	good := pace.Report{Period: 1.0 / 2048, Ticks: 20480, P50: 91, P90: 140, P99: 12345, P999: 20 * us, Max: 31400,
		Granted: []string{"a thread of its own", "real-time priority 80 (SCHED_FIFO)"}, RealTime: true}
	late, bad, stopped := good, good, good
	late.Late, late.P999, late.Max = 41, 60*us, 400*us
	bad.Late, bad.Overruns, bad.Shifts, bad.Shifted, bad.P999, bad.Max = 41, 12, 2, 555*ms, 60*us, 300*ms
	stopped.Ticks = 5120
	none := pace.Report{Period: 1.0 / 2048, RealTime: true}
	const table = `
50 % of the ticks  at most 0.0910 µs late
90 %               at most 0.140 µs late
99 %               at most 12.3 µs late
99.9 %             at most 20.0 µs late
all                at most 31.4 µs late
late               0 of 20480, by more than a tenth of the period, 48.8 µs
overruns           0 of 20480, by more than the period, 488 µs; no tick is skipped
deadlines          never moved
granted or not     a thread of its own
                   real-time priority 80 (SCHED_FIFO)
`
	for _, c := range []struct {
		name string
		r    pace.Report
		want []string // that the text begins with, and that it holds
	}{
		{"holds", good, []string{"This machine holds 2048 Hz: 99.9 % of 20480 ticks came within 20.0 µs of their time, the worst 31.4 µs late.\n" + table}},
		{"late", late, []string{"This machine holds 2048 Hz with late ticks: 41 of 20480 came more than a tenth of the period late, the worst 400 µs, none a whole period.\n\n",
			"\nlate               41 of 20480, by", "\nwould help         no other work"}},
		{"bad", bad, []string{"This machine does not hold 2048 Hz: 12 of 20480 ticks came more than a whole period late, the worst 300 ms.\n\n",
			"\noverruns           12 of 20480, by", "\ndeadlines          moved 2 times, by 555 ms in all\n", "\nwould help         no other work"}},
		{"stopped", stopped, []string{"This machine holds 2048 Hz: 99.9 % of 5120 ticks came within 20.0 µs of their time, the worst 31.4 µs late.\n" +
			"Interrupted after 2.5 s of 10 s; the figures are of what ran.\n\n"}},
		{"none", none, []string{"Nothing can be said about 2048 Hz: no tick was released.\nInterrupted after 0 s of 10 s; the figures are of what ran.\n\nlate "}},
	} {
		t.Run(c.name, func(t *testing.T) {
			var out bytes.Buffer
			if err := printPace(&out, c.r, 2048, 20480); err != nil {
				t.Fatal(err)
			}
			if !strings.HasPrefix(out.String(), c.want[0]) {
				t.Errorf("does not begin with\n%s\nbut is\n%s", c.want[0], out.String())
			}
			for _, w := range c.want[1:] {
				if !strings.Contains(out.String(), w) {
					t.Errorf("does not say %q:\n%s", w, out.String())
				}
			}
			if c.name == "holds" && out.String() != c.want[0] {
				t.Errorf("says more than\n%s", c.want[0])
			}
		})
	}
	good.RealTime = false
	advice := fmt.Sprint(paceAdvice(&good))
	if want := map[bool]string{true: "cap_sys_nice", false: "Linux"}[runtime.GOOS == "linux"]; !strings.Contains(advice, want) {
		t.Errorf("advises %s", advice)
	}
}
