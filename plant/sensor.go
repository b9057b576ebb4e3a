package plant

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// SensorSettings describes the sensors of a channel: the same settings for
// displacement and for force, told apart by their prefix.
var SensorSettings = kind.Kind{
	Name:     "sensor",
	Doc:      "what the displacement and force sensors make of the truth",
	Equation: "Q(F(gain·x + bias) + noise), F = 1/(1 + s/2πf_c), Q rounds to the quantum and stops at ±range",
	Source:   "common practice",
	Settings: slices.Concat(
		sensorSettings("displacement", quantity.Length, limits{bias: 1, noise: 0.1, rangeLow: 1e-6, rangeHigh: 10}),
		sensorSettings("force", quantity.Force, limits{bias: 1e8, noise: 1e7, rangeLow: 1e-3, rangeHigh: 1e9}),
	),
}

// limits are the sensible magnitudes of a sensor's settings, SI.
type limits struct{ bias, noise, rangeLow, rangeHigh float64 }

func sensorSettings(of string, dim quantity.Dim, m limits) []kind.Setting {
	return []kind.Setting{
		kind.Number(of+"_gain", quantity.None, "reading over true "+of).Default(1).Range(0.01, 100),
		kind.Number(of+"_bias", dim, "reading at zero "+of).Default(0).Range(-m.bias, m.bias),
		kind.Number(of+"_noise", dim, "white noise of the reading, rms").Default(0).Range(0, m.noise),
		kind.Number(of+"_resolution", dim, "quantum of the reading, 0 for none").Default(0).Range(0, m.noise),
		kind.Integer(of+"_bits", "bits of the converter over the full scale, instead of resolution").Optional().Range(4, 32),
		kind.Number(of+"_range", dim, "full scale: the reading stops at plus and minus this").Optional().Range(m.rangeLow, m.rangeHigh),
		kind.Number(of+"_cutoff", quantity.Frequency, "corner frequency of a first-order low-pass, 0 for none").Default(0).Range(0, 1e6),
	}
}

// Sensor turns a true value into a reading, once a tick:
//
//	w = gain·x + bias
//	T·ẏ + y = w,   T = 1/(2π·cutoff)
//	reading = Q(y + noise)
//
// x the true value, N or m. The low-pass is advanced exactly for a w that is
// straight between ticks. The noise is white and Gaussian, rms as set, one
// value per tick; at a given tick its density is 2·rms²·tick up to half the
// rate. Q rounds to the nearest multiple of the quantum (ties to even) and
// stops at ±range; with bits the quantum is 2·range/2^bits. Every stage that
// is not set is left out, and a sensor with none returns x itself, bit for
// bit.
//
// Start sets the low-pass at rest and begins the noise anew, so that a run
// repeats bit for bit.
type Sensor struct {
	perfect, rounded, bounded bool

	gain, bias float64
	filtered   bool
	e, wb      float64 // weights of the low-pass, as in straight
	y, was     float64 // its state and last input
	noise      float64 // rms
	quantum    float64
	full       float64 // range

	seed, stream uint64
	source       *rand.PCG
	random       *rand.Rand
}

// NewPerfectSensor makes a sensor that returns the truth, bit for bit.
func NewPerfectSensor() *Sensor { return &Sensor{perfect: true, gain: 1} }

// NewSensor makes the sensor of one prefix, "displacement" or "force", from
// the resolved settings of SensorSettings. Tick is in physical seconds. Sensors
// of one seed but different prefixes have independent noise. An error names
// the setting that cannot work.
func NewSensor(tick float64, v kind.Values, prefix string, seed uint64) (*Sensor, error) {
	if !(tick > 0) || math.IsInf(tick, 0) {
		return nil, fmt.Errorf("tick: %v s is no time step", tick)
	}
	of := prefix + "_"
	s := &Sensor{
		gain: v.Num(of + "gain"), bias: v.Num(of + "bias"), noise: v.Num(of + "noise"),
		seed: seed, stream: stream(prefix),
	}
	if err := s.converter(v, of); err != nil {
		return nil, err
	}
	if cutoff := v.Num(of + "cutoff"); cutoff > 0 {
		s.filtered = true
		s.e, s.wb, _ = straight(tick, 1/(2*math.Pi*cutoff))
		s.e, s.wb = flush(s.e), flush(s.wb)
	}
	s.source = rand.NewPCG(s.seed, s.stream)
	s.random = rand.New(s.source)
	s.perfect = s.gain == 1 && s.bias == 0 && s.noise == 0 && !s.filtered && !s.rounded && !s.bounded
	return s, nil
}

// converter reads quantum and full scale.
func (s *Sensor) converter(v kind.Values, of string) error {
	s.quantum = v.Num(of + "resolution")
	if v.Has(of + "range") {
		s.bounded, s.full = true, v.Num(of+"range")
	}
	if v.Has(of + "bits") {
		if s.quantum > 0 {
			return fmt.Errorf("%sbits: is given beside %[1]sresolution; give one of them", of)
		}
		if !s.bounded {
			return fmt.Errorf("%srange: is missing; %[1]sbits needs it", of)
		}
		s.quantum = math.Ldexp(s.full, 1-v.Int(of+"bits"))
	}
	s.rounded = s.quantum > 0
	return nil
}

// stream tells the noise of one prefix from that of another (FNV-1a).
func stream(prefix string) uint64 {
	h := uint64(14695981039346656037)
	for _, c := range []byte(prefix) {
		h = (h ^ uint64(c)) * 1099511628211
	}
	return h
}

// Start puts the sensor at rest at a true value and begins its noise anew.
func (s *Sensor) Start(value float64) {
	s.y = s.gain*value + s.bias
	s.was = s.y
	if s.source != nil {
		s.source.Seed(s.seed, s.stream)
	}
}

// Read returns the reading of the true value at the end of a tick. Call it
// once a tick.
func (s *Sensor) Read(value float64) float64 {
	if s.perfect {
		return value
	}
	x := s.gain*value + s.bias
	if s.filtered {
		s.y = x + (s.e*(s.y-x) + s.wb*(s.was-x))
		s.was, x = x, s.y
	}
	if s.noise > 0 {
		x += s.noise * s.random.NormFloat64()
	}
	if s.rounded {
		x = math.RoundToEven(x/s.quantum) * s.quantum
	}
	if s.bounded {
		x = max(-s.full, min(s.full, x))
	}
	return x
}
