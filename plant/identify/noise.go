package identify

import "math"

// longestMemory is the largest order of the autoregressive model of a residual.
const longestMemory = 32

// autoregression fits r_k + a₁r_{k−1} + … = e_k by Levinson's recursion (Levinson
// 1947), of the order that Akaike's criterion likes best, and returns a and the
// power of e.
func autoregression(r []float64) (a []float64, power float64) {
	n := len(r)
	most := min(longestMemory, n/20)
	c := make([]float64, most+1)
	for l := range c {
		for k := l; k < n; k++ {
			c[l] += r[k] * r[k-l]
		}
		c[l] /= float64(n)
	}
	power = c[0]
	if !(power > 0) {
		return nil, 0
	}
	best := float64(n) * math.Log(power)
	now, left := []float64(nil), power
	for order := 1; order <= most; order++ {
		k := c[order]
		for i, v := range now {
			k += v * c[order-1-i]
		}
		k = -k / left
		next := make([]float64, order)
		for i, v := range now {
			next[i] = v + k*now[order-2-i]
		}
		next[order-1] = k
		now = next
		left *= 1 - k*k
		if !(left > 1e-14*c[0]) {
			break
		}
		if aic := float64(n)*math.Log(left) + 2*float64(order); aic < best {
			best, a, power = aic, now, left
		}
	}
	return a, power
}

// backwards filters by 1/A from the end to the beginning, and on before it, where
// the noise of the first samples comes from; that part, back to front, is
// returned.
func backwards(x, a []float64) (before []float64) {
	for k := len(x) - 1; k >= 0; k-- {
		v := x[k]
		for i := 0; i < len(a) && k+1+i < len(x); i++ {
			v -= a[i] * x[k+1+i]
		}
		x[k] = v
	}
	before = make([]float64, min(len(x), 1024))
	for k := range before {
		for i, w := range a {
			if back := k - 1 - i; back >= 0 {
				before[k] -= w * before[back]
			} else {
				before[k] -= w * x[-1-back]
			}
		}
	}
	return before
}

func meanSquare(x []float64) float64 {
	s := 0.0
	for _, v := range x {
		s += v * v
	}
	return s / float64(len(x))
}

// whitened is the mean square of what remains of x after A.
func whitened(x, a []float64) float64 {
	s := 0.0
	for k := len(a); k < len(x); k++ {
		e := x[k]
		for i, v := range a {
			e += v * x[k-1-i]
		}
		s += e * e
	}
	return s / float64(len(x)-len(a))
}

// compare returns by how much the Bayesian information criterion of the rich fit
// is below that of the plain one (Schwarz 1978), with both residuals whitened
// by the same model.
func (f *fitter) compare(plain, rich *Fit) float64 {
	from := max(plain.evid.skip, rich.evid.skip)
	a := plain.evid.residual[from-plain.evid.skip:]
	b := rich.evid.residual[from-rich.evid.skip:]
	n := float64(len(a))
	filter, _ := autoregression(b)
	floor := 1e-9 * spread(f.rec.Measured)
	va, vb := whitened(a, filter)+floor*floor, whitened(b, filter)+floor*floor
	return n*math.Log(va/vb) - float64(rich.shape.n-plain.shape.n)*math.Log(n)
}
