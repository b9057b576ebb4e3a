package gauge

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// vector is one case of testdata/vectors.json; vectors.py beside it made it.
type vector struct {
	Name           string
	Rate           float64
	Window         int
	X, Y           []float64
	NRMSE          float64
	AmplitudeRatio float64    `json:"amplitude_ratio"`
	PeakError      float64    `json:"peak_error"`
	PeakTarget     float64    `json:"peak_target"`
	Indicator      float64    `json:"indicator"`
	Center         [2]float64 `json:"center"`
	Axes           [2]float64
	Tilt           float64
	WindowRatio    float64 `json:"window_ratio"`
	Delay          float64
	FEI            [3]float64
}

func vectors(t *testing.T) []vector {
	t.Helper()
	text, err := os.ReadFile("testdata/vectors.json")
	if err != nil {
		t.Fatal(err)
	}
	var cases []vector
	if err := json.Unmarshal(text, &cases); err != nil {
		t.Fatal(err)
	}
	return cases
}

// TestBroadbandAgainstNumPy compares every gauge with NumPy and SciPy on the same
// samples.
func TestBroadbandAgainstNumPy(t *testing.T) {
	for _, v := range vectors(t) {
		g := NewTracking(v.Window)
		r := NewRecord(1/v.Rate, len(v.X)-1)
		g.Start(v.X[0], v.Y[0])
		r.Start(v.X[0], v.Y[0])
		for k := 1; k < len(v.X); k++ {
			g.Add(v.X[k], v.Y[k])
			r.Add(v.X[k], v.Y[k])
		}
		q, a := g.Subspace(), r.Finish()
		for _, c := range []struct {
			name                 string
			got, want, tolerance float64
		}{
			// Sums of a few thousand terms, each side rounding its own way.
			{"NRMSE", g.NRMSE(), v.NRMSE, 1e-13},
			{"amplitude ratio", g.AmplitudeRatio(), v.AmplitudeRatio, 1e-13},
			{"peak error", g.PeakError(), v.PeakError, 0},
			{"peak target", g.PeakTarget(), v.PeakTarget, 0},
			{"indicator", g.Indicator(), v.Indicator, 1e-11},
			{"centre x", q.CenterX, v.Center[0], 1e-12},
			{"centre y", q.CenterY, v.Center[1], 1e-12},
			{"major", q.Major, v.Axes[0], 1e-12},
			{"minor", q.Minor, v.Axes[1], 1e-11},
			{"tilt", q.Tilt, v.Tilt, 1e-11},
			{"window's ratio", q.AmplitudeRatio, v.WindowRatio, 1e-12},
			{"FEI amplitude", a.FEI.Amplitude, v.FEI[0], 1e-11},
			{"FEI delay", a.FEI.Delay, v.FEI[1], 1e-11},
			{"FEI frequency", a.FEI.Frequency, v.FEI[2], 1e-11},
			// The parabola divides rounding (10⁻¹⁶) by the bend of the peak,
			// 10⁻³ in the slowest case, and that in ticks of a few tens.
			{"correlation delay", a.Delay, v.Delay, 1e-10},
		} {
			if !(math.Abs(c.got-c.want) <= c.tolerance*math.Abs(c.want)) {
				t.Errorf("%s: %s %.17g, want %.17g", v.Name, c.name, c.got, c.want)
			}
		}
	}
}
