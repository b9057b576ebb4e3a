package gauge

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// agrees says whether got is want to a relative tolerance.
func agrees(got, want, relative float64) bool {
	return math.Abs(got-want) <= relative*math.Abs(want)
}

// within says whether got is want to an absolute tolerance; NaN is within of NaN.
func within(got, want, absolute float64) bool {
	return math.IsNaN(got) && math.IsNaN(want) || math.Abs(got-want) <= absolute
}

// sine is gain g and phase lag φ on a sine: period ticks, amplitude m, means m.
type sine struct {
	period    int
	amplitude float64
	gain, lag float64
	meanX     float64
	meanY     float64
}

func (s sine) at(k int) (x, y float64) {
	a := 2 * math.Pi * float64(k) / float64(s.period)
	return s.meanX + s.amplitude*math.Sin(a), s.meanY + s.gain*s.amplitude*math.Sin(a-s.lag)
}

var sines = []sine{
	{period: 512, amplitude: 0.03, gain: 1, lag: 0.2},
	{period: 512, amplitude: 0.03, gain: 0.9, lag: -0.15},
	{period: 96, amplitude: 0.002, gain: 1.1, lag: 1.2, meanX: 0.05, meanY: -0.04},
	{period: 20, amplitude: 0.01, gain: 0.7, lag: 2.5},
	{period: 800, amplitude: 0.1, gain: 1, lag: 0.001, meanX: 1, meanY: 1},
}

func (s sine) String() string {
	return fmt.Sprintf("period %d gain %g lag %g", s.period, s.gain, s.lag)
}

// TestSineClosedForms: five periods, window two. The trail is the ellipse of a
// gain and a phase lag, whose indicator, axes and ratios are known.
func TestSineClosedForms(t *testing.T) {
	for _, s := range sines {
		g := NewTracking(2 * s.period)
		g.Start(s.at(0))
		const periods = 5
		for k := 1; k <= periods*s.period; k++ {
			g.Add(s.at(k))
		}
		omega := 2 * math.Pi / float64(s.period)
		// The trail is a polygon inscribed in the ellipse: its area is smaller by
		// sin(ω)/ω. The means enclose nothing over whole periods.
		cycle := math.Pi * s.amplitude * s.amplitude * s.gain * math.Sin(s.lag) * math.Sin(omega) / omega
		// Rounding: terms of size mean·amplitude, a few thousand of them.
		scale := (s.amplitude + math.Abs(s.meanX)) * s.amplitude * float64(s.period)
		if !within(g.Indicator(), periods*cycle, 1e-14*scale) {
			t.Errorf("%v: indicator %v, want %v", s, g.Indicator(), periods*cycle)
		}

		q := g.Subspace()
		// Eigenvalues of ½A²·[1, g·cos φ; g·cos φ, g²].
		trace, det := 1+s.gain*s.gain, s.gain*s.gain*math.Pow(math.Sin(s.lag), 2)
		root := math.Sqrt(trace*trace/4 - det)
		for _, c := range []struct {
			name            string
			got, want, near float64
		}{
			// Window sums of terms up to the anchored amplitude; 10⁻¹² leaves room
			// for the small minor axis, whose square is a difference.
			{"centre x", q.CenterX, s.meanX, 1e-14},
			{"centre y", q.CenterY, s.meanY, 1e-14},
			{"major", q.Major, s.amplitude * math.Sqrt(trace/2+root), 1e-13},
			{"minor", q.Minor, s.amplitude * math.Sqrt(det/(trace/2+root)), 1e-12},
			{"tilt", q.Tilt, math.Atan2(2*s.gain*math.Cos(s.lag), 1-s.gain*s.gain) / 2, 1e-10},
			{"ratio", q.AmplitudeRatio, s.gain, 1e-12},
			{"phase", q.Phase, s.lag, 1e-10},
			{"delay", q.Delay, s.lag / omega, 1e-8},
		} {
			if !within(c.got, c.want, c.near) {
				t.Errorf("%v: %s %v, want %v", s, c.name, c.got, c.want)
			}
		}
		if s.meanX != 0 {
			continue
		}
		// The start sample and its image a period later both count: Σx² still is
		// n/2·A², n the ticks, for a sine that starts at zero; not so Σy².
		n := float64(periods * s.period)
		_, first := s.at(0)
		want := math.Sqrt(s.gain*s.gain + first*first/(n/2*s.amplitude*s.amplitude))
		if !agrees(g.AmplitudeRatio(), want, 1e-12) {
			t.Errorf("%v: amplitude ratio %v, want %v", s, g.AmplitudeRatio(), want)
		}
		errors := 1 + s.gain*s.gain - 2*s.gain*math.Cos(s.lag)
		want = math.Sqrt(errors + first*first/(n/2*s.amplitude*s.amplitude))
		if !agrees(g.NRMSE(), want, 1e-12) {
			t.Errorf("%v: NRMSE %v, want %v", s, g.NRMSE(), want)
		}
		// The error is a sine too; ticks fall within half a tick of its peak.
		peak := s.amplitude * math.Sqrt(errors)
		if g.PeakError() > peak*(1+1e-12) || g.PeakError() < peak*math.Cos(omega/2)*(1-1e-12) {
			t.Errorf("%v: peak error %v, want just below %v", s, g.PeakError(), peak)
		}
		if g.PeakTarget() != s.amplitude || g.PeakErrorRatio() != g.PeakError()/s.amplitude {
			t.Errorf("%v: peak target %v, ratio %v", s, g.PeakTarget(), g.PeakErrorRatio())
		}
	}
}

