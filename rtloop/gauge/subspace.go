package gauge

import "math"

// Ellipse is the synchronization subspace: the ellipse that has the same second
// moments as the trail (x, y) over the trailing window. With the variances
// σ_xx, σ_yy and the covariance σ_xy about the centre, λ₁ ≥ λ₂ the eigenvalues
// of [σ_xx σ_xy; σ_xy σ_yy], a the area swept about the centre per step and ω̂ the
// rms frequency of x per tick:
//
//	Major, Minor    √(2λ₁), √(2λ₂), m
//	Tilt            angle of the major axis from the x axis, rad, in (−π/2, π/2]
//	AmplitudeRatio  √(σ_yy/σ_xx)
//	ω̂              2·asin(½·√(mean(Δx²)/σ_xx))
//	Phase           atan2(2a/sin ω̂, 2σ_xy), rad, positive when y is late
//	Delay           Phase/ω̂, ticks
//
// All of it is exact for sines x = A·sin ωt, y = g·A·sin(ωt−φ) over whole periods:
// then σ_xy = ½A²g·cos φ, a = ½A²g·sin ω·sin φ and mean(Δx²) = 2A²·sin²(ω/2).
//
// A point has Major = Minor = 0. The angles and ratios are NaN where the motion
// they are taken of is none, or is below a millionth of what the last two
// windows saw, where rounding would speak instead.
type Ellipse struct {
	CenterX, CenterY float64 // m
	Major, Minor     float64 // semi-axes, m
	Tilt             float64 // rad
	AmplitudeRatio   float64
	Phase            float64 // rad
	Delay            float64 // ticks
}

// stillness is the share of the largest second moments of late below which a
// window counts as still. The running sums of n ticks err by about √(2n)·10⁻¹⁶ of
// the largest they held: 10⁻¹³ for a window of 10⁶ ticks.
const stillness = 1e-12

// Subspace returns the ellipse of the trailing window.
func (t *Tracking) Subspace() Ellipse {
	samples, steps := t.at, t.at-1
	if t.full {
		samples = len(t.ring)
		steps = min(t.ticks+t.at, samples)
	}
	n := float64(samples)
	center := point{t.running.x / n, t.running.y / n}
	m := t.running.about(center, samples, point{t.last.x - t.gone.x, t.last.y - t.gone.y})

	q := Ellipse{CenterX: t.anchor.x + center.x, CenterY: t.anchor.y + center.y}
	nan := math.NaN()
	q.Tilt, q.AmplitudeRatio, q.Phase, q.Delay = nan, nan, nan, nan
	xx, yy, xy := m.xx/n, m.yy/n, m.xy/n
	movesX := m.xx > stillness*(t.base.xx+t.fresh.xx)
	movesY := m.yy > stillness*(t.base.yy+t.fresh.yy)
	if !movesX {
		xx, xy = 0, 0
	}
	if !movesY {
		yy, xy = 0, 0
	}
	if math.IsNaN(m.xx + m.yy) {
		xx, yy, xy = nan, nan, nan
	}

	half, mean := (xx-yy)/2, (xx+yy)/2
	radius := math.Hypot(half, xy)
	q.Major = math.Sqrt(2 * (mean + radius))
	if mean+radius > 0 {
		// λ₂ = det/λ₁ keeps more digits than mean − radius.
		q.Minor = math.Sqrt(2 * max(0, (xx*yy-xy*xy)/(mean+radius)))
		q.Tilt = math.Atan2(xy, half) / 2
	}
	if !movesX {
		return q
	}
	q.AmplitudeRatio = math.Sqrt(yy / xx)
	half = math.Sqrt(m.step/float64(steps)/xx) / 2 // sin(ω̂/2)
	if !movesY || steps < 2 || !(half > 0 && half < 1) {
		return q
	}
	omega := 2 * math.Asin(half)
	q.Phase = math.Atan2(m.area/float64(steps)/math.Sin(omega), 2*xy) + 0 // never −0
	q.Delay = q.Phase / omega
	return q
}

// resting is the share of the peak target below which a motion says nothing of
// synchronization: what is left of it is noise of the sensors and the last
// ringing. A choice of ours.
const resting = 0.005

// AtRest reports whether the target has moved so little over the trailing
// window, against its peak so far, that the subspace says nothing: amplitude
// √(2σ_xx) below 0.5 % of the peak.
func (t *Tracking) AtRest() bool { return t.AtRestFor(t.peakTarget) }

// AtRestFor is AtRest against a peak, m, that is known otherwise.
func (t *Tracking) AtRestFor(peak float64) bool {
	e := t.Subspace()
	sin, cos := math.Sincos(e.Tilt) // NaN for a point, which has no axes
	return !(math.Hypot(e.Major*cos, e.Minor*sin) >= resting*peak)
}
