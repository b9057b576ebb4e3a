package rtloop

import (
	"encoding/json"
	"math"

	"antelag/compensator"
	"antelag/rtloop/gauge"
)

// Figure is a number that may be undefined (NaN or infinite); JSON shows that
// as null.
type Figure float64

// MarshalJSON writes the number, or null where it is undefined.
func (f Figure) MarshalJSON() ([]byte, error) {
	if v := float64(f); !math.IsNaN(v) && !math.IsInf(v, 0) {
		return json.Marshal(v)
	}
	return []byte("null"), nil
}

// Defined reports whether the figure is a finite number.
func (f Figure) Defined() bool { return !math.IsNaN(float64(f)) && !math.IsInf(float64(f), 0) }

// LaneResult is what one lane came to, in SI, with the names that the JSON
// output uses.
type LaneResult struct {
	Name          string          `json:"name"`
	Outcome       Outcome         `json:"outcome"`
	Trip          *Trip           `json:"trip"`
	Channels      []ChannelResult `json:"channels"`
	Energy        EnergyResult    `json:"energy"`
	ResponseError Figure          `json:"response_error"`
}

// ChannelResult is what one channel came to.
type ChannelResult struct {
	Name              string            `json:"name"`
	Compensator       string            `json:"compensator"`
	NRMSE             Figure            `json:"nrmse"`
	PeakError         Figure            `json:"peak_error_m"`
	PeakErrorRatio    Figure            `json:"peak_error_ratio"`
	Delay             Figure            `json:"delay_s"`
	AmplitudeRatio    Figure            `json:"amplitude_ratio"`
	FEI               FEIResult         `json:"fei"`
	TrackingIndicator Figure            `json:"tracking_indicator_m2"`
	PeakTarget        Figure            `json:"peak_target_m"`
	PeakCommand       Figure            `json:"peak_command_m"`
	PeakVelocity      Figure            `json:"peak_velocity_m_s"`
	PeakHurry         Figure            `json:"peak_command_velocity_m_s"` // change of the command in a tick
	PeakForce         Figure            `json:"peak_force_N"`
	Coefficients      map[string]Figure `json:"coefficients"`
	// Of a driven target: how measured answers target by thirds of an octave.
	Response []BandResult `json:"response,omitempty"`
	// Where it was asked for: rms over periods of the measured response
	// spectrum over the target's, less 1, at 5 % damping.
	SpectrumError Figure `json:"spectrum_error"`
}

// BandResult is the response in one band.
type BandResult struct {
	Frequency Figure `json:"frequency_hz"`
	Amplitude Figure `json:"amplitude"`
	Delay     Figure `json:"delay_s"`
}

// FEIResult is the frequency evaluation index.
type FEIResult struct {
	Amplitude Figure `json:"amplitude"`
	Delay     Figure `json:"delay_s"`
	Frequency Figure `json:"frequency_hz"`
}

// EnergyResult holds margins over the trailing window, energies over the
// whole run.
type EnergyResult struct {
	Window       Figure `json:"window_s"`
	MarginMin    Figure `json:"margin_min"`
	MarginFinal  Figure `json:"margin_final"`
	Injected     Figure `json:"injected_J"`
	Damped       Figure `json:"damped_J"`
	Specimen     Figure `json:"specimen_J"`
	Input        Figure `json:"input_J"`
	Kinetic      Figure `json:"kinetic_J"`
	Strain       Figure `json:"strain_J"`
	BalanceError Figure `json:"balance_error"`
	AddedDamping Figure `json:"added_damping"`
}

// Result gathers the figures of a judged loop. It finishes the kept record,
// so it is for the end of a run.
func (l *Loop) Result() LaneResult {
	res := LaneResult{Outcome: l.outcome, Trip: l.trip, Energy: l.energyResult(), ResponseError: Figure(math.NaN())}
	for j := range l.channels {
		res.Channels = append(res.Channels, l.channels[j].result())
	}
	return res
}

func (c *channel) result() ChannelResult {
	t := c.tracking
	align := c.record.Finish()
	res := ChannelResult{
		Name: c.Name, Compensator: c.Method,
		NRMSE: Figure(t.NRMSE()), PeakError: Figure(t.PeakError()), PeakErrorRatio: Figure(t.PeakErrorRatio()),
		Delay: Figure(align.Delay), AmplitudeRatio: Figure(t.AmplitudeRatio()),
		FEI:               FEIResult{Figure(align.FEI.Amplitude), Figure(align.FEI.Delay), Figure(align.FEI.Frequency)},
		TrackingIndicator: Figure(t.Indicator()), PeakTarget: Figure(t.PeakTarget()),
		PeakCommand: Figure(c.peakCommand), PeakVelocity: Figure(c.peakVelocity), PeakHurry: Figure(c.peakHurry), PeakForce: Figure(c.peakForce),
		Coefficients: map[string]Figure{}, SpectrumError: Figure(math.NaN()),
	}
	for _, b := range align.Bands {
		res.Response = append(res.Response, BandResult{Figure(b.Frequency), Figure(b.Amplitude), Figure(b.Delay)})
	}
	if c.spectrum != nil {
		res.SpectrumError = Figure(c.spectrum.Error())
	}
	for _, k := range c.Compensator.Coefficients(nil) {
		res.Coefficients[k.Name] = Figure(k.Value)
	}
	return res
}

// Coefficients appends what the compensator of channel j works with now.
func (l *Loop) Coefficients(j int, dst []compensator.Coefficient) []compensator.Coefficient {
	return l.channels[j].Compensator.Coefficients(dst)
}

// Subspace returns the synchronization subspace of channel j.
func (l *Loop) Subspace(j int) gauge.Ellipse { return l.channels[j].tracking.Subspace() }

func (l *Loop) energyResult() EnergyResult {
	nan := Figure(math.NaN())
	res := EnergyResult{Figure(l.cfg.Window), nan, nan, nan, nan, nan, nan, nan, nan, nan, nan}
	if l.energy == nil {
		return res
	}
	t := l.energy.Totals()
	return EnergyResult{
		Window: Figure(l.cfg.Window), MarginMin: Figure(l.energy.MarginMin()), MarginFinal: Figure(l.energy.Margin()),
		Injected: Figure(t.Injected), Damped: Figure(t.Damped), Specimen: Figure(t.Specimen), Input: Figure(t.Input),
		Kinetic: Figure(t.Kinetic), Strain: Figure(t.Strain),
		BalanceError: Figure(t.BalanceError), AddedDamping: Figure(t.AddedDamping),
	}
}
