package identify

import "math"

// Standard errors of the lag, as shares of the total delay: from which the data
// do not tell delay from lag, and from which they do so poorly.
const (
	vagueFrom  = 0.5
	unsureFrom = 0.1
)

// resolve looks whether the data can tell delay from lag. To a narrow band of
// frequencies a lag is a delay and a little less gain. Where that is all there
// is, "lag-delay" becomes a delay alone, which is right in that band, and the
// standard errors say how far the truth may be: all of it may be lag.
func (f *fitter) resolve(res *Result) error {
	full := res.LagDelay
	if s := res.Second; !(s.Lag.Sigma <= vagueFrom*s.Total.Value) || !(s.Frequency.Sigma <= s.Frequency.Value/2) {
		f.widen(s, full)
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
	f.bend(fit)
	res.LagDelay = fit
	return nil
}

// widen makes the errors of a vague second-order fit as large as what it may be
// wrong by. Its search has ended somewhere on a ridge: the lag may be anything
// from none to all of the delay, and how it bends is not known. What both kinds
// know is as sure as that of "lag-delay", beside it.
func (f *fitter) widen(s, plain *Fit) {
	s.Vague = true
	for _, e := range []struct{ mine, other *Estimate }{{&s.Gain, &plain.Gain}, {&s.Total, &plain.Total}, {&s.Phase, &plain.Phase}} {
		if !(e.mine.Sigma <= e.mine.Value) { // not to be taken seriously
			e.mine.Sigma = e.other.Sigma
		}
	}
	s.Delay.Sigma, s.Lag.Sigma = s.Total.Value, s.Total.Value
	s.Frequency.Sigma, s.Damping.Sigma = math.Inf(1), math.Inf(1)
	f.bend(s)
}

// bend widens total and gain by what a lag L that is not known does to them:
// total = phase + L − atan(ωL)/ω, gain = amplitude·√(1+ω²L²).
func (f *fitter) bend(fit *Fit) {
	omega, lag := 2*math.Pi*f.spectrum.speed, fit.Lag.Sigma
	if !(omega > 0) {
		return
	}
	fit.Total.Sigma = math.Hypot(fit.Total.Sigma, lag-math.Atan(omega*lag)/omega)
	fit.Gain.Sigma = math.Hypot(fit.Gain.Sigma, math.Abs(fit.Gain.Value)*(math.Hypot(1, omega*lag)-1))
}
