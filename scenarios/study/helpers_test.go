package study

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/scenarios"
)

// short is a one-storey test of a second, so that hundreds of runs take no time.
const short = `
title = "one storey, a spring as specimen (invented)"
[loop]
rate = "256 Hz"
duration = "1 s"
[substructure]
damping_ratio = 0.05
[[substructure.storey]]
mass = "50 t"
stiffness = "4 kN/mm"
[excitation]
kind = "sine"
drives = "ground"
amplitude = "0.1 g"
frequency = "1.5 Hz"
[[channel]]
name = "spring"
[channel.actuator]
kind = "lag-delay"
delay = "8 ms"
lag = "4 ms"
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "polynomial"
order = 2
delay = "12 ms"
[channel.limits]
error = "8 mm"
[[lane]]
name = "bare"
[lane.compensator]
kind = "none"
[accept]
nrmse = 0.05
energy_margin = 0.2
[spread]
"spring.actuator.delay" = 0.5
"spring.specimen.stiffness" = ["0.8 kN/mm", "1.3 kN/mm"]
`

// tracking is an actuator alone that does at once what it is told, but for its
// gain and a delay: what it makes of a sine is known.
const tracking = `
title = "an actuator alone (invented)"
[loop]
rate = "1000 Hz"
duration = "2 s"
[excitation]
kind = "sine"
drives = "target"
amplitude = "10 mm"
frequency = "2 Hz"
[[channel]]
name = "actuator"
[channel.actuator]
kind = "lag-delay"
delay = "0 ms"
lag = "0 ms"
gain = 1.1
[[channel.specimen]]
kind = "spring"
stiffness = "1 kN/mm"
[channel.compensator]
kind = "none"
[accept]
peak_error = "1 mm"
[spread]
"actuator.actuator.gain" = [1.0, 1.2]
`

func scene(t testing.TB, text string, changes ...scenarios.Change) *scenarios.Scenario {
	t.Helper()
	s, err := scenarios.Parse("test.toml", []byte(text), ".", changes...)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func studyOf(t testing.TB, s *scenarios.Scenario, r Request) *Study {
	t.Helper()
	if r.Law == "" {
		r.Law = Uniform
	}
	if r.Sampling == "" {
		r.Sampling = Latin
	}
	st, err := New(s, r)
	if err != nil {
		t.Fatal(err)
	}
	return st
}

// all makes all runs.
func all(t testing.TB, st *Study, workers int) []Row {
	t.Helper()
	var rows []Row
	err := st.Run(context.Background(), 0, st.Runs(), Options{Workers: workers}, func(r []Row) error {
		rows = append(rows, r...)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return rows
}

func summed(st *Study, rows []Row) *Summary {
	s := NewSummary(st)
	for _, r := range rows {
		s.Add(r)
	}
	return s
}

// tabled makes the runs of a shard into a table and returns where it lies.
func tabled(t testing.TB, path string, st *Study, shard Shard) string {
	t.Helper()
	table, err := OpenTable(path, st, shard, "test", false, func(Row) {})
	if err != nil {
		t.Fatal(err)
	}
	first, last := table.Left()
	if err := st.Run(context.Background(), first, last, Options{Workers: 2}, table.Append); err != nil {
		t.Fatal(err)
	}
	if err := table.Close(); err != nil {
		t.Fatal(err)
	}
	return table.Path()
}

func read(t testing.TB, path string) string {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func write(t testing.TB, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

func in(t testing.TB, name string) string {
	t.Helper()
	return filepath.Join(t.TempDir(), name)
}

// says reports an error whose text is not as wanted.
func says(t *testing.T, err error, want string) {
	t.Helper()
	switch {
	case want == "" && err != nil:
		t.Errorf("unexpected: %v", err)
	case want != "" && err == nil:
		t.Errorf("no error, want %q", want)
	case want != "" && !strings.Contains(err.Error(), want):
		t.Errorf("%v\nwant %q", err, want)
	}
}
