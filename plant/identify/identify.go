// Package identify fits an actuator to what it was recorded to do: the gain,
// delay and lag of the kinds "lag-delay" and "second-order" of package plant,
// with standard errors; its frequency response with coherence; and its delay
// against frequency and amplitude.
//
// It knows the actuator models and nothing of compensators, structures, loops
// or files. Everything is SI.
package identify

import (
	"context"
	"errors"
	"fmt"
	"math"

	"antelag/plant"
)

// Record is what was commanded and what the sensors said, tick by tick:
// Measured[k], m, is the displacement at the instant for which Command[k], m,
// was wanted. The two are equally long, without gaps.
type Record struct {
	Command, Measured []float64
	Tick              float64    // physical seconds between samples
	Hold              plant.Hold // how the command gets from one tick to the next
}

// Options are the choices of Identify. The zero value is good.
type Options struct {
	// Segment is how many samples a segment of the frequency response has; 0
	// takes about an eighth of the record and at most 20 s.
	Segment int
	// Most is how many samples the fit takes at most, 0 for 2^18; from a longer
	// record, the stretch that moves the most. The frequency response is of the
	// whole record all the same.
	Most int
}

// fewest is how many samples a record must have. Below it no spectrum is worth
// its name.
const fewest = 64

// Estimate is a value and its standard error. The error is NaN where there is
// none.
type Estimate struct{ Value, Sigma float64 }

// Fit is one kind of actuator, fitted.
type Fit struct {
	Kind  string // as in plant.Actuators
	Gain  Estimate
	Delay Estimate // dead time τ, s
	// Lag, s, is T of "lag-delay", and 2ζ/ω of "second-order": what the answer
	// is late at low frequency, without the dead time.
	Lag Estimate
	// Total, s, is Delay and Lag together: how late the answer is at low
	// frequency.
	Total Estimate
	// Phase, s, is the phase delay of the fit in the excited band, weighted with
	// the power of the velocity: how late this motion was.
	Phase     Estimate
	Frequency Estimate // of "second-order", Hz
	Damping   Estimate // of "second-order", damping ratio
	Offset    Estimate // measured at zero command, m
	// NRMSE is the rms of what the fit leaves over the rms of the measured
	// motion about its mean.
	NRMSE float64
	// AtRest reports that the record began with the actuator at rest, so that
	// the first motion could be used.
	AtRest bool
	// Vague reports that the data could not tell delay from lag: Lag is 0,
	// Delay is the whole, and the standard errors of both are as large as it.
	Vague bool

	shape shape
	param []float64
	evid  evidence
}

// Result is what a record tells of an actuator.
type Result struct {
	Samples  int // of the record
	Fitted   int // samples that the fit took
	From     int // the first of them
	Tick     float64
	LagDelay *Fit
	Second   *Fit // "second-order"
	// Evidence is by how much the Bayesian information criterion favours
	// "second-order"; negative favours "lag-delay".
	Evidence float64

	Band         [2]float64 // Hz: where there is motion enough
	CoherenceMin float64    // lowest in Band
	Response     []Bin      // in Band
	Averages     int        // segments of which Response is the mean
	Groups       []Group    // by amplitude, the smallest first; none if it hardly varies
	Warnings     []string   // a sentence each

	slope Estimate // of the delay over the amplitude, s/m; none without groups
}

// strong is the evidence from which a richer kind is believed (Kass & Raftery
// 1995 call a difference above 10 very strong).
const strong = 10

// Best is the fit of the kind that explains the record better: "second-order"
// only on very strong evidence.
func (r *Result) Best() *Fit {
	if r.Evidence > strong && !r.Second.Vague {
		return r.Second
	}
	return r.LagDelay
}

// Identify fits both kinds of actuator to a record. An error says what the
// record lacks, or that the context has ended.
func Identify(ctx context.Context, rec Record, o Options) (*Result, error) {
	if err := rec.check(); err != nil {
		return nil, err
	}
	n := len(rec.Command)
	most := o.Most
	if most <= 0 {
		most = 1 << 18
	}
	from, to := loudest(rec.Command, max(most, fewest))
	res := &Result{Samples: n, Fitted: to - from, From: from, Tick: rec.Tick}
	part := rec.part(from, to)

	first := firstGuess(part)
	spectrum, err := spectrumOf(rec, first, o.Segment)
	if err != nil {
		return nil, err
	}
	res.Band, res.Averages = spectrum.band, spectrum.averages
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	f := &fitter{ctx: ctx, rec: part, spectrum: spectrum, first: first}
	if res.LagDelay, err = f.fit(lagDelayShape(rec.Tick)); err != nil {
		return nil, err
	}
	if res.Second, err = f.fit(secondOrderShape(rec.Tick)); err != nil {
		return nil, err
	}
	res.Evidence = f.compare(res.LagDelay, res.Second)
	if err := f.resolve(res); err != nil {
		return nil, err
	}
	best := res.Best()
	res.Response, res.CoherenceMin = spectrum.response(best, rec.Hold)
	res.Groups, res.slope = f.groups(best)
	f.warn(res)
	return res, nil
}

func (r Record) check() error {
	n := len(r.Command)
	switch {
	case len(r.Measured) != n:
		return fmt.Errorf("%d samples of the command but %d of the measured displacement", n, len(r.Measured))
	case n < fewest:
		return fmt.Errorf("%d samples; a fit takes at least %d", n, fewest)
	case !(r.Tick > 0) || math.IsInf(r.Tick, 0):
		return fmt.Errorf("tick: %v s is no time step", r.Tick)
	}
	for k := range n {
		if !(math.Abs(r.Command[k]) <= math.MaxFloat64/4 && math.Abs(r.Measured[k]) <= math.MaxFloat64/4) {
			return fmt.Errorf("sample %d: command %v and measured %v are not both numbers", k, r.Command[k], r.Measured[k])
		}
	}
	c, m := spread(r.Command), spread(r.Measured)
	switch {
	case c == 0:
		return errors.New("the command never moves")
	case m == 0:
		return errors.New("the measured displacement never moves")
	}
	if c > 1e100 || c < 1e-100 || m > 1e100 || m < 1e-100 {
		return fmt.Errorf("motions of %.2g m commanded and %.2g m measured are none of an actuator", c, m)
	}
	return nil
}

func (r Record) part(from, to int) Record {
	r.Command, r.Measured = r.Command[from:to], r.Measured[from:to]
	return r
}

// loudest returns the stretch of at most n samples in which the command moves
// the most.
func loudest(u []float64, n int) (from, to int) {
	if len(u) <= n {
		return 0, len(u)
	}
	power := func(k int) float64 { d := u[k] - u[k-1]; return d * d }
	sum, best := 0.0, 0.0
	for k := 1; k < n; k++ {
		sum += power(k)
	}
	best = sum
	for k := n; k < len(u); k++ {
		sum += power(k) - power(k-n+1)
		if sum > best {
			best, from = sum, k-n+1
		}
	}
	return from, from + n
}

func mean(x []float64) float64 {
	s := 0.0
	for _, v := range x {
		s += v
	}
	return s / float64(len(x))
}

// spread is the rms about the mean.
func spread(x []float64) float64 {
	m, s := mean(x), 0.0
	scale := 0.0
	for _, v := range x {
		scale = max(scale, math.Abs(v-m))
	}
	if scale == 0 {
		return 0
	}
	for _, v := range x {
		d := (v - m) / scale
		s += d * d
	}
	return scale * math.Sqrt(s/float64(len(x)))
}
