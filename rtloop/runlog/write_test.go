package runlog

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"antelag/rtloop"
	"antelag/rtloop/excitation"
	"antelag/scenarios"
)

// test is a short scenario with two channels; driven by what is filled in.
const test = `[loop]
rate = "512 Hz"
duration = "2 s"
`

const structure = `[substructure]
damping_ratio = 0.02
[[substructure.storey]]
mass = "10 t"
stiffness = "2 kN/mm"
[[substructure.storey]]
mass = "8 t"
stiffness = "2 kN/mm"
`

const channels = `[[channel]]
name = "low"
[channel.actuator]
kind = "lag-delay"
delay = "5 ms"
[[channel.specimen]]
kind = "viscous"
damping = "10 kN*s/m"
[channel.compensator]
kind = "polynomial"
[[channel]]
name = "high"
[channel.actuator]
kind = "lag-delay"
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "none"
`

func sine(drives, amplitude string) string {
	return "[excitation]\nkind = \"sine\"\ndrives = \"" + drives + "\"\namplitude = \"" + amplitude + "\"\nfrequency = \"2 Hz\"\n"
}

func build(t *testing.T, text string) (*scenarios.Scenario, *rtloop.Rig) {
	t.Helper()
	s, err := scenarios.Parse("test.toml", []byte(text), ".")
	if err != nil {
		t.Fatal(err)
	}
	rig, err := s.Build()
	if err != nil {
		t.Fatal(err)
	}
	return s, rig
}

// Every row is what the loop said at that tick, bit for bit; the columns are
// those of what the excitation drives.
func TestRows(t *testing.T) {
	const four = "low.target_m,low.command_m,low.measured_m,low.force_N,high.target_m,high.command_m,high.measured_m,high.force_N"
	for _, c := range []struct{ name, text, header string }{
		{"ground", test + structure + sine("ground", "0.1 g") + channels, "time_s,ground_m_s2," + four + ",energy_margin"},
		{"force", test + structure + sine("force", "20 kN") + channels, "time_s,applied_N," + four + ",energy_margin"},
		{"target", test + sine("target", "10 mm") + channels, "time_s," + four + ",energy_margin"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s, rig := build(t, c.text)
			path := filepath.Join(t.TempDir(), "x.csv")
			w, err := Create(path, s.ChannelNames(), s.Excitation.Drives, "text", false)
			if err != nil {
				t.Fatal(err)
			}
			var want [][]float64
			rig.Lanes[0].Observe = func(l *rtloop.Loop) error {
				row := []float64{l.Time()}
				if c.name != "target" {
					row = append(row, l.Excitation())
				}
				for j := range 2 {
					r := l.Row(j)
					row = append(row, r.Target, r.Command, r.Measured, r.Force)
				}
				want = append(want, append(row, l.Margin()))
				return w.Row(l)
			}
			if err := rig.Run(context.Background(), nil); err != nil {
				t.Fatal(err)
			}
			if err := w.Close(); err != nil {
				t.Fatal(err)
			}
			compare(t, path, c.header, want)
			if text, _ := os.ReadFile(path + ".toml"); string(text) != "text" {
				t.Errorf("provenance %q", text)
			}
		})
	}
}

func compare(t *testing.T, path, header string, want [][]float64) {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(text), "\n")
	if lines[0] != header || lines[len(lines)-1] != "" || len(lines) != len(want)+2 || len(want) != 1025 {
		t.Fatalf("%d lines for %d rows\n%s", len(lines), len(want), lines[0])
	}
	defined := 0
	for k, row := range want {
		cells := strings.Split(lines[k+1], ",")
		if len(cells) != len(row) {
			t.Fatalf("row %d has %d cells: %s", k, len(cells), lines[k+1])
		}
		for i, v := range row {
			if i == len(row)-1 && math.IsNaN(v) {
				if cells[i] != "" {
					t.Fatalf("row %d has margin %q while it is undefined", k, cells[i])
				}
				continue
			}
			if got, err := strconv.ParseFloat(cells[i], 64); err != nil || got != v {
				t.Fatalf("row %d, cell %d is %q; the loop says %v", k, i, cells[i], v)
			}
			if i == len(row)-1 {
				defined++
			}
		}
	}
	if structure := strings.Contains(header, "ground") || strings.Contains(header, "applied"); structure != (defined > 0) {
		t.Errorf("the margin is defined in %d rows", defined)
	}
}