// TestPerfectTrackingIsNoError: an actuator that does exactly what it is told
// gives zeros, not rounding.
func TestPerfectTrackingIsNoError(t *testing.T) {
	g := NewTracking(100)
	g.Start(1.5, 1.5)
	for k := range 1000 {
		v := 1.5 + math.Sin(float64(k)/10)
		g.Add(v, v)
	}
	q := g.Subspace()
	if g.NRMSE() != 0 || g.PeakError() != 0 || g.PeakErrorRatio() != 0 || g.AmplitudeRatio() != 1 {
		t.Errorf("NRMSE %v, peak error %v, amplitude ratio %v", g.NRMSE(), g.PeakError(), g.AmplitudeRatio())
	}
	// λ₂ is the rounding of a determinant: its root is at most about √10⁻¹⁶.
	if q.AmplitudeRatio != 1 || q.Phase != 0 || q.Delay != 0 || q.Tilt != math.Pi/4 || q.Minor > 3e-8*q.Major {
		t.Errorf("subspace %+v", q)
	}
}

// TestUndefinedIsNaN: nothing that did not move has a ratio or an angle.
func TestUndefinedIsNaN(t *testing.T) {
	type still struct{ x, y float64 }
	for _, c := range []still{{0, 0}, {0.1, 0.1}, {0.1, 0}, {0, 0.3}} {
		for _, moveX := range []float64{0, 1} {
			for _, moveY := range []float64{0, 1} {
				if moveX == 1 && moveY == 1 {
					continue
				}
				g := NewTracking(37)
				g.Start(c.x, c.y)
				for k := range 200 {
					s := math.Sin(float64(k))
					g.Add(c.x+moveX*s, c.y+moveY*s)
				}
				q := g.Subspace()
				if !math.IsNaN(q.Phase) || !math.IsNaN(q.Delay) {
					t.Errorf("%v moving %v, %v: phase %v, delay %v", c, moveX, moveY, q.Phase, q.Delay)
				}
				if (moveX == 0) != math.IsNaN(q.AmplitudeRatio) {
					t.Errorf("%v moving %v, %v: ratio %v", c, moveX, moveY, q.AmplitudeRatio)
				}
				if moveX == 1 && !within(q.AmplitudeRatio, 0, 0) {
					t.Errorf("%v moving x: ratio %v, want 0", c, q.AmplitudeRatio)
				}
				if moveX+moveY == 0 && (q.Major != 0 || q.Minor != 0 || !math.IsNaN(q.Tilt)) {
					t.Errorf("%v still: %+v", c, q)
				}
				undefined := c.x == 0 && moveX == 0
				if undefined != math.IsNaN(g.NRMSE()) || undefined != math.IsNaN(g.AmplitudeRatio()) ||
					undefined != math.IsNaN(g.PeakErrorRatio()) {
					t.Errorf("%v moving %v, %v: NRMSE %v, ratios %v %v", c, moveX, moveY,
						g.NRMSE(), g.AmplitudeRatio(), g.PeakErrorRatio())
				}
			}
		}
	}
}

// TestMotionThatStopsIsStill: two windows after the motion has stopped, and also
// sooner, what is left of the running sums is not taken for motion.
func TestMotionThatStopsIsStill(t *testing.T) {
	g := NewTracking(50)
	g.Start(0.3, 0.2)
	for k := range 1013 {
		g.Add(0.3+math.Sin(float64(k)/7), 0.2+math.Sin(float64(k)/7-0.3))
	}
	for k := range 300 {
		g.Add(0.7, 0.6)
		if q := g.Subspace(); k >= 50 && (!math.IsNaN(q.AmplitudeRatio) || q.Major != 0) {
			t.Fatalf("%d ticks after the motion stopped: %+v", k+1, q)
		}
	}
}

