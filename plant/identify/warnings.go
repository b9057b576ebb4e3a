package identify

import (
	"fmt"
	"math"
	"slices"

	"antelag/scenarios/quantity"
)

const (
	lowCoherence = 0.9
	// loose is the share of the motion that a good fit leaves at most: noise of
	// a worn sensor is below it.
	loose = 0.1
	// sure is how many standard errors a finding must be from nothing.
	sure = 4.0
	// plays is the half width of backlash, as a share of the rms motion, from
	// which it is said.
	plays = 0.01
)

func ms(t float64) string { return quantity.Format(t, quantity.Time) }
func mm(x float64) string { return quantity.Format(x, quantity.Length) }
func hz(f float64) string { return quantity.Format(f, quantity.Frequency) }
func speed(v float64) string {
	u, _ := quantity.ParseUnit("mm/s")
	return quantity.FormatIn(v, u, "mm/s", 3)
}

func (r *Result) warnf(format string, args ...any) {
	r.Warnings = append(r.Warnings, fmt.Sprintf(format, args...))
}

// warn says what the numbers alone do not.
func (f *fitter) warn(res *Result) {
	best := res.Best()
	if res.Fitted < res.Samples {
		res.warnf("The fit took %d of %d samples, from sample %d on, where the command moves the most; the frequency response is of all.", res.Fitted, res.Samples, res.From)
	}
	f.warnOfBounds(res, best)
	if best.Vague {
		what := fmt.Sprintf("between %s and %s", hz(res.Band[0]), hz(res.Band[1]))
		if f.spectrum.narrow {
			what = fmt.Sprintf("of one frequency, %s", hz(f.spectrum.speed))
		}
		res.warnf("Motion %s cannot tell delay from lag here: only their sum is sure, and all of it was put into the delay. Use a sweep or band noise up to higher frequencies.", what)
	} else if best.Lag.Sigma > unsureFrom*best.Total.Value {
		res.warnf("Delay and lag are sure to %s only, their sum to %s: the motion has too little at high frequency to tell them apart.", ms(best.Lag.Sigma), ms(best.Total.Sigma))
	} else if f.spectrum.narrow {
		res.warnf("The motion is of one frequency, %s; elsewhere the fit is a guess. Use a sweep or band noise.", hz(f.spectrum.speed))
	}
	f.warnOfCoherence(res)
	if best.NRMSE > loose {
		res.warnf("The fit leaves %.3g %% of the motion unexplained: noise, or an actuator of another kind.", 100*best.NRMSE)
	}
	f.warnOfSaturation(res, best)
	f.warnOfBacklash(res, best)
	warnOfAmplitude(res, best)
}

func (f *fitter) warnOfBounds(res *Result, best *Fit) {
	if best.Gain.Value <= 0 {
		res.warnf("The measured displacement runs against the command (gain %.3g): one of the two has the wrong sign.", best.Gain.Value)
	} else if v := best.Settings()["gain"].Num; v != best.Gain.Value {
		res.warnf("The gain is %.3g, which is none of an actuator: check the units of command and measured.", best.Gain.Value)
	}
	if f.first.total < -f.rec.Tick/2 {
		res.warnf("The measured displacement is ahead of the command, by about %s: is the column of the command the one of the target, or are its time stamps others? The delay was kept at 0.", ms(-f.first.total))
	}
	if best.Total.Value > 0.9*longestTime {
		res.warnf("The delay is as long as the fit can see, %s.", ms(longestTime))
	}
}

func (f *fitter) warnOfCoherence(res *Result) {
	if !(res.CoherenceMin < lowCoherence) {
		return
	}
	var low []float64
	worst := 0
	for i, b := range res.Response {
		if b.Coherence < lowCoherence {
			low = append(low, b.Hz)
		}
		if b.Coherence < res.Response[worst].Coherence {
			worst = i
		}
	}
	res.warnf("The coherence is below %g at %d of %d frequencies, down to %.2g at %s: noise, too little motion or an actuator that is not linear there.",
		lowCoherence, len(low), len(res.Response), res.CoherenceMin, hz(res.Response[worst].Hz))
}

