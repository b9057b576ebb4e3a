package plant

import "math"

// straight returns how T·ẏ + y = w answers a straight line: where w runs from
// a to b in the time d,
//
//	y(d) = E·y(0) + A·a + B·b,   E = e^(−r), A = p − E, B = 1 − p,
//	p = (1 − e^(−r))/r, r = d/T,
//
// so that E + A + B = 1. T = 0 gives y(d) = b, d = 0 gives y(d) = y(0). Below
// r = 1/4 the differences would cancel, so A and B come from their series.
func straight(d, lag float64) (e, a, b float64) {
	switch {
	case d == 0:
		return 1, 0, 0
	case lag == 0:
		return 0, 0, 1
	}
	r := d / lag
	e = math.Exp(-r)
	if r >= 0.25 {
		p := -math.Expm1(-r) / r
		return e, p - e, 1 - p
	}
	// A = Σ −(−r)^k·k/(k+1)!, B = Σ −(−r)^k/(k+1)!, k = 1, 2, …; fourteen
	// terms leave less than 1e-19 of the first.
	term := -1.0
	for k := 1.0; k <= 14; k++ {
		term *= -r / (k + 1)
		a += k * term
		b += term
	}
	return e, a, b
}

// smallest is the weight below which a past sample is as good as forgotten:
// 2⁻²⁰⁰ of it. Dropping it keeps denormal numbers, which are slow, out of the
// weights.
const smallest = 0x1p-200

func flush(w float64) float64 {
	if math.Abs(w) < smallest {
		return 0
	}
	return w
}