// TestWindowDoesNotDrift: after 10⁷ ticks with an offset a thousand times the
// motion, wandering, the window's ellipse is that of its samples alone.
func TestWindowDoesNotDrift(t *testing.T) {
	const window, ticks = 1009, 10_000_000
	random := rand.New(rand.NewPCG(3, 4))
	var table [7919]point // longer than the window and prime to it
	for k := range table {
		a, n := 2*math.Pi*14*float64(k)/float64(len(table)), random.Float64()
		table[k] = point{0.03*math.Sin(a) + 0.001*n, 0.028*math.Sin(a-0.1) + 0.002*n}
	}
	motion := func(k int) (x, y float64) {
		p := table[k%len(table)]
		return 30 + 2e-8*float64(k) + p.x, -20 + p.y
	}
	g := NewTracking(window)
	x0, y0 := motion(0)
	g.Start(x0, y0)
	var kept []point
	for k := 1; k <= ticks; k++ {
		x, y := motion(k)
		g.Add(x, y)
		if k >= ticks-window { // one more, from which the first step comes
			kept = append(kept, point{x, y})
		}
	}
	got, want := g.Subspace(), ellipseOf(kept)
	for _, c := range [][3]float64{
		{got.CenterX, want.CenterX, 1e-12},
		{got.CenterY, want.CenterY, 1e-12},
		{got.Major, want.Major, 1e-12},
		// λ₂ is a hundred times smaller than λ₁ and takes its rounding.
		{got.Minor, want.Minor, 1e-11},
		{got.Tilt, want.Tilt, 1e-12},
		{got.AmplitudeRatio, want.AmplitudeRatio, 1e-12},
		{got.Phase, want.Phase, 1e-11},
		{got.Delay, want.Delay, 1e-11},
	} {
		if !agrees(c[0], c[1], c[2]) {
			t.Errorf("after %d ticks\n got %+v\nwant %+v", ticks, got, want)
			break
		}
	}
}

// ellipseOf is the ellipse of the samples after the first, two passes, written
// down from the formulas of Ellipse.
func ellipseOf(s []point) Ellipse {
	n := float64(len(s) - 1)
	var q Ellipse
	for _, p := range s[1:] {
		q.CenterX += (p.x - s[0].x) / n
		q.CenterY += (p.y - s[0].y) / n
	}
	q.CenterX += s[0].x
	q.CenterY += s[0].y
	var xx, yy, xy, area, step float64
	for k, p := range s[1:] {
		u, w := p.x-q.CenterX, p.y-q.CenterY
		ou, ow := s[k].x-q.CenterX, s[k].y-q.CenterY
		xx += u * u / n
		yy += w * w / n
		xy += u * w / n
		area += (ou*w - u*ow) / 2 / n
		step += (u - ou) * (u - ou) / n
	}
	mean, radius := (xx+yy)/2, math.Hypot((xx-yy)/2, xy)
	q.Major, q.Minor = math.Sqrt(2*(mean+radius)), math.Sqrt(2*(mean-radius))
	q.Tilt = math.Atan2(2*xy, xx-yy) / 2
	q.AmplitudeRatio = math.Sqrt(yy / xx)
	omega := 2 * math.Asin(math.Sqrt(step/xx)/2)
	q.Phase = math.Atan2(2*area/math.Sin(omega), 2*xy)
	q.Delay = q.Phase / omega
	return q
}

// TestWindowAtEveryTick: from the first ticks through several wraps the window
// holds the samples it should.
func TestWindowAtEveryTick(t *testing.T) {
	const window = 23
	random := rand.New(rand.NewPCG(5, 6))
	g := NewTracking(window)
	samples := []point{{random.NormFloat64(), random.NormFloat64()}}
	g.Start(samples[0].x, samples[0].y)
	for k := 1; k < 120; k++ {
		p := point{random.NormFloat64(), random.NormFloat64()}
		samples = append(samples, p)
		g.Add(p.x, p.y)
		if k < window {
			continue
		}
		// Random steps are large, ω̂ may be none: the moments say enough.
		got, want := g.Subspace(), ellipseOf(samples[k-window:])
		if !agrees(got.Major, want.Major, 1e-12) || !agrees(got.Minor, want.Minor, 1e-12) ||
			!within(got.Phase, want.Phase, 1e-10) || !within(got.CenterX, want.CenterX, 1e-12) {
			t.Fatalf("tick %d\n got %+v\nwant %+v", k, got, want)
		}
	}
}

// TestStartForgets: a second run on the same gauges is as on new ones.
func TestStartForgets(t *testing.T) {
	used, fresh := NewTracking(31), NewTracking(31)
	used.Start(1, 2)
	for k := range 100 {
		used.Add(float64(k), -float64(k))
	}
	for _, g := range []*Tracking{used, fresh} {
		g.Start(0.5, 0.4)
		for k := range 77 {
			g.Add(math.Sin(float64(k)/9), math.Sin(float64(k)/9-0.1))
		}
	}
	if used.Subspace() != fresh.Subspace() || used.Indicator() != fresh.Indicator() ||
		used.NRMSE() != fresh.NRMSE() || used.PeakError() != fresh.PeakError() {
		t.Error("the first run shows in the second")
	}
}

func TestTrackingAddDoesNotAllocate(t *testing.T) {
	g := NewTracking(50)
	g.Start(0, 0)
	k := 0.0
	if n := testing.AllocsPerRun(1000, func() { k++; g.Add(k, -k) }); n != 0 {
		t.Errorf("%v allocations a tick", n)
	}
}
