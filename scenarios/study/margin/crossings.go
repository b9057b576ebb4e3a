package margin

import (
	"context"
	"math"
	"math/cmplx"
	"strconv"

	"antelag/rtloop"
	"antelag/rtloop/stability"
	"antelag/scenarios"
)

// mostChanges is how many changes of stability are looked at; beyond the first few
// nobody would go.
const mostChanges = 6

// mostCandidates bounds the work where a great many poles cross.
const mostCandidates = 64

// edge is how far above 1 the spectral radius must be for a loop to have passed a
// crossing. It is finer than Neutral, because a step past the crossing of a slow
// structure at a high rate may grow by no more; poles are good to 1e-14.
const edge = 1e-11

// delay is the actuator delay of channel j, s.
func (a *analyst) delay(j int) float64 { return a.s.Channels[j].Actuator.Values.Num("delay") }

// margins finds what one channel bears, or all alike.
func (a *analyst) margins(ctx context.Context, channel int) (*Margins, error) {
	m := &Margins{DelayMargin: undefined, GainMargin: undefined, Delays: []Change{}, Gains: []Change{}}
	if err := a.delays(ctx, channel, m); err != nil {
		return nil, err
	}
	return m, a.gains(channel, m)
}

// delayRange is how much longer and shorter the delay of a channel, or of all, may be.
func (a *analyst) delayRange(channel int) (low, high float64) {
	low, high = math.Inf(-1), math.Inf(1)
	for j := range a.s.Channels {
		if channel != stability.All && channel != j {
			continue
		}
		setting, err := a.s.Channels[j].Actuator.Kind.Setting("delay")
		if err != nil {
			return 0, 0
		}
		low, high = max(low, -a.delay(j)), min(high, setting.Max-a.delay(j))
	}
	return low, high
}

// delays goes from now to longer delays, or, where the loop grows, to shorter ones.
func (a *analyst) delays(ctx context.Context, channel int, m *Margins) error {
	low, high := a.delayRange(channel)
	candidates, err := a.base.Delays(channel, low, high)
	if err != nil {
		return err
	}
	// A loop on the edge may be found just beyond it, by rounding and by the tick.
	tick := 1 / a.s.Loop.Num("rate")
	ahead, direction := beyond(candidates, -1e-3*tick, 1), 1.0
	if !a.stable {
		ahead, direction = beyond(candidates, 0, -1), -1
	}
	stable, before := a.stable, 0.0
	for i := 0; i < len(ahead) && len(m.Delays) < mostChanges && i < mostCandidates; i++ {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		probe := between(ahead, i, direction*max(0.05*math.Abs(ahead[i].Value), 0.02*tick))
		probe = min(high, max(low, probe))
		now, err := a.stableAt(channel, probe)
		if err != nil {
			return err
		}
		if now != stable {
			at, err := a.refine(channel, ahead[i], before, probe, stable)
			if err != nil {
				return err
			}
			if m.addDelay(at, a.base.Frequency(ahead[i]), now, direction); direction < 0 {
				return nil
			}
		}
		stable, before = now, probe
	}
	return nil
}

// addDelay takes in a change found on the way up, or down, to where it is stable.
func (m *Margins) addDelay(at, frequency float64, stable bool, direction float64) {
	if direction > 0 && len(m.Delays) == 0 {
		at = max(0, at)
	}
	if len(m.Delays) == 0 {
		m.DelayMargin = rtloop.Figure(at)
	}
	// Beyond, upwards, of what was found on the way down the loop grows.
	m.Delays = append(m.Delays, Change{rtloop.Figure(at), rtloop.Figure(frequency), stable && direction > 0})
}

// between is a value behind a candidate by a step, but no further than half way to
// the next.
func between(ahead []stability.Crossing, i int, step float64) float64 {
	probe := ahead[i].Value + step
	if i+1 < len(ahead) {
		if mid := 0.5 * (ahead[i].Value + ahead[i+1].Value); math.Abs(mid-ahead[i].Value) < math.Abs(step) {
			probe = mid
		}
	}
	return probe
}

// beyond are the candidates on one side of a value, going away from it, each place
// once.
func beyond(c []stability.Crossing, from, direction float64) []stability.Crossing {
	var out []stability.Crossing
	add := func(x stability.Crossing) {
		if (x.Value-from)*direction < 0 {
			return
		}
		if n := len(out); n > 0 && math.Abs(out[n-1].Value-x.Value) <= 1e-9*math.Abs(x.Value) {
			return
		}
		out = append(out, x)
	}
	if direction > 0 {
		for _, x := range c {
			add(x)
		}
		return out
	}
	for i := range c {
		add(c[len(c)-1-i])
	}
	return out
}

