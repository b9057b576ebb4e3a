package gauge

// Sum is a running sum with Neumaier compensation: the rounding error of every
// addition is kept in a second number, so that 2·10⁸ terms lose no more than
// the last bit or two of their sum. The zero value is an empty sum.
//
// Neumaier (1974) finds the error of an addition by comparing magnitudes; here
// it is Knuth's branch-free form of the same exact error, which is cheaper when
// the signs and sizes of the terms cannot be predicted.
type Sum struct {
	sum, lost float64
}

// Add adds v.
func (s *Sum) Add(v float64) {
	t := s.sum + v
	kept := t - s.sum
	s.lost += (s.sum - (t - kept)) + (v - kept)
	s.sum = t
}

// Value returns the sum of everything added so far.
func (s *Sum) Value() float64 { return s.sum + s.lost }
