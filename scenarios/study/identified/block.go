package identified

import (
	"fmt"
	"path/filepath"
	"strings"

	"antelag/plant"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// Usable says why the fit is none that a scenario could take; nil if it is one.
func (r *Report) Usable() error {
	f := r.Best()
	entry, err := plant.Actuators.Find(f.Kind)
	if err != nil {
		return err
	}
	gain, err := entry.Setting("gain")
	if err != nil {
		return err
	}
	if v := f.Gain.Value; !(v >= gain.Min && v <= gain.Max) {
		return fmt.Errorf("the fitted gain, %.3g, is none that %s takes (%s): check signs and units of command and measured", v, f.Kind, gain.RangeText())
	}
	return nil
}

// Block is the fitted actuator as a section of a scenario. Values have up to six
// digits, more than any fit is worth.
func (r *Report) Block() string {
	f := r.Best()
	var b strings.Builder
	fmt.Fprintf(&b, "# Fitted to %s, %s to %s.\n", accept.Printable(filepath.Base(r.Log)),
		quantity.Short(r.Band[0], quantity.Frequency), quantity.Short(r.Band[1], quantity.Frequency))
	fmt.Fprintf(&b, "[channel.actuator]\nkind = %q\n", f.Kind)
	entry, err := plant.Actuators.Find(f.Kind)
	if err != nil {
		return b.String() // a fit is of a kind of the table
	}
	values := f.Settings()
	sigma := map[string]float64{
		"gain": f.Gain.Sigma, "delay": f.Delay.Sigma, "lag": f.Lag.Sigma,
		"frequency": f.Frequency.Sigma, "damping_ratio": f.Damping.Sigma,
	}
	for _, s := range entry.Settings {
		text := quantity.Plain(values.Num(s.Name), s.Dim)
		if s.Dim != quantity.None {
			text = `"` + text + `"`
		}
		fmt.Fprintf(&b, "%-30s # ± %s\n", s.Name+" = "+text, spread(sigma[s.Name], s.Dim))
	}
	return b.String()
}
