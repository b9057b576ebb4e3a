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
	// A candidate at nothing may be put on either side by rounding.
	candidates, err := a.base.Delays(channel, low, high)
	if err != nil {
		return err
	}
	near := 1e-12
	ahead, direction := beyond(candidates, near, 1), 1.0
	if !a.stable {
		ahead, direction = beyond(candidates, -near, -1), -1
	}
	stable := a.stable
	for i := 0; i < len(ahead) && len(m.Delays) < mostChanges && i < 64; i++ {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		limit := high
		if direction < 0 {
			limit = low
		}
		probe := 0.5 * (ahead[i].Value + limit)
		if i+1 < len(ahead) {
			probe = 0.5 * (ahead[i].Value + ahead[i+1].Value)
		}
		if step := 0.05 * math.Abs(ahead[i].Value); math.Abs(probe-ahead[i].Value) > step {
			probe = ahead[i].Value + direction*step
		}
		now, err := a.stableAt(channel, probe)
		if err != nil {
			return err
		}
		if now == stable {
			continue
		}
		at, err := a.refine(channel, ahead[i])
		if err != nil {
			return err
		}
		if direction < 0 {
			// Found on the way down: beyond it, upwards, the loop grows.
			m.DelayMargin = rtloop.Figure(at)
			m.Delays = append(m.Delays, Change{rtloop.Figure(at), rtloop.Figure(a.base.Frequency(ahead[i])), false})
			return nil
		}
		if len(m.Delays) == 0 {
			m.DelayMargin = rtloop.Figure(at)
		}
		m.Delays = append(m.Delays, Change{rtloop.Figure(at), rtloop.Figure(a.base.Frequency(ahead[i])), now})
		stable = now
	}
	return nil
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
	n, err := m.Unstable(1 + Neutral)
	return n == 0, err
}

// refine finds the delay at which the pole of a crossing is on the unit circle when
// the actuator is built with it, by secants.
func (a *analyst) refine(channel int, c stability.Crossing) (float64, error) {
	off := func(extra float64, guess complex128) (float64, complex128, error) {
		m, err := a.delayed(channel, extra)
		if err != nil {
			return 0, 0, err
		}
		z, ok := m.Pole(guess)
		if !ok {
			return 0, 0, stability.ErrUnsettled
		}
		return math.Log(cmplx.Abs(z)), z, nil
	}
	x0 := c.Value
	f0, z, err := off(x0, cmplx.Rect(1, c.Angle))
	if err != nil || f0 == 0 {
		return x0, err
	}
	x1 := x0 + 1e-4*x0 + 1e-7
	for range 12 {
		f1, next, err := off(x1, z)
		if err != nil {
			return x0, err
		}
		step := f1 * (x1 - x0) / (f1 - f0)
		if math.IsNaN(step) || math.Abs(x1-step-c.Value) > 0.02*math.Abs(c.Value)+1e-3 {
			return c.Value, nil // a double pole: the estimate is as good as it gets
		}
		x0, f0, z = x1, f1, next
		x1 -= step
		if math.Abs(step) <= 1e-11*math.Abs(x1)+1e-15 {
			break
		}
	}
	return x1, nil
}

// gains goes from 1 up, or, where the loop grows, down.
func (a *analyst) gains(channel int, m *Margins) error {
	candidates, err := a.base.Gains(channel, LargestGain)
	if err != nil {
		return err
	}
	ahead, direction := beyond(candidates, 1+1e-12, 1), 1.0
	if !a.stable {
		ahead, direction = beyond(candidates, 1-1e-12, -1), -1
	}
	stable := a.stable
	for i := 0; i < len(ahead) && len(m.Gains) < mostChanges; i++ {
		probe := ahead[i].Value * math.Pow(1.05, direction)
		if i+1 < len(ahead) {
			if mid := 0.5 * (ahead[i].Value + ahead[i+1].Value); math.Abs(mid-ahead[i].Value) < math.Abs(probe-ahead[i].Value) {
				probe = mid
			}
		}
		n, err := a.base.Scaled(channel, probe).Unstable(1 + Neutral)
		if err != nil {
			return err
		}
		now := n == 0
		if now == stable {
			continue
		}
		at := rtloop.Figure(ahead[i].Value)
		if len(m.Gains) == 0 {
			m.GainMargin = at
		}
		change := Change{at, rtloop.Figure(a.base.Frequency(ahead[i])), now}
		if direction < 0 {
			change.Stable = false
			m.Gains = append(m.Gains, change)
			return nil
		}
		m.Gains = append(m.Gains, change)
		stable = now
	}
	return nil
}
