package baseline

import (
	"math"

	"antelag/rtloop"
	"antelag/scenarios/accept"
	"antelag/scenarios/quantity"
)

// figure describes one figure that a baseline keeps: its name in the file, what
// it is in words, its dimension, how it is found, and how far it may move.
//
// The tolerance is floor + part·scale. It stands between two effects that are
// many powers of ten apart. Below it is what another machine does to the same
// run: fused multiply-adds, other mathematical functions, another order of a
// sum change the last bit of a number, and the loop, the adaptive methods and
// the quanta of sensors make that grow. Measured over every embedded scenario
// it stays a factor 25 and more below the tolerance. Above it is what a
// setting does that was changed by a thousandth of itself.
type figure[T any] struct {
	name, label string
	dim         quantity.Dim
	get         func(*T) rtloop.Figure
	floor       float64 // SI
	scale       scale
}

// part is the share of its scale that a figure may move.
const part = 1e-5

// scale says what the roundings of a figure are large or small against, where
// that is more than the figure itself.
type scale int

const (
	itself       scale = iota
	displacement       // an error is a difference of two displacements: the channel's peak target
	area               // the same squared
	energies           // a term of the balance: its largest term
)

// laneFigures are those of a whole lane with a structure.
var laneFigures = []figure[accept.Lane]{
	{"energy_margin", "energy margin, least", quantity.None, func(l *accept.Lane) rtloop.Figure { return l.Energy.MarginMin }, 1e-4, itself},
	{"energy_margin_end", "energy margin, at the end", quantity.None, func(l *accept.Lane) rtloop.Figure { return l.Energy.MarginFinal }, 1e-4, itself},
	{"response_error", "response error, rms", quantity.None, func(l *accept.Lane) rtloop.Figure { return l.ResponseError }, 1e-5, itself},
	{"added_damping", "added damping", quantity.None, func(l *accept.Lane) rtloop.Figure { return l.Energy.AddedDamping }, 1e-6, itself},
	{"input", "energy, input", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Input }, 0, energies},
	{"damped", "energy, damped", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Damped }, 0, energies},
	{"specimen", "energy, specimens", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Specimen }, 0, energies},
	{"injected", "energy, injected", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Injected }, 0, energies},
	{"kinetic", "energy, kinetic at the end", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Kinetic }, 0, energies},
	{"strain", "energy, strain at the end", quantity.Energy, func(l *accept.Lane) rtloop.Figure { return l.Energy.Strain }, 0, energies},
	{"balance_error", "energy balance, residual", quantity.None, func(l *accept.Lane) rtloop.Figure { return l.Energy.BalanceError }, 1e-6, itself},
}

// channelFigures are those of a channel. The coefficients at the end of a run
// are not among them: those of fixed methods follow from the settings, and
// those of adaptive ones wander along whatever direction the last window left
// undetermined, by per cents where the figures do not move at all.
var channelFigures = []figure[rtloop.ChannelResult]{
	{"nrmse", "tracking error, rms", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.NRMSE }, 1e-5, itself},
	{"delay", "delay", quantity.Time, func(c *rtloop.ChannelResult) rtloop.Figure { return c.Delay }, 1e-6, itself},
	{"peak_error", "tracking error, peak", quantity.Length, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakError }, 0, displacement},
	{"amplitude_ratio", "amplitude ratio", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.AmplitudeRatio }, 1e-5, itself},
	{"spectrum_error", "spectrum error, rms", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.SpectrumError }, 1e-5, itself},
	{"fei_amplitude", "evaluation index, amplitude", quantity.None, func(c *rtloop.ChannelResult) rtloop.Figure { return c.FEI.Amplitude }, 1e-5, itself},
	{"fei_delay", "evaluation index, delay", quantity.Time, func(c *rtloop.ChannelResult) rtloop.Figure { return c.FEI.Delay }, 1e-6, itself},
	{"fei_frequency", "evaluation index, frequency", quantity.Frequency, func(c *rtloop.ChannelResult) rtloop.Figure { return c.FEI.Frequency }, 0, itself},
	{"tracking_indicator", "tracking indicator", quantity.Area, func(c *rtloop.ChannelResult) rtloop.Figure { return c.TrackingIndicator }, 0, area},
	{"peak_target", "peak target", quantity.Length, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakTarget }, 0, itself},
	{"peak_command", "peak command", quantity.Length, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakCommand }, 0, itself},
	{"peak_velocity", "peak velocity", quantity.Velocity, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakVelocity }, 0, itself},
	{"peak_command_velocity", "peak velocity of the command", quantity.Velocity, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakHurry }, 0, itself},
	{"peak_force", "peak force", quantity.Force, func(c *rtloop.ChannelResult) rtloop.Figure { return c.PeakForce }, 0, itself},
}

// entry reads the figure off a result.
func (f *figure[T]) entry(lane, channel string, from *T) Entry {
	e := Entry{Lane: lane, Channel: channel, Figure: f.name, Was: float64(f.get(from))}
	if !rtloop.Figure(e.Was).Defined() {
		e.Was = math.NaN()
	}
	return e
}

// usual is the tolerance that an entry of the baseline is recorded with.
func (b *Baseline) usual(e *Entry) float64 {
	floor, by := tolerance(e.Figure)
	against := math.Abs(e.Was)
	for i := range b.Entries {
		o := &b.Entries[i]
		if o.Lane != e.Lane || o.Channel != e.Channel {
			continue
		}
		v := math.Abs(o.Was)
		switch _, of := tolerance(o.Figure); {
		case by == displacement && o.Figure == "peak_target":
		case by == area && o.Figure == "peak_target":
			v *= v
		case by == energies && of == energies:
		default:
			continue
		}
		if !(against >= v) && !math.IsNaN(v) {
			against = v
		}
	}
	if math.IsNaN(against) {
		against = 0
	}
	return roundUp(floor + part*against)
}

func tolerance(name string) (floor float64, by scale) {
	for i := range laneFigures {
		if f := &laneFigures[i]; f.name == name {
			return f.floor, f.scale
		}
	}
	for i := range channelFigures {
		if f := &channelFigures[i]; f.name == name {
			return f.floor, f.scale
		}
	}
	return 0, itself
}

// roundUp rounds a tolerance up to two digits, for people.
func roundUp(v float64) float64 {
	if v == 0 {
		return 0
	}
	unit := math.Pow(10, math.Floor(math.Log10(v))-1)
	return math.Ceil(v/unit*(1-1e-9)) * unit
}

// described finds the dimension and the words of a figure by its name.
func described(name string) (dim quantity.Dim, label string, ok bool) {
	for _, f := range laneFigures {
		if f.name == name {
			return f.dim, f.label, true
		}
	}
	for _, f := range channelFigures {
		if f.name == name {
			return f.dim, f.label, true
		}
	}
	switch name {
	case "trip_time":
		return quantity.Time, "end of the run", true
	case "outcome", "trip":
		return quantity.None, name, true
	}
	return quantity.None, "", false
}
