package margin

import (
	"bytes"
	"cmp"
	"encoding/json"
	"math"
	"slices"
	"strconv"

	"antelag/rtloop"
)

// ascending sorts and takes what stands twice out.
func ascending(v []float64) []float64 {
	slices.SortFunc(v, cmp.Compare)
	return slices.Compact(v)
}

// CSV is the map as a table, a row a cell, SI: the two settings, spectral radius,
// damping ratio of the least damped mode, and 1 where the loop is stable. Cells that
// make no test are empty.
func (g *Grid) CSV() []byte {
	var b bytes.Buffer
	b.WriteString(g.X.Column() + "," + g.Y.Column() + ",spectral_radius,damping_ratio,stable\n")
	number := func(v float64) {
		if !math.IsNaN(v) {
			b.WriteString(strconv.FormatFloat(v, 'g', -1, 64))
		}
	}
	for iy := range g.Y.N {
		for ix := range g.X.N {
			number(g.X.At(ix))
			b.WriteByte(',')
			number(g.Y.At(iy))
			b.WriteByte(',')
			number(g.Radius[iy][ix])
			b.WriteByte(',')
			number(g.Damping[iy][ix])
			b.WriteByte(',')
			if stable, ok := g.Stable(ix, iy); ok {
				b.WriteByte("01"[truth(stable)])
			}
			b.WriteByte('\n')
		}
	}
	return b.Bytes()
}

func truth(b bool) int {
	if b {
		return 1
	}
	return 0
}

// MarshalJSON writes the map, SI, null where settings make no test.
func (g *Grid) MarshalJSON() ([]byte, error) {
	type axis struct {
		Path   string        `json:"path"`
		Unit   string        `json:"unit"`
		Values []float64     `json:"values"`
		At     rtloop.Figure `json:"at"` // of the scenario itself
	}
	side := func(r *Range, at float64) axis {
		return axis{r.Path, r.Setting.Dim.SI(), values(r), rtloop.Figure(at)}
	}
	return json.Marshal(struct {
		Scenario string            `json:"scenario"`
		Lane     string            `json:"lane"`
		X        axis              `json:"x"`
		Y        axis              `json:"y"`
		Radius   [][]rtloop.Figure `json:"spectral_radius"` // [y][x]
		Damping  [][]rtloop.Figure `json:"damping_ratio"`
		Refused  int               `json:"refused"`
	}{g.Scenario, g.Lane, side(&g.X, g.AtX), side(&g.Y, g.AtY), figures(g.Radius), figures(g.Damping), g.Refused})
}

func figures(v [][]float64) [][]rtloop.Figure {
	out := make([][]rtloop.Figure, len(v))
	for i, row := range v {
		for _, x := range row {
			out[i] = append(out[i], rtloop.Figure(x))
		}
	}
	return out
}
