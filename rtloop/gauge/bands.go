package gauge

import (
	"maps"
	"math"
	"math/cmplx"
	"slices"
)

// Band is how measured answers target in one third of an octave: what a tracking
// test says of the frequency response.
type Band struct {
	Frequency float64 // power-weighted centre, Hz
	Amplitude float64 // |ΣY·X̄/Σ|X|²|
	Delay     float64 // −arg/(2π·Frequency), s, positive when late, within half a period
}

// bandsPerOctave is the usual width of analysis in acoustics and vibration
// (IEC 61260: one-third octave).
const bandsPerOctave = 3

// What a band must hold to say anything: so many lines of the spectrum, and
// power per hertz not below this share of the strongest band's.
const (
	fewLines = 3
	quiet    = 0.01
)

// bandSums are the sums of the response by band, over segments of equal length.
type bandSums map[int]bandSum

type bandSum struct {
	cross         complex128 // ΣY·X̄
	power, moment float64    // Σ|X|², Σf|X|², f in cycles per tick
	lines         int
}

// bandOf is the band of a frequency in cycles per tick: the third of an octave
// that it lies in, counted down from the rate.
func bandOf(f float64) int { return int(math.Floor(bandsPerOctave * math.Log2(f))) }

// add adds the spectra that the workspace holds, of n ticks.
func (s bandSums) add(w *workspace, n int) {
	for i := 1; i < len(w.fx); i++ {
		x, y := w.fx[i], w.fy[i]
		f := float64(i) / float64(n)
		p := real(x)*real(x) + imag(x)*imag(x)
		band := bandOf(f)
		b := s[band]
		b.cross += y * cmplx.Conj(x)
		b.power += p
		b.moment += p * f
		b.lines++
		s[band] = b
	}
}

// result lists the bands that the target filled, from low to high.
func (s bandSums) result(tick float64) []Band {
	density := func(band int) float64 { return s[band].power / math.Exp2(float64(band)/bandsPerOctave) }
	most := 0.0
	for band := range s {
		most = max(most, density(band))
	}
	var out []Band
	for _, band := range slices.Sorted(maps.Keys(s)) {
		b := s[band]
		if b.lines < fewLines || b.power == 0 || density(band) < quiet*most {
			continue
		}
		h := b.cross / complex(b.power, 0)
		f := b.moment / b.power / tick
		out = append(out, Band{f, cmplx.Abs(h), (0 - cmplx.Phase(h)) / (2 * math.Pi * f)})
	}
	return out
}
