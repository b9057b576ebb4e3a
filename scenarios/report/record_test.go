package report

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/rtloop/runlog"
)

// However long a run, its history has no more rows than fit, evenly spaced from
// the first.
func TestLongHistories(t *testing.T) {
	for _, n := range []int{1, mostRows - 1, mostRows, mostRows + 1, 5*mostRows + 3} {
		r := newRows(1)
		for k := range n {
			if r.keep() {
				r.time = append(r.time, float64(k))
				c := &r.channels[0]
				c.target = append(c.target, float64(-k))
			}
		}
		if len(r.time) > mostRows || len(r.time) < min(n, mostRows/2) {
			t.Errorf("%d rows of %d", len(r.time), n)
		}
		for i, at := range r.time {
			if at != float64(int64(i)*r.stride) || r.channels[0].target[i] != -at {
				t.Fatalf("%d ticks: row %d is of tick %v", n, i, at)
			}
		}
		if last := r.time[len(r.time)-1]; int64(n-1)-int64(last) >= r.stride {
			t.Errorf("%d ticks: the last row is of tick %v", n, last)
		}
	}
}

func TestStrongest(t *testing.T) {
	r := newRows(1)
	for k := range 1001 {
		at := float64(k) / 100
		r.time = append(r.time, at)
		r.channels[0].target = append(r.channels[0].target, -math.Exp(-(at-7)*(at-7)))
	}
	for _, c := range []struct {
		seconds float64
		want    span
	}{{2, span{600, 800}}, {8, span{201, 1001}}, {100, span{0, 1001}}, {0, span{699, 701}}} {
		if got := r.strongest(0, c.seconds); got != c.want {
			t.Errorf("%v s: %v, want %v", c.seconds, got, c.want)
		}
	}
}

// A record of a sine that is 5 ms late and 2 % small says so.
func TestRecord(t *testing.T) {
	path := filepath.Join(t.TempDir(), "a test.csv")
	var log strings.Builder
	log.WriteString("time [s],target [mm],measured [mm],force [kN]\n")
	for k := range 4096 {
		at := float64(k) / 512
		y := 0.98 * math.Sin(2*math.Pi*(at-0.005))
		fmt.Fprintf(&log, "%.9f,%.9f,%.9f,%.9f\n", at, 10*math.Sin(2*math.Pi*at), 10*y, 3*y)
	}
	if err := os.WriteFile(path, []byte(log.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	test, err := Record(context.Background(), path, runlog.Options{}, nil)
	if err != nil {
		t.Fatal(err)
	}
	// Of 8 whole periods all three are exact but for the delay, which is found by
	// a parabola through the correlation at the ticks.
	if want := "Channel channel: delay 5.00"; !strings.HasPrefix(test.Verdict, want) && !strings.HasPrefix(test.Verdict, "Channel channel: delay 4.99") {
		t.Error(test.Verdict)
	}
	if !strings.Contains(test.Verdict, "ms late, amplitude 98.00 %") {
		t.Error(test.Verdict)
	}
	if !test.Pass || test.Word != recordWord || len(test.Pictures()) != 4 {
		t.Errorf("%s, %d pictures", test.Word, len(test.Pictures()))
	}
	page := html(t, &Page{Tests: []*Test{test}})
	for _, want := range []string{"Report on the record of a real-time hybrid test", "5.000 ms late", "SHA-256 of the log", "4096, 1.95312 ms apart"} {
		if !strings.Contains(page, want) {
			t.Errorf("not on the page: %s", want)
		}
	}
	if again, err := Record(context.Background(), path, runlog.Options{}, nil); err != nil || html(t, &Page{Tests: []*Test{again}}) != page {
		t.Errorf("read twice, two pages (%v)", err)
	}
}

func TestIsLog(t *testing.T) {
	for name, want := range map[string]bool{"a.csv": true, "A.CSV.gz": true, "x/y.tsv": true, "lab.txt": true, "archive": false, "a.toml": false, "csv": false} {
		if IsLog(name) != want {
			t.Errorf("%s: %v", name, !want)
		}
	}
}