// warnOfSaturation compares the largest speed and displacement measured with
// those that the fit wants. Speeds are means over a twentieth of the shortest
// period.
func (f *fitter) warnOfSaturation(res *Result, best *Fit) {
	s, skip := best.evid.state, best.evid.skip
	n := len(s.y)
	span := max(int(0.05/(res.Band[1]*f.rec.Tick)), 1)
	noise := math.Sqrt(meanSquare(best.evid.residual))
	var was, want []float64
	for k := skip + span; k < n; k += max(span/2, 1) {
		was = append(was, math.Abs(f.rec.Measured[k]-f.rec.Measured[k-span]))
		want = append(want, math.Abs(s.gain*(s.y[k]-s.y[k-span])))
	}
	if over, top := above(was, want, 1.05); over > 0.002 {
		width := float64(span) * f.rec.Tick
		res.warnf("The actuator never went faster than about %s where the fit wants up to %s: its flow or valve saturates. Fit a smaller motion.",
			speed(top/width), speed(slices.Max(want)/width))
	}
	was, want = was[:0], want[:0]
	for k := skip; k < n; k++ {
		was = append(was, math.Abs(f.rec.Measured[k]-s.offset))
		want = append(want, math.Abs(s.gain*s.y[k])-noise)
	}
	if over, top := above(was, want, 1.05); over > 0.002 {
		res.warnf("The actuator never went farther than %s where the fit wants up to %s: a stroke or range limit. Fit a smaller motion.",
			mm(top), mm(slices.Max(want)))
	}
}

// above is the share of the wanted values that exceed the largest measured one
// by a factor, and that largest.
func above(was, want []float64, factor float64) (share, top float64) {
	if len(was) == 0 {
		return 0, 0
	}
	top = slices.Max(was)
	over := 0
	for _, w := range want {
		if w > factor*top {
			over++
		}
	}
	if over < 5 {
		return 0, top
	}
	return float64(over) / float64(len(want)), top
}

// warnOfBacklash looks in the residual for what changes sign with the direction
// of motion, beside what a little more delay or gain would do: an actuator with
// play of half width b is b behind, one way and the other.
func (f *fitter) warnOfBacklash(res *Result, best *Fit) {
	s, skip, r := best.evid.state, best.evid.skip, best.evid.residual
	at := func(k int) float64 { return s.gain * s.y[k+skip] }
	top := 0.0
	for k := 1; k+1 < len(r); k++ {
		top = max(top, math.Abs(at(k+1)-at(k-1)))
	}
	cols := make([][]float64, 5)
	var rest []float64
	for k := 1; k+1 < len(r); k++ {
		v := at(k+1) - at(k-1)
		way := math.Max(-1, math.Min(1, v/(0.02*top)))
		bend := at(k+1) - 2*at(k) + at(k-1)
		for i, x := range []float64{way, v, at(k), bend, 1} {
			cols[i] = append(cols[i], x)
		}
		rest = append(rest, r[k])
	}
	b, ok := regress(cols, rest)
	if !ok {
		return
	}
	var wider float64
	cov := covariance(cols, leftover(cols, rest, b), &wider)
	if cov == nil {
		return
	}
	half := -b[0]
	if half > sure*math.Sqrt(cov.At(0, 0)) && half > plays*spread(s.y)*math.Abs(s.gain) {
		res.warnf("Measured is about %s behind one way and as much the other, at any speed: backlash or friction.", mm(half))
	}
}

// warnOfAmplitude says where the delay depends on how far the actuator moves: if
// it grows or falls steadily with the amplitude, or else if two groups differ.
func warnOfAmplitude(res *Result, best *Fit) {
	if len(res.Groups) < 2 {
		return
	}
	lo, hi := res.Groups[0], res.Groups[0]
	for _, g := range res.Groups {
		if g.Delay < lo.Delay {
			lo = g
		}
		if g.Delay > hi.Delay {
			hi = g
		}
	}
	far := hi.Delay - lo.Delay
	differ := far > sure*math.Hypot(lo.DelaySigma, hi.DelaySigma) && far > max(2e-4, 0.03*best.Phase.Value)
	first, last := res.Groups[0], res.Groups[len(res.Groups)-1]
	grows, reach := math.Abs(res.slope.Value), last.Amplitude-first.Amplitude
	if steady := grows > sure*res.slope.Sigma && grows*reach > max(2e-4, 0.02*best.Phase.Value); steady && !differ {
		lo, hi = first, last
	} else if !differ {
		return
	}
	res.warnf("The delay depends on the amplitude: %s at %s, %s at %s.",
		ms(lo.Delay), mm(lo.Amplitude), ms(hi.Delay), mm(hi.Amplitude))
}
