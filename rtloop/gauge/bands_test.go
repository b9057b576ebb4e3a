package gauge

import (
	"math"
	"testing"
)

// A sweep through a gain and a delay of whole ticks: every band that the sweep
// filled gives them back, and nothing is said of the others.
func TestBandsOfGainAndDelay(t *testing.T) {
	const rate, n, gain, late = 1000.0, 40000, 0.8, 12
	x := make([]float64, n)
	for k := range x {
		s := float64(k) / rate
		fade := math.Min(1, math.Min(s, n/rate-s)) // no jumps at the ends
		x[k] = fade * math.Sin(2*math.Pi*(0.5*s+9.5*s*s/80))
	}
	run := func(segment int) []Band {
		r := newRecord(1/rate, n, segment)
		r.Response = true
		r.Start(0, 0)
		for k := range x {
			r.Add(x[k], gain*x[max(0, k-late)])
		}
		return r.Finish().Bands
	}
	for _, segment := range []int{1 << 20, n / 4} {
		bands := run(segment)
		if len(bands) < 10 {
			t.Fatalf("%d bands", len(bands))
		}
		for i, b := range bands {
			// The cut ends of a segment leak a little power below the sweep.
			if b.Frequency < 0.08 || b.Frequency > 13 || i > 0 && b.Frequency <= bands[i-1].Frequency {
				t.Errorf("band at %g Hz", b.Frequency)
			}
			// What the delay moves out of a segment's end is missing: late/n of
			// a segment's power, more where a band holds only part of it.
			if b.Frequency > 0.7 && b.Frequency < 9 && (math.Abs(b.Amplitude-gain) > 0.02*gain || math.Abs(b.Delay-late/rate) > 0.05*late/rate) {
				t.Errorf("segments of %d, %g Hz: amplitude %g, delay %g s", segment, b.Frequency, b.Amplitude, b.Delay)
			}
		}
	}
	r := NewRecord(1/rate, n)
	r.Start(0, 0)
	r.Add(1, 1)
	if a := r.Finish(); a.Bands != nil {
		t.Errorf("bands that were not asked for: %v", a.Bands)
	}
}
