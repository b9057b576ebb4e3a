package figure

import (
	"flag"
	"math"
	"path/filepath"
	"testing"
)

var pictures = flag.String("pictures", "", "write every sample picture into this `directory`, to be looked at")

// samples are figures that use all there is.
func samples() map[string]Figure {
	n := 20000
	t, target, measured, off, low, high := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i := range t {
		t[i] = 30 * float64(i) / float64(n)
		env := math.Exp(-t[i] / 12)
		target[i] = 24 * env * math.Sin(2*math.Pi*0.9*t[i])
		measured[i] = 23.8 * env * math.Sin(2*math.Pi*0.9*(t[i]-0.008))
		off[i] = measured[i] - target[i]
		low[i], high[i] = measured[i]-3, measured[i]+3
		if t[i] > 12 && t[i] < 13 {
			measured[i] = math.NaN()
		}
	}
	time := Axis{Label: "time", Unit: "s"}
	history := Figure{
		Title: "target and measured displacement, channel damper",
		Panels: []Panel{
			{X: time, Y: Axis{Label: "displacement", Unit: "mm"}, Share: 1.4,
				Lines: []Line{{Name: "target", X: t, Y: target}, {Name: "measured, with a gap", X: t, Y: measured, Low: low, High: high}}},
			{Title: "error", X: time, Y: Axis{Label: "error", Unit: "mm"}, Lines: []Line{{Name: "measured − target", X: t, Y: off}},
				Levels: []Level{{Name: "trips at 25 mm", Value: 25}, {Name: "accepted 1 mm", Value: 1}, {Name: "−1 mm", Value: -1}}},
		},
	}
	trail := Figure{Title: "synchronization subspace", Width: 120, Height: 110, Panels: []Panel{{
		X: Axis{Label: "target", Unit: "mm"}, Y: Axis{Label: "measured", Unit: "mm"}, Equal: true,
		Lines: []Line{{Name: "trail", X: target, Y: measured}, {Name: "equal", X: []float64{-30, 30}, Y: []float64{-30, 30}}},
	}}}
	var hz, gain, late, bound []float64
	for i := range 60 {
		f := 0.1 * math.Pow(500, float64(i)/59)
		hz = append(hz, f)
		gain = append(gain, 1/math.Hypot(1, f/25))
		late = append(late, 8+6/(1+f*f/100))
		bound = append(bound, 1)
	}
	response := Figure{Title: "frequency response", Panels: []Panel{
		{X: Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: Axis{Label: "amplitude", Log: true},
			Lines: []Line{{Name: "actuator", X: hz, Y: gain}, {Name: "bound", X: hz, Y: bound}}},
		{X: Axis{Label: "frequency", Unit: "Hz", Log: true}, Y: Axis{Label: "delay", Unit: "ms", Low: 0, High: math.NaN()},
			Lines: []Line{{Name: "actuator", X: hz, Y: late, Points: true, Joined: true}}, Levels: []Level{{Name: "3 Hz", Value: 3, Vertical: true}}},
	}}
	m := &Map{Label: "spectral radius", Contours: []float64{1}, Below: "below 1", Edge: 1}
	for i := range 81 {
		m.X = append(m.X, float64(i)*0.5)
		m.Y = append(m.Y, float64(i)*0.25)
	}
	for iy := range 81 {
		row := make([]float64, 81)
		for ix := range row {
			x, y := m.X[ix], m.Y[iy]
			row[ix] = 0.98 + 0.0008*math.Hypot(x-18, 2*(y-7)) + 0.002*math.Sin(x/3)
			if x > 36 && y > 17 {
				row[ix] = math.NaN()
			}
			if x < 1 {
				row[ix] = math.Inf(1)
			}
		}
		m.Z = append(m.Z, row)
	}
	chart := Figure{Title: "stability: largest eigenvalue of one tick", Panels: []Panel{{
		X: Axis{Label: "actuator delay", Unit: "ms"}, Y: Axis{Label: "assumed delay", Unit: "ms"}, Map: m,
		Marks: []Mark{{Name: "working point", X: 14, Y: 9}}, Levels: []Level{{Name: "identified", Value: 8, Vertical: true}}}}}
	terrain := *m
	terrain.Label, terrain.Unit, terrain.Contours = "added damping", "%", []float64{0.985, 0.99, 0.995, 1, 1.005, 1.01}
	contours := Figure{Panels: []Panel{{Title: "bands between contours", X: Axis{Label: "a", Unit: "ms", Log: true, Low: 0.5, High: 40}, Y: Axis{Label: "b"}, Map: &terrain}}}
	many := Panel{Title: "every pen", X: time, Y: Axis{Label: "something small", Unit: "m"}}
	for i := range 9 {
		l := Line{Name: "line number " + string(rune('A'+i)), Points: i%2 == 1, Joined: i%4 == 1}
		for k := range 25 {
			l.X = append(l.X, float64(k))
			l.Y = append(l.Y, 1e-7*(float64(i)+math.Sin(float64(k+i)/4)))
		}
		many.Lines = append(many.Lines, l)
	}
	return map[string]Figure{
		"history": history, "trail": trail, "response": response, "map": chart, "contours": contours,
		"pens":  {Panels: []Panel{many}, Height: 90},
		"empty": {Title: "nothing at all <b>&\x00\xff", Panels: []Panel{{X: time, Y: Axis{Label: "y"}}}},
		"constant": {Title: "a title that is so long that it does not fit into one row of this figure and must be broken into two of them, or even three, to be read", Width: 90,
			Panels: []Panel{{X: time, Y: Axis{Label: "force", Unit: "kN"}, Lines: []Line{{Name: "held", X: []float64{0, 1, 2}, Y: []float64{5e6, 5e6, 5e6}}}}}},
	}
}

// TestSamples writes every sample both ways, twice, to the same bytes.
func TestSamples(t *testing.T) {
	for name, f := range samples() {
		t.Run(name, func(t *testing.T) {
			for i, draw := range []func(Figure) ([]byte, error){Figure.SVG, Figure.PNG} {
				if i == 1 && name != "map" && name != "constant" {
					break // pixels take time, and are made of the same
				}
				a, err := draw(f)
				if err != nil {
					t.Fatal(err)
				}
				if b, _ := draw(f); string(a) != string(b) {
					t.Error("drawn twice, two pictures")
				}
			}
			if *pictures == "" {
				return
			}
			for _, ending := range []string{".png", ".svg"} {
				if err := Save(filepath.Join(*pictures, name+ending), f, true); err != nil {
					t.Fatal(err)
				}
			}
		})
	}
}
