package excitation

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
)

// integrated is a target from a record of acceleration a, m/s²: after the
// baseline correction it is linear between the record's samples, and so
// exactly, from sample j on,
//
//	x(t) = x_j + v_j·u + a_j·u²/2 + (a_{j+1} − a_j)·u³/(6Δ),   u = t − jΔ,
//
// with x = v = 0 at the first sample: x” is the corrected acceleration at
// every instant, at any step. After the last sample x is zero. In a model
// whose lengths are λ times those of the prototype Δ is the record's step
// times √λ, which makes x λ times and v √λ times that of the prototype.
type integrated struct {
	clock
	a       []float64
	every   float64 // Δ, s
	j       int     // the present interval
	m       motionState
	a2, da6 float64 // a_j/2 and (a_{j+1} − a_j)/(6Δ)
}

// newIntegrated corrects and integrates the record between start and end, s
// of record time, which are moved to the nearest samples.
func newIntegrated(clk clock, rec *Record, start, end float64, v kind.Values) (Source, error) {
	a, step, err := evenly(rec)
	if err != nil {
		return nil, err
	}
	first := rec.First()
	from := int(math.Round((start - first) / step))
	to := min(int(math.Round((end-first)/step))+1, len(a))
	a = a[min(from, to):to]
	if err := correctBaseline(a, step, v.Num("corner_frequency")); err != nil {
		return nil, err
	}
	s := &integrated{clock: clk, a: a, every: step * math.Sqrt(v.Num("length_factor"))}
	s.polynomial()
	return s, nil
}

const (
	// evenWithin is how far the instants of a file may stand from even ones,
	// in steps, and still be even ones written in too few digits.
	evenWithin = 0.1
	// mostSamples bounds what becomes of a record at uneven instants.
	mostSamples = 1e7
)

// evenly returns the values at even steps, s. Instants that are even but for
// their digits are taken as even; others are filled up on straight lines at
// the shortest of their intervals.
func evenly(rec *Record) ([]float64, float64, error) {
	if rec.Times == nil {
		return rec.Values, rec.Step, nil
	}
	n := len(rec.Times)
	length := rec.Last() - rec.First()
	step, shortest, even := length/float64(n-1), math.Inf(1), true
	for i, t := range rec.Times {
		even = even && math.Abs(t-rec.First()-float64(i)*step) <= evenWithin*step
		if i > 0 {
			shortest = math.Min(shortest, t-rec.Times[i-1])
		}
	}
	if even {
		return rec.Values, step, nil
	}
	count := math.Ceil(length/shortest) + 1
	if count > mostSamples {
		return nil, 0, fmt.Errorf("file: intervals from %.3g s on in a record of %g s; at even steps that is more than %g samples", shortest, length, mostSamples)
	}
	// The whole length in even steps, none longer than the shortest interval.
	step = length / (count - 1)
	s := uneven{clock: clock{step: step}, times: rec.Times, values: rec.Values, start: rec.First(), end: rec.Last(), after: rec.Values[n-1]}
	values := make([]float64, int(count))
	s.Fill(values)
	return values, step, nil
}

// polynomial readies the present interval.
func (s *integrated) polynomial() {
	s.a2 = s.a[s.j] / 2
	s.da6 = (s.a[s.j+1] - s.a[s.j]) / (6 * s.every)
}

func (s *integrated) Fill(dst []float64) {
	last := float64(len(s.a) - 1)
	for i := range dst {
		p := s.tick() / s.every
		if p >= last {
			dst[i] = 0
			continue
		}
		if j := int(p); j != s.j {
			for ; s.j < j; s.j++ {
				s.m.over(s.every, s.a[s.j], s.a[s.j+1])
			}
			s.polynomial()
		}
		u := (p - float64(s.j)) * s.every
		dst[i] = s.m.x + u*(s.m.v+u*(s.a2+u*s.da6))
	}
}
