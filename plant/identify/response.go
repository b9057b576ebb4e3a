package identify

import (
	"math"
	"math/cmplx"

	"antelag/plant"
)

// Bin is the frequency response at one frequency.
type Bin struct {
	Hz         float64
	Gain       float64
	Delay      float64 // phase delay, s
	Coherence  float64
	GainSigma  float64 // standard errors
	DelaySigma float64 // s
}

// spectrum is the frequency response of a record, from command to measured.
// The measured one was moved ahead by the first guess of the delay before, since
// a delay makes the segments of the two signals see different things, which
// lowers gain and coherence; and where the power falls off steeply, a window lets
// in the neighbours' phase, which a delay makes another one.
type spectrum struct {
	*Spectra
	ahead       int     // ticks, by which measured was moved ahead
	part        float64 // of a tick more, on the straight line to the next sample
	tick        float64
	first, last int // bins of the band
	band        [2]float64
	averages    int
	narrow      bool    // a single sine, or as good as one
	speed       float64 // mean frequency of the velocity's power, Hz
}

// The band goes from where this share of the command's power lies below to
// where it lies above of the power of its velocity: displacement counts low
// frequencies, velocity counts those at which a delay shows.
const outside = 0.01

// spectrumOf finds the spectra around a first guess of the delay.
func spectrumOf(rec Record, g guess, segment int) (*spectrum, error) {
	n := len(rec.Command)
	whole, part := math.Modf(min(max(g.total/rec.Tick, 0), float64(n/4)))
	ahead := int(whole)
	x, y := rec.Command[:n-ahead-1], make([]float64, n-ahead-1)
	for k := range y {
		y[k] = rec.Measured[k+ahead] + part*(rec.Measured[k+ahead+1]-rec.Measured[k+ahead])
	}
	if segment <= 0 {
		segment = segmentFor(len(x), rec.Tick)
	}
	s, err := Welch(x, y, rec.Tick, segment)
	if err != nil {
		return nil, err
	}
	sp := &spectrum{Spectra: s, ahead: ahead, part: part, tick: rec.Tick, averages: s.Segments}
	sp.findBand()
	return sp, nil
}

// segmentFor is a power of two: some eight segments in the record, none longer
// than 20 s.
func segmentFor(n int, tick float64) int {
	most := min(float64(n)/5, 20/tick)
	return max(1<<int(math.Log2(max(most, 1))), min(n, 32))
}

func (s *spectrum) findBand() {
	var power, speed, moment float64
	peak := 0.0
	for i := 1; i < len(s.Hz); i++ {
		peak = max(peak, s.XX[i])
	}
	// A command that is fed by noisy forces has a floor of noise, which is no
	// motion.
	counts := func(i int) bool { return s.XX[i] > 1e-6*peak }
	for i := 1; i < len(s.Hz); i++ {
		if counts(i) {
			power += s.XX[i]
			v := s.XX[i] * s.Hz[i] * s.Hz[i]
			speed += v
			moment += v * s.Hz[i]
		}
	}
	if !(power > 0) {
		s.first, s.last = 1, len(s.Hz)-1
		s.band = [2]float64{s.Hz[s.first], s.Hz[s.last]}
		s.speed = s.Hz[s.last] / 2
		return
	}
	s.speed = moment / speed
	s.first, s.last = 0, len(s.Hz)-1
	below, above := 0.0, 0.0
	for i := 1; i < len(s.Hz) && below < outside*power; i++ {
		if counts(i) {
			below += s.XX[i]
		}
		s.first = i
	}
	for i := len(s.Hz) - 1; i > s.first && above < outside*speed; i-- {
		if counts(i) {
			above += s.XX[i] * s.Hz[i] * s.Hz[i]
		}
		s.last = i
	}
	s.last = max(s.last, s.first)
	s.band = [2]float64{s.Hz[s.first], s.Hz[s.last]}
	// Under a Hann window a sine is four bins wide.
	s.narrow = s.last-s.first <= 4
}

// at is the response at bin i, without the shift: that of the straight line
// between two samples is 1 − part + part·e^(iωT), T the tick. At half the rate and
// half a tick it is 0, and there is nothing to be told.
func (s *spectrum) at(i int) complex128 {
	turn := 2 * math.Pi * s.Hz[i] * s.tick
	line := complex(1-s.part, 0) + cmplx.Rect(s.part, turn)
	if cmplx.Abs(line) < 1e-6 {
		return 0
	}
	return s.Response(i) / line * cmplx.Rect(1, -turn*float64(s.ahead))
}

// held is by how much the samples of a held command come early: a step is
// there half a tick before its middle.
func held(h plant.Hold, tick float64) float64 {
	if h == plant.Step {
		return tick / 2
	}
	return 0
}

// response lists the band. The phase is that of the fit plus the little by
// which the data differ from it, so that whole turns are not lost. Standard
// errors after Bendat & Piersol (2010): (1−γ²)/(2nγ²) is the variance of the
// phase and of the relative gain.
func (s *spectrum) response(f *Fit, hold plant.Hold) (bins []Bin, lowest float64) {
	lowest = math.Inf(1)
	n := s.Independent()
	for i := s.first; i <= s.last; i++ {
		omega := 2 * math.Pi * s.Hz[i]
		h := s.at(i) * cmplx.Rect(1, -omega*held(hold, f.evid.tick))
		g := f.at(omega)
		c := s.Coherence(i)
		sigma := math.Sqrt(max(0, 1-c) / (2 * n * c))
		bins = append(bins, Bin{
			Hz: s.Hz[i], Gain: cmplx.Abs(h), Coherence: c,
			Delay:     phaseDelay(f, omega) - cmplx.Phase(h*cmplx.Conj(g))/omega,
			GainSigma: cmplx.Abs(h) * sigma, DelaySigma: sigma / omega,
		})
		lowest = min(lowest, c)
	}
	return bins, lowest
}