// on starts a writer on a loop at rest.
func on(t *testing.T) (w *Writer, l *rtloop.Loop, path string) {
	t.Helper()
	s, rig := build(t, test+structure+sine("ground", "0.1 g")+channels)
	path = filepath.Join(t.TempDir(), "x.csv")
	w, err := Create(path, s.ChannelNames(), s.Excitation.Drives, "text", false)
	if err != nil {
		t.Fatal(err)
	}
	l = rig.Lanes[0].Loop
	l.Start(rtloop.Drive{})
	return w, l, path
}

func size(t *testing.T, path string) int64 {
	t.Helper()
	info, err := os.Stat(path)
	if err != nil {
		t.Fatal(err)
	}
	return info.Size()
}

// A row waits in memory for a second at most, however few rows come.
func TestFlushEachSecond(t *testing.T) {
	w, l, path := on(t)
	row := func(waited time.Duration) {
		w.flushed = time.Now().Add(-waited)
		if err := w.Row(l); err != nil {
			t.Fatal(err)
		}
	}
	row(0)
	if n := size(t, path); n != 0 {
		t.Errorf("%d bytes in the file after one row", n)
	}
	row(time.Second)
	text, err := os.ReadFile(path)
	if err != nil || strings.Count(string(text), "\n") != 3 || !strings.HasSuffix(string(text), "\n") {
		t.Errorf("after a second: %q, %v", text, err)
	}
	row(0)
	if n := size(t, path); n != int64(len(text)) {
		t.Errorf("written again at once: %d bytes", n)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	if n := size(t, path); n <= int64(len(text)) {
		t.Error("Close left the last row behind")
	}
}

// The file grows by whole rows, so that it reads to its end between any two
// writes.
func TestGrowsByWholeRows(t *testing.T) {
	w, l, path := on(t)
	sizes := map[int64]bool{}
	for range 5000 {
		w.flushed = time.Now()
		l.Tick(rtloop.Drive{X: 1})
		if err := w.Row(l); err != nil {
			t.Fatal(err)
		}
		if n := size(t, path); !sizes[n] {
			sizes[n] = true
			if text, err := os.ReadFile(path); err != nil || n > 0 && text[n-1] != '\n' {
				t.Fatalf("at %d bytes the file ends within a row", n)
			}
		}
	}
	if len(sizes) < 5 {
		t.Errorf("written %d times", len(sizes)-1)
	}
	w.Close()
}

func TestRowAllocatesNothing(t *testing.T) {
	w, l, _ := on(t)
	defer w.Close()
	if n := testing.AllocsPerRun(3000, func() {
		l.Tick(rtloop.Drive{X: 1})
		w.Row(l) //nolint:errcheck // a temporary file
	}); n != 0 {
		t.Errorf("%g allocations a row", n)
	}
}

// After a write has failed every row says so, and Close too; nothing more is
// written.
func TestFailedWriteSticks(t *testing.T) {
	w, l, path := on(t)
	w.flushed = time.Now().Add(-time.Second)
	if err := w.Row(l); err != nil {
		t.Fatal(err)
	}
	before := size(t, path)
	w.file.Close()
	w.flushed = time.Now().Add(-time.Second)
	first := w.Row(l)
	if first == nil || !strings.HasPrefix(first.Error(), "log: write "+path) {
		t.Fatalf("got %v", first)
	}
	if err := w.Close(); err == nil || err.Error() != first.Error() {
		t.Errorf("Close says %v", err)
	}
	if n := size(t, path); n != before {
		t.Errorf("%d bytes became %d", before, n)
	}
}

func BenchmarkRow(b *testing.B) {
	s, err := scenarios.Parse("test.toml", []byte(test+structure+sine("ground", "0.1 g")+channels), ".")
	if err != nil {
		b.Fatal(err)
	}
	rig, err := s.Build()
	if err != nil {
		b.Fatal(err)
	}
	w, err := Create(filepath.Join(b.TempDir(), "x.csv"), s.ChannelNames(), excitation.Ground, "", false)
	if err != nil {
		b.Fatal(err)
	}
	defer w.Close()
	l := rig.Lanes[0].Loop
	l.Start(rtloop.Drive{})
	for range 500 {
		l.Tick(rtloop.Drive{X: 1})
	}
	b.ReportAllocs()
	for b.Loop() {
		if err := w.Row(l); err != nil {
			b.Fatal(err)
		}
	}
}
