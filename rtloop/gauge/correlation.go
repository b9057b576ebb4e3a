package gauge

import "math"

// The delay by cross-correlation is the lag l, ticks, at which the mean-removed
// target x and measured y correlate best, y late for l > 0.
//
// Which peak: that of the sums s(l) = Σ_k x_k·y_{k+l} over the part where the two
// overlap, undivided (the biased estimate), because a lag that sets little
// against little cannot then win by chance. Peaks of a periodic motion repeat
// every period; of those within 3 % of the highest the one nearest to zero lag
// is meant.
//
// Where it is: at the peak of the correlation coefficient of the overlapping
// parts, each with its own mean and energy,
//
//	ρ(l) = Σ(x_k − x̄)(y_{k+l} − ȳ) / √(Σ(x_k − x̄)² Σ(y_{k+l} − ȳ)²),
//
// with a parabola through the three samples at the peak. The biased estimate is
// s(l) and shrinks as the overlap does, which draws the peak towards zero: for a
// sine of ω rad a tick over n ticks by 1/(ω²n) ticks, more than a tick for 20 s of
// 2 Hz at 2048 Hz. Dividing by the overlap (the unbiased estimate) still leaves
// an error of that order from the part of a period that the overlap cuts off.
// The coefficient has neither: for y_k = g·x_{k−d} + c it is 1 at l = d and, by
// Cauchy–Schwarz, nowhere more, however short the record.

// near is how close to the highest a peak must come to be taken for a repeat.
const near = 0.97

// pickPeak returns the lag of the peak meant, from sums at lags −m·stride …
// m·stride in steps of stride; NaN if there is none inside that range.
func pickPeak(sums []float64, stride int) float64 {
	middle := len(sums) / 2
	highest := 0.0
	for _, s := range sums {
		highest = max(highest, s)
	}
	best := math.NaN()
	for i := 1; i+1 < len(sums); i++ {
		a, b, c := sums[i-1], sums[i], sums[i+1]
		if !(b > a && b >= c) {
			continue
		}
		offset := vertex(a, b, c)
		if b+(c-a)*offset/4 < near*highest {
			continue
		}
		at := float64(i-middle) + offset
		if math.IsNaN(best) || math.Abs(at) < math.Abs(best) {
			best = at
		}
	}
	return best * float64(stride)
}

// climb goes from the given lag up to the nearest peak of f and returns where
// the parabola through it has its vertex; NaN if there is none within ±most.
func climb(from float64, most int, f func(lag int) float64) float64 {
	if math.IsNaN(from) || most < 1 {
		return math.NaN()
	}
	at := min(max(int(math.Round(from)), 1-most), most-1)
	a, b, c := f(at-1), f(at), f(at+1)
	for b < c || b < a {
		if c >= a {
			at++
			if at == most {
				return math.NaN()
			}
			a, b, c = b, c, f(at+1)
		} else {
			at--
			if at == -most {
				return math.NaN()
			}
			a, b, c = f(at-1), a, b
		}
	}
	return float64(at) + vertex(a, b, c)
}

// vertex is where the parabola through a, b, c at −1, 0, 1 has its vertex; 0 when
// the three are level.
func vertex(a, b, c float64) float64 {
	bend := a - 2*b + c
	if bend == 0 {
		return 0
	}
	return (a - c) / (2 * bend)
}

// overlap works out the coefficient of one record at single lags.
type overlap struct {
	x, y           []float64
	sx, sy, qx, qy float64 // Σx, Σy, Σx², Σy²
}

func (o *overlap) total() {
	o.sx, o.qx = sumSquares(o.x)
	o.sy, o.qy = sumSquares(o.y)
}

func (o *overlap) coefficient(lag int) float64 {
	n := len(o.x)
	m := max(lag, -lag)
	x, y := o.x[:n-m], o.y[m:]
	cutX, cutY := o.x[n-m:], o.y[:m]
	if lag < 0 {
		x, y = o.x[m:], o.y[:n-m]
		cutX, cutY = o.x[:m], o.y[n-m:]
	}
	sx, qx := sumSquares(cutX)
	sy, qy := sumSquares(cutY)
	sx, qx, sy, qy = o.sx-sx, o.qx-qx, o.sy-sy, o.qy-qy
	k := float64(n - m)
	return (dot(x, y) - sx*sy/k) / math.Sqrt((qx-sx*sx/k)*(qy-sy*sy/k))
}

// lagSums are the sums of the coefficient at every lag −max … max, added over
// segments: Σxy, Σx² and Σy² about each segment's own overlap means.
type lagSums struct {
	max        int
	xy, xx, yy []float64
}

func newLagSums(most int) lagSums {
	n := 2*most + 1
	all := make([]float64, 3*n)
	return lagSums{max: most, xy: all[:n:n], xx: all[n : 2*n : 2*n], yy: all[2*n:]}
}

func (s lagSums) clone() lagSums {
	c := newLagSums(s.max)
	copy(c.xy, s.xy)
	copy(c.xx, s.xx)
	copy(c.yy, s.yy)
	return c
}

// add adds the segment that the workspace holds.
func (s *lagSums) add(w *workspace) {
	for i, v := range w.correlate(1, s.max) {
		s.xy[i] += v
	}
	n := len(w.x)
	sx, qx := sumSquares(w.x)
	sy, qy := sumSquares(w.y)
	late := [4]float64{sx, qx, sy, qy} // x without its last, y without its first
	early := late
	for m := 0; ; m++ {
		s.addOverlap(s.max+m, n-m, late)
		if m > 0 {
			s.addOverlap(s.max-m, n-m, early)
		}
		if m == s.max {
			return
		}
		first, last := point{w.x[m], w.y[m]}, point{w.x[n-1-m], w.y[n-1-m]}
		late = without(late, last.x, first.y)
		early = without(early, first.x, last.y)
	}
}

func (s *lagSums) addOverlap(i, n int, t [4]float64) {
	k := float64(n)
	s.xy[i] -= t[0] * t[2] / k
	s.xx[i] += t[1] - t[0]*t[0]/k
	s.yy[i] += t[3] - t[2]*t[2]/k
}

func without(t [4]float64, x, y float64) [4]float64 {
	return [4]float64{t[0] - x, t[1] - x*x, t[2] - y, t[3] - y*y}
}

func (s *lagSums) coefficient(lag int) float64 {
	i := s.max + lag
	return s.xy[i] / math.Sqrt(s.xx[i]*s.yy[i])
}

// dot returns Σx·y of slices of the same length, on four sums so that no
// addition waits for the one before.
func dot(x, y []float64) float64 {
	y = y[:len(x)]
	var a, b, c, d float64
	for len(x) >= 4 && len(y) >= 4 {
		a += x[0] * y[0]
		b += x[1] * y[1]
		c += x[2] * y[2]
		d += x[3] * y[3]
		x, y = x[4:], y[4:]
	}
	for i, v := range x {
		a += v * y[i]
	}
	return (a + b) + (c + d)
}

// sumSquares returns Σx and Σx².
func sumSquares(x []float64) (sum, squares float64) {
	var a, b, p, q float64
	for len(x) >= 2 {
		a += x[0]
		b += x[1]
		p += x[0] * x[0]
		q += x[1] * x[1]
		x = x[2:]
	}
	for _, v := range x {
		a += v
		p += v * v
	}
	return a + b, p + q
}
