package tune

import (
	"math"

	"antelag/compensator"
	"antelag/scenarios"
)

// NoiseBand is up to which frequency noise in a target counts, Hz, physical: what
// is quicker a servo-hydraulic actuator hardly follows (common practice). Half the
// rate bounds it too.
const NoiseBand = 50

const (
	noiseLines  = 24   // frequencies at which the gain is measured
	noiseLowest = 2.0  // Hz
	settling    = 0.6  // s that a compensator gets to forget its start
	whisper     = 1e-9 // m: an amplitude at which nothing is learned
)

// NoiseGain returns the largest gain of command over target, of all channels of a
// lane, for small sines of up to NoiseBand: by how much what is no motion in the
// target gets louder on its way to the actuator. It is measured on the
// compensators themselves, with what they start from.
func NoiseGain(s *scenarios.Scenario, lane string) (float64, error) {
	rate := s.Loop.Num("rate")
	top := min(NoiseBand, 0.45*rate)
	largest := 0.0
	for i := range s.Channels {
		part := s.Compensator(lane, i)
		entry, err := compensator.Kinds.Find(part.Kind.Name)
		if err != nil {
			return 0, err
		}
		c, err := entry.New(1/rate, part.Values)
		if err != nil {
			return 0, err
		}
		for k := range noiseLines {
			f := noiseLowest * math.Pow(top/noiseLowest, float64(k)/(noiseLines-1))
			largest = max(largest, gain(c, f, rate))
		}
	}
	return largest, nil
}

// gain is the amplitude of the command over that of a sine of frequency f, Hz, by
// least squares over the last whole periods.
func gain(c compensator.Compensator, f, rate float64) float64 {
	w, dt := 2*math.Pi*f, 1/rate
	skip := int(settling * rate)
	count := int(math.Ceil(math.Ceil(4*f/10) * rate / f))
	c.Start(0, 0)
	var sin, cos, ss, cc, sc float64
	measured := 0.0
	for k := range skip + count {
		t, before := float64(k+1)*dt, float64(k)*dt
		x := whisper * math.Sin(w*t)
		u := c.Command(compensator.Input{X: x, V: whisper * w * math.Cos(w*t), A: -w * w * whisper * math.Sin(w*before), Y: measured})
		measured = x
		if k < skip {
			continue
		}
		a, b := math.Sin(w*t), math.Cos(w*t)
		sin, cos = sin+u*a, cos+u*b
		ss, cc, sc = ss+a*a, cc+b*b, sc+a*b
	}
	det := ss*cc - sc*sc
	return math.Hypot(sin*cc-cos*sc, cos*ss-sin*sc) / det / whisper
}
