package canvas

import (
	"math"
	"strconv"
)

// A step is m·10^e with m of 1, 2 or 5. Kept as integers so that its multiples
// are the decimal numbers people expect: 3 steps of 1·10⁻¹ are 0.3, and not
// 0.30000000000000004.
type step struct {
	m int64
	e int
}

// stepAbove is the smallest step of at least v.
func stepAbove(v float64) step {
	if !(v > 1e-300) {
		v = 1e-300
	}
	v = min(v, 1e300)
	s := step{1, int(math.Floor(math.Log10(v)))}
	for s.times(1) > v { // the logarithm may have been rounded up
		s.e--
	}
	for s.times(1) < v {
		s = s.next()
	}
	return s
}

func (s step) next() step {
	switch s.m {
	case 1:
		return step{2, s.e}
	case 2:
		return step{5, s.e}
	}
	return step{1, s.e + 1}
}

func (s step) previous() step {
	switch s.m {
	case 5:
		return step{2, s.e}
	case 2:
		return step{1, s.e}
	}
	return step{5, s.e - 1}
}

// times is k steps. 10^|e| and k·m are exact up to |e| = 22, so that there the
// one division or product is rounded correctly.
func (s step) times(k float64) float64 {
	if s.e < 0 {
		return k * float64(s.m) / pow10(-s.e)
	}
	return k * float64(s.m) * pow10(s.e)
}

func pow10(n int) float64 {
	if n > 308 {
		return math.Inf(1)
	}
	return math.Pow10(n)
}

// decimals is how many digits after the point tell two ticks apart.
func (s step) decimals() int { return max(0, -s.e) }

// ticks appends the multiples of s between lo and hi to dst.
func (s step) ticks(dst []float64, lo, hi float64) []float64 {
	one := s.times(1)
	// A bound that misses a tick by a rounding error still has it.
	first, last := math.Ceil(lo/one-1e-9), math.Floor(hi/one+1e-9)
	if !(last-first < maxTicks) || math.Abs(first) > 1<<52 || math.Abs(last) > 1<<52 {
		return dst
	}
	for k := first; k <= last; k++ {
		dst = append(dst, s.times(k+0)) // +0 makes a plain zero of -0
	}
	return dst
}

// maxTicks is more than any axis shows; it bounds the work on a range that
// floating point cannot divide.
const maxTicks = 1000

// decimalLabel writes a tick of step s with the digits it needs.
func decimalLabel(v float64, s step) string {
	if a := math.Abs(v); a >= 1e6 || s.e < -6 {
		return strconv.FormatFloat(v, 'g', 6, 64)
	}
	return strconv.FormatFloat(v, 'f', s.decimals(), 64)
}

const (
	hugeValue = 1e150 // ranges are cut here so that their span stays finite
	tinyShare = 1e-9  // smallest span, relative to the values, that ticks can divide
)

// properRange makes a range that can be divided of any two numbers. A range
// that points downwards stays so.
func properRange(lo, hi float64) (float64, float64) {
	if math.IsNaN(lo) || math.IsNaN(hi) {
		return 0, 1
	}
	lo = math.Max(-hugeValue, math.Min(lo, hugeValue))
	hi = math.Max(-hugeValue, math.Min(hi, hugeValue))
	least := tinyShare * math.Max(math.Abs(lo), math.Abs(hi))
	if math.Abs(hi-lo) > math.Max(least, 1e-150) {
		return lo, hi
	}
	mid := lo/2 + hi/2
	half := math.Abs(mid) / 10
	if half < 1e-150 {
		half = 1
	}
	return mid - half, mid + half
}

// Extent is the smallest and largest finite value of all the series; both NaN
// when there is none.
func Extent(series ...[]float64) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, values := range series {
		for _, v := range values {
			if v < lo && v >= -math.MaxFloat64 {
				lo = v
			}
			if v > hi && v <= math.MaxFloat64 {
				hi = v
			}
		}
	}
	if lo > hi {
		return math.NaN(), math.NaN()
	}
	return lo, hi
}
