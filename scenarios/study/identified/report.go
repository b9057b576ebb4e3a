package identified

import (
	"encoding/json"
	"os"

	"antelag/plant"
	"antelag/plant/identify"
	"antelag/rtloop"
)

// Report is what a log tells of an actuator.
type Report struct {
	Log      string
	Channel  string
	Start    float64 // time of the first sample, s
	Slowdown float64
	Hold     plant.Hold
	Notes    []string
	*identify.Result
}

type (
	figure = rtloop.Figure // null where it is undefined

	fitJSON struct {
		Gain      figure    `json:"gain"`
		Delay     figure    `json:"delay_s"`
		Lag       figure    `json:"lag_s"`
		Total     figure    `json:"total_delay_s"`
		Phase     figure    `json:"phase_delay_s"`
		Frequency *figure   `json:"frequency_hz,omitempty"`
		Damping   *figure   `json:"damping_ratio,omitempty"`
		Offset    figure    `json:"offset_m"`
		Sigma     sigmaJSON `json:"sigma"`
		NRMSE     figure    `json:"fit_nrmse"`
	}
	sigmaJSON struct {
		Gain      figure  `json:"gain"`
		Delay     figure  `json:"delay_s"`
		Lag       figure  `json:"lag_s"`
		Total     figure  `json:"total_delay_s"`
		Phase     figure  `json:"phase_delay_s"`
		Frequency *figure `json:"frequency_hz,omitempty"`
		Damping   *figure `json:"damping_ratio,omitempty"`
		Offset    figure  `json:"offset_m"`
	}
	binJSON struct {
		Hz         figure `json:"hz"`
		Gain       figure `json:"gain"`
		Delay      figure `json:"delay_s"`
		Coherence  figure `json:"coherence"`
		GainSigma  figure `json:"gain_sigma"`
		DelaySigma figure `json:"delay_sigma_s"`
	}
	groupJSON struct {
		Amplitude  figure `json:"amplitude_m"`
		Speed      figure `json:"speed_m_s"`
		Delay      figure `json:"delay_s"`
		DelaySigma figure `json:"delay_sigma_s"`
		Gain       figure `json:"gain"`
		GainSigma  figure `json:"gain_sigma"`
	}
	reportJSON struct {
		fitJSON
		CoherenceMin figure      `json:"coherence_min"`
		Band         [2]figure   `json:"band_hz"`
		FRF          []binJSON   `json:"frf"`
		Log          string      `json:"log"`
		Channel      string      `json:"channel"`
		Rate         figure      `json:"rate_hz"`
		Samples      int         `json:"samples"`
		Fitted       int         `json:"samples_fitted"`
		Better       string      `json:"better"`
		Second       fitJSON     `json:"second_order"`
		Groups       []groupJSON `json:"by_amplitude"`
		Warnings     []string    `json:"warnings"`
		Notes        []string    `json:"notes"`
	}
)

func fitOf(f *identify.Fit) fitJSON {
	out := fitJSON{
		Gain: figure(f.Gain.Value), Delay: figure(f.Delay.Value), Lag: figure(f.Lag.Value),
		Total: figure(f.Total.Value), Phase: figure(f.Phase.Value), Offset: figure(f.Offset.Value), NRMSE: figure(f.NRMSE),
		Sigma: sigmaJSON{
			Gain: figure(f.Gain.Sigma), Delay: figure(f.Delay.Sigma), Lag: figure(f.Lag.Sigma),
			Total: figure(f.Total.Sigma), Phase: figure(f.Phase.Sigma), Offset: figure(f.Offset.Sigma),
		},
	}
	if f.Kind == "second-order" {
		out.Frequency, out.Damping = both(f.Frequency.Value, f.Damping.Value)
		out.Sigma.Frequency, out.Sigma.Damping = both(f.Frequency.Sigma, f.Damping.Sigma)
	}
	return out
}

func both(a, b float64) (*figure, *figure) {
	x, y := figure(a), figure(b)
	return &x, &y
}

// MarshalJSON writes the fit of "lag-delay" on top and that of "second-order"
// beside it; "better" names the kind that the block is of.
func (r *Report) MarshalJSON() ([]byte, error) {
	out := reportJSON{
		fitJSON: fitOf(r.LagDelay), CoherenceMin: figure(r.CoherenceMin),
		Band: [2]figure{figure(r.Band[0]), figure(r.Band[1])}, FRF: []binJSON{},
		Log: r.Log, Channel: r.Channel, Rate: figure(1 / r.Tick), Samples: r.Samples, Fitted: r.Fitted,
		Better: r.Best().Kind, Second: fitOf(r.Second), Groups: []groupJSON{},
		Warnings: append([]string{}, r.Warnings...), Notes: append([]string{}, r.Notes...),
	}
	for _, b := range r.Response {
		out.FRF = append(out.FRF, binJSON{figure(b.Hz), figure(b.Gain), figure(b.Delay), figure(b.Coherence), figure(b.GainSigma), figure(b.DelaySigma)})
	}
	for _, g := range r.Groups {
		out.Groups = append(out.Groups, groupJSON{figure(g.Amplitude), figure(g.Speed), figure(g.Delay), figure(g.DelaySigma), figure(g.Gain), figure(g.GainSigma)})
	}
	return json.Marshal(out)
}

func exists(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}