// delayed is the model with so much more delay in one channel's actuator, or in all.
func (a *analyst) delayed(channel int, extra float64) (*stability.Model, error) {
	var changes []scenarios.Change
	for j := range a.s.Channels {
		if channel == stability.All || channel == j {
			longer := max(0, a.delay(j)+extra)
			changes = append(changes, scenarios.Change{
				Path: "channel[" + strconv.Itoa(j) + "].actuator.delay", Value: strconv.FormatFloat(longer, 'g', -1, 64) + " s"})
		}
	}
	s, err := a.s.With(changes...)
	if err != nil {
		return nil, err
	}
	m, _, err := a.model(s)
	return m, err
}

func (a *analyst) stableAt(channel int, extra float64) (bool, error) {
	m, err := a.delayed(channel, extra)
	if err != nil {
		return false, err
	}
	n, err := m.Unstable(1 + edge)
	return n == 0, err
}

// refine finds the delay, between two others on either side of it, at which the pole
// of a crossing is on the unit circle when the actuator is built with it: by secants,
// or, where they lead elsewhere, by halving.
func (a *analyst) refine(channel int, c stability.Crossing, before, behind float64, stable bool) (float64, error) {
	x, ok, err := a.secants(channel, c)
	tolerance := 1e-3 / a.s.Loop.Num("rate")
	if err != nil || ok && x > min(before, behind)-tolerance && x < max(before, behind)+tolerance {
		return x, err
	}
	// The estimate is as good as halving, which sees growth from Neutral on only.
	for _, near := range []float64{1e-4, 1e-3} {
		below, err := a.stableAt(channel, c.Value*(1-near))
		if err != nil {
			return 0, err
		}
		above, err := a.stableAt(channel, c.Value*(1+near))
		if err != nil || below != above {
			return c.Value, err
		}
	}
	for range 40 {
		mid := 0.5 * (before + behind)
		now, err := a.stableAt(channel, mid)
		if err != nil {
			return 0, err
		}
		if now == stable {
			before = mid
		} else {
			behind = mid
		}
	}
	return behind, nil
}

// secants goes from the estimate to where the pole is on the unit circle; ok is false
// where that is lost on the way, as of two poles that are one.
func (a *analyst) secants(channel int, c stability.Crossing) (x float64, ok bool, err error) {
	guess := cmplx.Rect(1, c.Angle)
	off := func(extra float64) (float64, bool, error) {
		m, err := a.delayed(channel, extra)
		if err != nil {
			return 0, false, err
		}
		z, ok := m.Pole(guess)
		guess = z
		return math.Log(cmplx.Abs(z)), ok, nil
	}
	x0 := c.Value
	f0, ok, err := off(x0)
	if err != nil || !ok || f0 == 0 {
		return x0, ok, err
	}
	x1 := x0 + 1e-4*x0 + 1e-7
	last := 0.0
	for range 20 {
		f1, ok, err := off(x1)
		if err != nil || !ok {
			return 0, false, err
		}
		step := f1 * (x1 - x0) / (f1 - f0)
		if math.IsNaN(step) || math.IsInf(step, 0) {
			return x1, f1 == 0, nil
		}
		x0, f0 = x1, f1
		x1 -= step
		if last = math.Abs(step); last <= 1e-11*math.Abs(x1)+1e-15 {
			break
		}
	}
	// Two poles that are one wander by the root of the digits.
	return x1, last <= 1e-6*math.Abs(x1), nil
}

// gains goes from 1 up, or, where the loop grows, down.
func (a *analyst) gains(channel int, m *Margins) error {
	candidates, err := a.base.Gains(channel, LargestGain)
	if err != nil {
		return err
	}
	ahead, direction := beyond(candidates, 1-1e-6, 1), 1.0
	if !a.stable {
		ahead, direction = beyond(candidates, 1, -1), -1
	}
	stable := a.stable
	for i := 0; i < len(ahead) && len(m.Gains) < mostChanges; i++ {
		n, err := a.base.Scaled(channel, between(ahead, i, direction*0.05*ahead[i].Value)).Unstable(1 + edge)
		if err != nil {
			return err
		}
		now := n == 0
		if now == stable {
			continue
		}
		at := ahead[i].Value
		if direction > 0 {
			at = max(1, at)
		}
		if len(m.Gains) == 0 {
			m.GainMargin = rtloop.Figure(at)
		}
		m.Gains = append(m.Gains, Change{rtloop.Figure(at), rtloop.Figure(a.base.Frequency(ahead[i])), now && direction > 0})
		if direction < 0 {
			return nil
		}
		stable = now
	}
	return nil
}
