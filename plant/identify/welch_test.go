package identify

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"
)

// The vectors were computed by SciPy's welch, csd and coherence: see
// testdata/vectors.py.
func TestSpectraAreSciPys(t *testing.T) {
	text, err := os.ReadFile("testdata/welch.json")
	if err != nil {
		t.Fatal(err)
	}
	var vectors struct {
		Cases []struct {
			Tick      float64
			Segment   int
			X, Y      []float64
			Hz        []float64
			XX, YY    []float64
			XYRe      []float64 `json:"xy_re"`
			XYIm      []float64 `json:"xy_im"`
			HRe       []float64 `json:"h_re"`
			HIm       []float64 `json:"h_im"`
			Coherence []float64
		}
	}
	if err := json.Unmarshal(text, &vectors); err != nil {
		t.Fatal(err)
	}
	if len(vectors.Cases) != 4 {
		t.Fatalf("%d cases", len(vectors.Cases))
	}
	for _, c := range vectors.Cases {
		s, err := Welch(c.X, c.Y, c.Tick, c.Segment)
		if err != nil {
			t.Fatal(err)
		}
		if len(s.Hz) != len(c.Hz) {
			t.Fatalf("segment %d: %d frequencies, want %d", c.Segment, len(s.Hz), len(c.Hz))
		}
		near := func(what string, i int, got, want float64) {
			// 1e-9 relative: both are sums of some hundred products in double
			// precision.
			if math.Abs(got-want) > 1e-9*math.Abs(want) {
				t.Errorf("segment %d, bin %d: %s %v, want %v", c.Segment, i, what, got, want)
			}
		}
		for i := range c.Hz {
			near("frequency", i, s.Hz[i], c.Hz[i])
			if i == 0 {
				continue // the mean was taken out: all is rounding there
			}
			near("Sxx", i, s.XX[i], c.XX[i])
			near("Syy", i, s.YY[i], c.YY[i])
			near("coherence", i, s.Coherence(i), c.Coherence[i])
			want := complex(c.XYRe[i], c.XYIm[i])
			near("Sxy", i, cmplx.Abs(s.XY[i]-want)+cmplx.Abs(want), cmplx.Abs(want))
			h := complex(c.HRe[i], c.HIm[i])
			near("response", i, cmplx.Abs(s.Response(i)-h)+cmplx.Abs(h), cmplx.Abs(h))
		}
	}
}

func TestWelchRefuses(t *testing.T) {
	x := make([]float64, 10)
	for _, c := range []struct {
		name    string
		y       []float64
		tick    float64
		segment int
		want    string
	}{
		{"unequal lengths", x[:9], 1, 4, "10 samples of one signal but 9 of the other"},
		{"a segment beyond the record", x, 1, 11, "segment: 11 samples are not between 2 and the 10 of the record"},
		{"a segment of one", x, 1, 1, "segment: 1 samples are not between 2 and the 10 of the record"},
		{"no tick", x, 0, 4, "tick: 0 s is no time step"},
	} {
		if _, err := Welch(x, c.y, c.tick, c.segment); err == nil || err.Error() != c.want {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
}
