package figure

import (
	"math"
	"strings"
	"testing"
)

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		name string
		axis Axis
		low  float64
		high float64
		n    int
		want string
	}{
		{"whole", Axis{}, 0, 30, 6, "0 5 10 15 20 25 30"},
		{"about zero", Axis{}, -1, 1, 4, "−1.0 −0.5 0.0 0.5 1.0"},
		{"two at least", Axis{}, 0.13, 0.98, 4, "0.2 0.4 0.6 0.8"},
		{"thousandths", Axis{}, 0.001, 0.005, 4, "1 2 3 4 5"}, // times 1e-3
		{"millions", Axis{}, 1e6, 4e6, 3, "1 2 3 4"},
		{"decades", Axis{Log: true}, 0.1, 50, 6, "0.1 1 10"},
		{"one decade", Axis{Log: true}, 1, 10, 6, "1 2 5 10"},
		{"many decades", Axis{Log: true}, 1e-6, 1e6, 4, "1e−6 0.001 1 1000 1e6"},
		{"less than a decade", Axis{Log: true}, 2, 4, 4, "2.0 2.5 3.0 3.5 4.0"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := c.axis.span(c.low, c.high, false)
			s.divide(c.n)
			var got []string
			for _, tick := range s.ticks {
				if tick.Label != "" {
					got = append(got, tick.Label)
				}
				if tick.Value < c.low*(1-1e-9)-1e-9 || tick.Value > c.high*(1+1e-9) {
					t.Errorf("a tick at %v", tick.Value)
				}
			}
			if text := strings.Join(got, " "); text != c.want {
				t.Errorf("ticks %q, want %q", text, c.want)
			}
		})
	}
}

// An axis always has something to divide by, whatever the data.
func TestSpans(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		name      string
		axis      Axis
		low, high float64
		wantLow   float64
		wantHigh  float64
	}{
		{"no data", Axis{}, math.Inf(1), math.Inf(-1), 0, 1},
		{"no data, log", Axis{Log: true}, math.Inf(1), math.Inf(-1), 1, 10},
		{"one value", Axis{}, 5, 5, 4.5, 5.5},
		{"zero", Axis{}, 0, 0, -1, 1},
		{"one value, log", Axis{Log: true}, 4, 4, 2, 8},
		{"fixed", Axis{Low: -2, High: 3}, 0, 100, -2, 3},
		{"fixed below", Axis{Low: 0, High: nan}, 4, 100, 0, 100},
		{"fixed above", Axis{Low: nan, High: 7}, 4, 100, 4, 7},
		{"fixed the wrong way round", Axis{Low: 3, High: -2}, 0, 1, -2, 3},
		{"log and not above zero", Axis{Log: true, Low: -1, High: 100}, 1, 10, 1, 100},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := c.axis.span(c.low, c.high, false)
			if s.low != c.wantLow || s.high != c.wantHigh {
				t.Errorf("from %v to %v, want %v to %v", s.low, s.high, c.wantLow, c.wantHigh)
			}
		})
	}
}

func TestNumbers(t *testing.T) {
	for v, want := range map[float64]string{
		0: "0", 1: "1", -2.5: "−2.5", 0.3000000001: "0.3", 123456: "123460", 1e7: "1e7", -2.5e-7: "−2.5e−7", 0.985: "0.985",
		math.Inf(-1): "−∞", 1.23456789e-9: "1.235e−9",
	} {
		if got := number(v); got != want {
			t.Errorf("%v is written %q, want %q", v, got, want)
		}
	}
}

func TestLabels(t *testing.T) {
	for _, c := range []struct {
		axis  Axis
		power int
		want  string
	}{
		{Axis{Label: "time", Unit: "s"}, 0, "time (s)"}, {Axis{Label: "ratio"}, 0, "ratio"}, {Axis{Unit: "mm"}, 0, "mm"},
		{Axis{Label: "gain"}, 6, "gain (1e6)"}, {Axis{Label: "work", Unit: "J"}, -3, "work (1e−3 J)"},
		{Axis{Label: "radius less 1", Unit: "10⁻⁶"}, 0, "radius less 1 (1e−6)"}, {Axis{Label: "area", Unit: "mm²"}, 0, "area (mm²)"},
		{Axis{Label: "per area", Unit: "m⁻²"}, 0, "per area (m^−2)"},
	} {
		if got := c.axis.label(c.power); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
	}
}
