package tui

import (
	"math"
	"slices"
	"testing"
	"time"

	"antelag/rtloop"
	"antelag/scenarios/quantity"
	"antelag/tui/canvas"
)

func TestFiguresHaveUnits(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct{ got, want string }{
		{late(0.001234), "1.234 ms late"}, {late(-0.0004), "0.400 ms early"}, {late(1e-7), "0.000 ms"},
		{late(-1e-7), "0.000 ms"}, {late(none), "–"}, {late(1e9), "1.00e+12 ms late"},
		{share(0.02618), "2.62 %"}, {share(0), "0 %"}, {share(1e-7), "< 0.001 %"}, {share(-0.5), "-50.0 %"},
		{share(1e9), "1.00e+11 %"}, {share(inf), "–"},
		{amplitude(0.981), "98.10 %"}, {amplitude(none), "–"},
		{margin(0.694), "69.4 %"}, {margin(-1e9), "< -1000 %"}, {margin(20), "> 1000 %"}, {margin(none), "–"},
		{seconds(4.2123), "4.212 s"}, {seconds(none), "–"}, {whole(30), "30 s"}, {whole(inf), "–"},
		{micro(4200), "4.2 µs"}, {micro(112400), "112 µs"}, {micro(12 * time.Millisecond), "12000 µs"},
		{micro(250 * time.Millisecond), "250.0 ms"}, {micro(3 * time.Second), "3.00 s"},
		{length(0.0123), "12.30 mm"}, {length(-0.0004), "-0.400 mm"}, {length(-1e-9), "0.000 mm"}, {length(12), "12.00 m"},
		{length(1e300), "> 1000 m"}, {length(none), "–"},
		{percent(0.3), "30 %"},
	} {
		if c.got != c.want {
			t.Errorf("%q, want %q", c.got, c.want)
		}
	}
}

func TestTripText(t *testing.T) {
	for _, c := range []struct {
		o    rtloop.Outcome
		trip *rtloop.Trip
		want string
	}{
		{rtloop.Tripped, &rtloop.Trip{Limit: "error", Channel: "damper", Value: 0.02531, Allowed: 0.025, Time: 4.2},
			"TRIPPED at 4.200 s, damper: error 25.31 mm, allowed 25 mm"},
		{rtloop.Tripped, &rtloop.Trip{Limit: "velocity", Channel: "roof", Value: 1.2, Allowed: 1, Time: 1},
			"TRIPPED at 1.000 s, roof: velocity 1.200 m/s, allowed 1 m/s"},
		{rtloop.Tripped, &rtloop.Trip{Limit: "force", Value: 4.1e5, Allowed: 4e5, Time: 1},
			"TRIPPED at 1.000 s, force 410.0 kN, allowed 400 kN"},
		{rtloop.Diverged, &rtloop.Trip{Limit: "displacement", Value: rtloop.Figure(none), Time: 1},
			"DIVERGED at 1.000 s, displacement is no number any more"},
		{rtloop.Diverged, &rtloop.Trip{Limit: "displacement", Value: 1001, Allowed: 1000, Time: 1},
			"DIVERGED at 1.000 s, displacement is 1.001 km"},
		{rtloop.Tripped, nil, "TRIPPED"},
	} {
		if got := tripText(c.o, c.trip); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
	}
}

func TestUnitFor(t *testing.T) {
	for _, c := range []struct {
		most   float64
		dim    quantity.Dim
		factor float64
		unit   string
	}{
		{0.05, quantity.Length, 1e3, "mm"}, {0.03, quantity.Time, 1e3, "ms"}, {12, quantity.Time, 1, "s"},
		{3, quantity.None, 1, ""}, {0, quantity.Length, 1, "m"}, {none, quantity.Time, 1, "s"},
	} {
		factor, unit := unitFor(c.most, c.dim)
		if math.Abs(factor/c.factor-1) > 1e-12 || unit != c.unit {
			t.Errorf("%g in %v: %g %q, want %g %q", c.most, c.dim, factor, unit, c.factor, c.unit)
		}
	}
}

func TestWrap(t *testing.T) {
	for _, c := range []struct {
		text    string
		n, most int
		want    []string
	}{
		{"one two three", 7, 9, []string{"one two", "three"}},
		{"one two three four", 7, 2, []string{"one two", "three …"}},
		{"unbreakable", 5, 3, []string{"unbr…"}},
		{"", 5, 3, nil},
		{"one", 5, 0, nil},
		{"one", 0, 1, []string{"…"}},
	} {
		if got := wrap(c.text, c.n, c.most); !slices.Equal(got, c.want) {
			t.Errorf("%q in %d columns: %q, want %q", c.text, c.n, got, c.want)
		}
	}
}

func TestVerdictRowKeepsWhatMatters(t *testing.T) {
	r := VerdictRow{Label: "delay", Was: "14.012 ms late", Is: "0.412 ms early", Allowed: "≤ 1 ms", Pass: true}
	for width := 30; width < 100; width++ {
		g := canvas.NewGrid(width, 1)
		drawLimit(box{g.Whole(), rect{0, 0, width, 1}}, 0, &r, [3]int{14, 14, 6}, true)
		row := g.String()
		if want := "0.412 ms early  ≤ 1 ms  PASS"; len(row) < len(want) || row[len(row)-len(want):] != want {
			t.Errorf("%d columns: %q", width, row)
		}
	}
}

func TestValueAt(t *testing.T) {
	xs, ys := []float64{0, 1, 3}, []float64{10, 20, 40}
	for _, c := range [][2]float64{{0, 10}, {0.5, 15}, {2, 30}, {3, 40}} {
		if got := valueAt(xs, ys, c[0]); got != c[1] {
			t.Errorf("at %g: %g, want %g", c[0], got, c[1])
		}
	}
	if v := valueAt(xs, ys, 4); !math.IsNaN(v) {
		t.Errorf("beyond the curve: %g", v)
	}
}
