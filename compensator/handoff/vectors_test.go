package handoff

import (
	"encoding/csv"
	"fmt"
	"math"
	"strconv"
	"strings"
	"testing"

	"antelag/compensator"
)

// read reads vectors as any program would.
func read(t testing.TB, text string) []row {
	t.Helper()
	records, err := csv.NewReader(strings.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(records[0], ",") + "\n"; got != vectorsHeader {
		t.Fatalf("header %q", got)
	}
	var out []row
	for _, r := range records[1:] {
		var v [6]float64
		for i := range v {
			if v[i], err = strconv.ParseFloat(r[2+i], 64); err != nil {
				t.Fatal(err)
			}
		}
		x := row{in: compensator.Input{X: v[0], V: v[1], A: v[2], Y: v[3], R: v[4]}, u: v[5], call: -1}
		for i, word := range callWords {
			if word == r[1] {
				x.call = call(i)
			}
		}
		out = append(out, x)
	}
	return out
}

// The vectors are what the very compensator commands: read back from the file
// and run through another instance of it, they come to the same bits. They are
// exact in float, stay within the limits, and use every call.
func TestVectors(t *testing.T) {
	tight := Limits{1e-3, 2e-3, 1, 1e-5}
	for _, c := range []struct {
		rate   float64
		limits Limits
		of     []variant
	}{{200, noLimits, variants()}, {512, usual, variants()}, {700, tight, variants()[:len(methods)]}} {
		for _, v := range c.of {
			what := fmt.Sprintf("%v at %v Hz, limits %v", v, c.rate, c.limits)
			files, r := written(t, of(t, v, c.rate, c.limits))
			rows := read(t, files["vectors.csv"])
			replay(t, what, v, c.rate, rows)
			within(t, what, c.limits, c.rate, rows)
			p, got := peaksOf(rows), r.Channels[0]
			if got.Peak != p.u || got.Steps != steps(rows) || got.DoubleBound != 1e-12*p.u || !(got.FloatBound >= got.DoubleBound && got.FloatBound < 0.1*p.u) {
				t.Errorf("%s: reported %+v", what, got)
			}
			if c.limits == noLimits && !(p.x > 0.01 && p.x < 0.04) {
				t.Errorf("%s: the target goes to %v m", what, p.x)
			}
		}
	}
}

func replay(t *testing.T, what string, v variant, rate float64, rows []row) {
	t.Helper()
	e, err := compensator.Kinds.Find(v.kind)
	if err != nil {
		t.Fatal(err)
	}
	comp, err := e.New(1/rate, v.values(t))
	if err != nil {
		t.Fatal(err)
	}
	counts := [len(callWords)]int{}
	for i := range rows {
		r := &rows[i]
		counts[r.call]++
		u := r.u
		switch r.call {
		case initCall, resetCall:
			comp.Start(r.in.X, r.in.Y)
			u = comp.Command(r.in)
			comp.Start(r.in.X, r.in.Y)
		case primeCall:
			comp.Prime(r.in, r.u)
		case stepCall:
			u = comp.Command(r.in)
		}
		if u != r.u {
			t.Fatalf("%s: row %d: %v, want %v", what, i, u, r.u)
		}
		for _, x := range []float64{r.in.X, r.in.V, r.in.A, r.in.Y, r.in.R} {
			if float64(float32(x)) != x {
				t.Fatalf("%s: row %d: %v is not exact in float", what, i, x)
			}
		}
	}
	if rows[0].call != initCall || counts[initCall] != 1 || counts[resetCall] != 2 || counts[primeCall] < 500 || counts[stepCall] < 2*fewestTicks {
		t.Errorf("%s: calls %v", what, counts)
	}
}

// within holds the rows to the limits, a tenth below them, as the guard's text
// states them.
func within(t *testing.T, what string, l Limits, rate float64, rows []row) {
	t.Helper()
	x, u := 0.0, 0.0
	for i := range rows {
		in, r := &rows[i].in, &rows[i]
		if r.call == initCall || r.call == resetCall {
			x, u = in.X, r.u
		}
		for _, c := range []struct {
			name       string
			got, limit float64
		}{
			{"target", in.X, min(l.Stroke, 1000)}, {"measured", in.Y, l.Stroke}, {"command", r.u, l.Stroke},
			{"velocity", in.V, l.Velocity}, {"jump", (in.X - x) * rate, l.Velocity}, {"command's jump", (r.u - u) * rate, l.Velocity},
			{"force", in.R, l.Force}, {"error", x - in.Y, l.Error},
		} {
			if !(math.Abs(c.got) <= 0.9000001*c.limit) {
				t.Fatalf("%s: row %d: %s %v, limit %v", what, i, c.name, c.got, c.limit)
			}
		}
		x, u = in.X, r.u
	}
}

// The input is rich enough that what adapts does, and comes to its bounds.
func TestVectorsTeach(t *testing.T) {
	for _, c := range []struct {
		v           variant
		coefficient string
		least, most float64 // what it goes to, at least
	}{
		{variant{"delay-seeking", nil}, "delay", 0.006, 0.013},
		{variant{"least-squares-polynomial", map[string]any{"adapt": "delay-and-amplitude"}}, "delay", 0.006, 0.013},
		{variant{"least-squares-polynomial", map[string]any{"adapt": "delay-and-amplitude"}}, "amplitude", 0.97, 1.03},
		{variant{"adaptive-inverse", nil}, "delay", 0, 0.025},
		{variant{"adaptive-time-series", nil}, "delay", 0, 0.02},
		{variant{"adaptive-time-series", nil}, "a0", 0.95, 1.05},
	} {
		files, _ := written(t, of(t, c.v, 2048, noLimits))
		e, _ := compensator.Kinds.Find(c.v.kind)
		comp, err := e.New(1.0/2048, c.v.values(t))
		if err != nil {
			t.Fatal(err)
		}
		low, high := math.Inf(1), math.Inf(-1)
		for _, r := range read(t, files["vectors.csv"]) {
			switch r.call {
			case initCall, resetCall:
				comp.Start(r.in.X, r.in.Y)
			case primeCall:
				comp.Prime(r.in, r.u)
			case stepCall:
				comp.Command(r.in)
			}
			for _, q := range comp.Coefficients(nil) {
				if q.Name == c.coefficient {
					low, high = min(low, q.Value), max(high, q.Value)
				}
			}
		}
		if !(low <= c.least && high >= c.most) {
			t.Errorf("%v: %s went from %v to %v, want %v to %v", c.v, c.coefficient, low, high, c.least, c.most)
		}
	}
}
