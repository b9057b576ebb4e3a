package identify

import (
	"math"
	"math/bits"
	"math/cmplx"

	"gonum.org/v1/gonum/dsp/fourier"
)

// guess is what the cross-correlation tells.
type guess struct {
	total float64 // s, by which measured is behind command; may be negative
}

// mostCorrelated bounds the samples that the first guess is made from.
const mostCorrelated = 1 << 17

// firstGuess is where the correlation of command and measured peaks, with a
// parabola through it. The correlation is the raw one, which falls off with
// the lag: of the many peaks of a sine it prefers the nearest.
func firstGuess(rec Record) guess {
	from, to := loudest(rec.Command, mostCorrelated)
	u, y := rec.Command[from:to], rec.Measured[from:to]
	n := len(u)
	reach := min(n/2, int(1.25*longestTime/rec.Tick))
	size := 1 << bits.Len(uint(n+reach))
	fft := fourier.NewFFT(size)
	fu, fy := fft.Coefficients(nil, centred(u, size)), fft.Coefficients(nil, centred(y, size))
	for i := range fu {
		fu[i] = cmplx.Conj(fu[i]) * fy[i]
	}
	c := fft.Sequence(nil, fu)
	at := func(lag int) float64 { return c[(lag+size)%size] }
	// Little before zero: what leads is no actuator, but a clock may be off.
	best := 0
	for lag := -reach / 8; lag <= reach; lag++ {
		if math.Abs(at(lag)) > math.Abs(at(best)) {
			best = lag
		}
	}
	l, m, r := at(best-1), at(best), at(best+1)
	top := 0.0
	if bend := l - 2*m + r; bend != 0 {
		top = min(max((l-r)/(2*bend), -0.5), 0.5)
	}
	return guess{total: (float64(best) + top) * rec.Tick}
}

// centred is x without its mean and padded with zeros.
func centred(x []float64, size int) []float64 {
	out := make([]float64, size)
	m, s := mean(x), spread(x)
	for i, v := range x {
		out[i] = (v - m) / s
	}
	return out
}

// zetas are the damping ratios that a second-order fit starts from; a lag-delay
// has one start.
func (s shape) zetas() []float64 {
	if s.n < 3 {
		return []float64{math.Inf(1)}
	}
	return []float64{0.15, 0.4, 0.7, 1.2}
}

// starts returns, for each damping ratio, the parameters whose frequency
// response is nearest to the measured one.
func (f *fitter) starts(s shape) [][]float64 {
	var out [][]float64
	for _, zeta := range s.zetas() {
		var best []float64
		least := math.Inf(1)
		// The total is sought finely: a little off in it outweighs all the rest.
		for stretch := 0.7; stretch < 1.3; stretch += 0.02 {
			total := max(stretch*f.first.total, f.rec.Tick/4)
			for _, part := range []float64{0.02, 0.2, 0.4, 0.6, 0.8, 1} {
				lag := part * total
				p := []float64{total, lag * lag}
				if s.n > 2 {
					p = []float64{total, lag, lag / (2 * zeta)}
				}
				s.clamp(p)
				if miss := f.miss(s, p); best == nil || miss < least {
					best, least = p, miss
				}
			}
		}
		out = append(out, best)
	}
	return out
}

// miss is how far the measured frequency response is from that of parameters,
// with the best real gain, weighted with the power of the command.
func (f *fitter) miss(s shape, p []float64) float64 {
	sp := f.spectrum
	var hh, hg, gg float64
	for i := max(sp.first-1, 1); i <= min(sp.last+1, len(sp.Hz)-1); i++ {
		omega := 2 * math.Pi * sp.Hz[i]
		h := sp.at(i) * cmplx.Rect(1, -omega*held(f.rec.Hold, f.rec.Tick))
		g := s.at(p, omega)
		w := sp.XX[i]
		hh += w * real(h*cmplx.Conj(h))
		hg += w * real(h*cmplx.Conj(g))
		gg += w * real(g*cmplx.Conj(g))
	}
	if !(gg > 0) {
		return math.Inf(1)
	}
	return hh - hg*hg/gg
}
