package identify

import "math"

// vagueFrom is the standard error of the lag, as a share of the total delay,
// from which the data do not tell delay from lag.
const (
	vagueFrom = 0.5
	// unsureFrom is where that is said.
	unsureFrom = 0.1
)

// resolve looks whether the data can tell delay from lag. To a narrow band of
// frequencies a lag is a delay and a little less gain. Where that is all there
// is, "lag-delay" becomes a delay alone, which is right in that band, and the
// standard errors say how far the truth may be: all of it may be lag.
func (f *fitter) resolve(res *Result) error {
	full := res.LagDelay
	if s := res.Second; !(s.Lag.Sigma <= vagueFrom*s.Total.Value) || !(s.Frequency.Sigma <= s.Frequency.Value/2) {
		s.Vague = true
		// The search has ended somewhere on a ridge: the lag may be anything from
		// none to all of the delay, and how it bends is not known.
		s.Delay.Sigma = max(s.Delay.Sigma, s.Total.Value)
		s.Lag.Sigma = max(s.Lag.Sigma, s.Total.Value)
		s.Gain.Sigma = max(s.Gain.Sigma, full.Gain.Sigma)
		s.Frequency.Sigma, s.Damping.Sigma = math.Inf(1), math.Inf(1)
	}
	if full.Lag.Sigma <= vagueFrom*full.Total.Value {
		return nil
	}
	start := []float64{max(full.Phase.Value, 0)}
	skip := full.evid.skip
	got, err := f.search(delayShape(f.rec.Tick), start, skip, rounds)
	if err != nil {
		return err
	}
	fit := &Fit{Kind: full.Kind, shape: delayShape(f.rec.Tick), AtRest: full.AtRest, Vague: true}
	if err := f.conclude(fit, got, skip); err != nil {
		return err
	}
	whole := fit.Delay.Value
	fit.Lag = Estimate{0, min(full.Lag.Sigma, whole)}
	fit.Delay.Sigma = math.Hypot(fit.Delay.Sigma, fit.Lag.Sigma)
	// With the lag L: total = phase + L − atan(ωL)/ω, gain = amplitude·√(1+ω²L²).
	omega := 2 * math.Pi * f.spectrum.speed
	bend := fit.Lag.Sigma
	if omega > 0 {
		bend -= math.Atan(omega*bend) / omega
	}
	fit.Total.Sigma = math.Hypot(fit.Total.Sigma, bend)
	fit.Gain.Sigma = math.Hypot(fit.Gain.Sigma, math.Abs(fit.Gain.Value)*(math.Hypot(1, omega*fit.Lag.Sigma)-1))
	res.LagDelay = fit
	return nil
}
