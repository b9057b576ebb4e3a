package report

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Of 100 runs with errors of 0.1 % to 10 % the median is 5 %, the 95th 9.5 %, the
// worst 10 %, and 50 are beyond 5 %.
func TestSpread(t *testing.T) {
	var table strings.Builder
	table.WriteString("run,damper.actuator.delay_s,outcome,pass,nrmse,energy_margin\n")
	for i := 1; i <= 100; i++ {
		margin := fmt.Sprint(1 - float64(i)/200)
		if i == 100 {
			margin = "" // undefined is worst
		}
		fmt.Fprintf(&table, "%d,0.008,completed,%v,%g,%s\n", i-1, i <= 50, float64(i)/1000, margin)
	}
	path := filepath.Join(t.TempDir(), "a sweep.csv")
	if err := os.WriteFile(path, []byte(table.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	test := reported(t, scene(t, rig), Options{Sweep: path})
	for _, p := range test.Parts {
		if p.Heading != "Spread" {
			continue
		}
		if want := "100 runs of a sweep (a sweep.csv): 50 passed, 50 did not."; !strings.HasPrefix(p.Text[0], want) {
			t.Errorf("%s", p.Text[0])
		}
		if !strings.Contains(p.Text[1], "Nothing beside the table says") {
			t.Error("an unknown table is not called so")
		}
		want := []Row{
			{"tracking error, rms", "5.00 %", "9.50 %", "10.0 %", "≤ 5 %", "50"},
			{"energy margin, least", "75.0 %", "52.5 %", "–", "≥ 10 %", "1"},
		}
		if got := fmt.Sprint(p.Tables[0].Rows); got != fmt.Sprint(want) {
			t.Errorf("%s\nwant %s", got, want)
		}
		return
	}
	t.Error("no spread on the page")
}

func TestTablesThatAreNone(t *testing.T) {
	s := scene(t, rig)
	for _, c := range []struct{ name, text, want string }{
		{"empty", "", "is empty; a sweep writes one row a run"},
		{"no runs", "run,nrmse\n", "has no runs"},
		{"another table", "time_s,target_m\n0,1\n", "has no column of a figure that the scenario judges"},
		{"a word", "run,nrmse\n0,much\n", `line 2: nrmse: "much" is no number`},
		{"a short row", "run,nrmse\n0\n", "record on line 2: wrong number of fields"},
		{"quotes", "run,nrmse\n0,\"1\n", `line 2`},
	} {
		if _, err := parseSpread(strings.NewReader(c.text), s); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v", c.name, err)
		}
	}
	if _, err := readSpread(filepath.Join(t.TempDir(), "gone.csv"), s); err == nil || !strings.Contains(err.Error(), "gone.csv") {
		t.Error(err)
	}
}

func FuzzSpread(f *testing.F) {
	f.Add("run,pass,nrmse,energy_margin\n0,true,0.01,0.9\n1,false,,\n")
	f.Add("run,nrmse\r\n0,1e400\n")
	f.Add("\"nrmse\"\n\"1\"\n")
	f.Fuzz(func(t *testing.T, text string) {
		s := scene(t, rig)
		table, err := parseSpread(strings.NewReader(text), s)
		if err != nil {
			return
		}
		r := &run{s: s, spread: table}
		r.lane = &emptyLane
		p := r.spreadPart()
		for _, picture := range p.Pictures {
			if _, err := picture.Figure.SVG(); err != nil {
				t.Error(err)
			}
		}
	})
}
