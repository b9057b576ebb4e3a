package identify

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// evidence is what a fit leaves, for judging it.
type evidence struct {
	tick     float64
	skip     int
	residual []float64 // from skip on, m
	state    *state
	// wider is the factor by which coloured residuals widen the standard error
	// of the total delay over that of white ones.
	wider float64
}

// batches is into how many stretches the record is cut to see whether the fit is
// as steady as its standard errors say.
const batches = 30

// conclude turns the point that was found into estimates.
//
// The residual is noise of the sensor, filtered perhaps, and what the model
// leaves out: it is not white. With J the derivatives of the answer and N = JᵀJ,
// the covariance of the estimates is
//
//	N⁻¹·S·N⁻¹,   S = Jᵀ·C·J,
//
// C the covariance of the residual (the sandwich form; Huber 1967). The residual
// is taken for an autoregressive process r = e/A(q), of an order chosen by
// Akaike's criterion; then S = σ_e²·ZᵀZ, Z the columns of J filtered by 1/A
// backwards in time. Where the scores of thirty stretches scatter more than
// twice as wide as that, as they do when the actuator is no such model, the
// scatter counts (batch means).
func (f *fitter) conclude(fit *Fit, got *state, skip int) error {
	s := fit.shape
	cols, err := f.columns(s, got, skip, true)
	if err != nil {
		return err
	}
	r := f.residual(got, skip)
	fit.param = got.p
	fit.evid = evidence{tick: f.rec.Tick, skip: skip, residual: r, state: got, wider: 1}
	fit.NRMSE = math.Sqrt(got.rss/float64(len(r))) / spread(f.rec.Measured[skip:])
	f.estimate(fit, got, covariance(cols, r, &fit.evid.wider))
	return nil
}

// estimate fills in the values, with standard errors from the covariance of
// parameters, gain and offset; nil has none.
func (f *fitter) estimate(fit *Fit, got *state, cov *mat.SymDense) {
	s := fit.shape
	of := func(value func(p []float64) float64) Estimate {
		p := make([]float64, s.n)
		grad := make([]float64, s.n)
		v := value(got.p)
		for i := range grad {
			copy(p, got.p)
			h := 0.01 * s.nudge(got.p, i)
			p[i] = got.p[i] + h
			grad[i] = (value(p) - v) / h
		}
		return Estimate{v, deviation(cov, grad)}
	}
	unit := func(i int) []float64 {
		g := make([]float64, s.n+2)
		g[i] = 1
		return g
	}
	fit.Gain = Estimate{got.gain, deviation(cov, unit(s.n))}
	fit.Offset = Estimate{got.offset, deviation(cov, unit(s.n+1))}
	fit.Delay = of(func(p []float64) float64 { return p[0] - s.lag(p) })
	fit.Total = of(func(p []float64) float64 { return s.lateness(p, 0) })
	fit.Phase = of(func(p []float64) float64 { return f.inBand(s, p) })
	fit.Lag = of(s.lag)
	if s.n == 2 {
		lagErrors(fit, got.p[1], deviation(cov, unit(1)))
	}
	if s.n > 2 {
		fit.Frequency = of(func(p []float64) float64 { return 1 / (2 * math.Pi * p[2]) })
		fit.Damping = of(func(p []float64) float64 { return p[1] / (2 * p[2]) })
	}
}

// lagErrors are those of T and τ from m = T² and its standard error. The slope
// 1/2T is no measure where T is hardly there; so the error of T is the farther
// of what one standard error of m means upwards and downwards.
func lagErrors(fit *Fit, m, sigma float64) {
	lag := math.Sqrt(m)
	up, down := math.Sqrt(m+sigma)-lag, lag-math.Sqrt(max(m-sigma, 0))
	was := fit.Lag.Sigma
	fit.Lag.Sigma = max(up, down)
	if m > 9*sigma {
		fit.Delay.Sigma *= fit.Lag.Sigma / was
	} else {
		fit.Delay.Sigma = math.Hypot(fit.Total.Sigma, fit.Lag.Sigma)
	}
}

// inBand is the phase delay in the band, weighted with the velocity's power.
func (f *fitter) inBand(s shape, p []float64) float64 {
	sum, weight := 0.0, 0.0
	for i := max(f.spectrum.first, 1); i <= f.spectrum.last; i++ {
		omega := 2 * math.Pi * f.spectrum.Hz[i]
		w := f.spectrum.XX[i] * omega * omega
		sum += w * s.lateness(p, omega)
		weight += w
	}
	if !(weight > 0) {
		return s.lateness(p, 0)
	}
	return sum / weight
}

// deviation is √(gᵀCg).
func deviation(cov *mat.SymDense, g []float64) float64 {
	if cov == nil {
		return math.Inf(1)
	}
	v := 0.0
	for i, a := range g {
		for j, b := range g {
			v += a * b * cov.At(i, j)
		}
	}
	return math.Sqrt(max(v, 0))
}

// covariance of the estimates; nil where the data leave one of them open.
func covariance(cols [][]float64, r []float64, wider *float64) *mat.SymDense {
	n, m := len(r), len(cols)
	scale := make([]float64, m)
	for i, c := range cols {
		for _, v := range c {
			scale[i] += v * v
		}
		if !(scale[i] > 0) {
			return nil
		}
		scale[i] = 1 / math.Sqrt(scale[i])
		for k := range c {
			c[k] *= scale[i]
		}
	}
	var c mat.Cholesky
	if !c.Factorize(products(cols)) || c.Cond() > 1e13 {
		return nil
	}
	var inverse mat.SymDense
	if err := c.InverseTo(&inverse); err != nil {
		return nil
	}
	scatter := scattered(cols, r)
	white := meanSquare(r)
	a, power := autoregression(r)
	before := make([][]float64, m)
	for i, col := range cols {
		before[i] = backwards(col, a)
	}
	meat := products(cols)
	meat.AddSym(meat, products(before))
	meat.ScaleSym(power*float64(n)/float64(n-m), meat)
	cov, batch := sandwich(&inverse, meat), sandwich(&inverse, scatter)
	if naive := white * (inverse.At(0, 0)); naive > 0 {
		*wider = math.Sqrt(max(cov.At(0, 0)/naive, 1))
	}
	worst := 1.0
	for i := range m {
		if ratio := batch.At(i, i) / cov.At(i, i); ratio > 4 {
			worst = max(worst, ratio)
		}
	}
	if worst > 1 {
		cov = batch
	}
	for i := range m {
		for j := i; j < m; j++ {
			cov.SetSym(i, j, cov.At(i, j)*scale[i]*scale[j])
		}
	}
	return cov
}

func products(cols [][]float64) *mat.SymDense {
	m := len(cols)
	out := mat.NewSymDense(m, nil)
	for i := range m {
		for j := i; j < m; j++ {
			out.SetSym(i, j, dot(cols[i], cols[j]))
		}
	}
	return out
}

func dot(a, b []float64) float64 {
	s := 0.0
	b = b[:len(a)]
	for k, v := range a {
		s += v * b[k]
	}
	return s
}

func sandwich(bread, meat *mat.SymDense) *mat.SymDense {
	var d mat.Dense
	d.Mul(bread, meat)
	d.Mul(&d, bread)
	m := bread.SymmetricDim()
	out := mat.NewSymDense(m, nil)
	for i := range m {
		for j := i; j < m; j++ {
			out.SetSym(i, j, (d.At(i, j)+d.At(j, i))/2)
		}
	}
	return out
}

// scattered is S from the scores of stretches.
func scattered(cols [][]float64, r []float64) *mat.SymDense {
	n, m := len(r), len(cols)
	out := mat.NewSymDense(m, nil)
	score := make([]float64, m)
	for b := range batches {
		from, to := b*n/batches, (b+1)*n/batches
		for i, c := range cols {
			score[i] = dot(c[from:to], r[from:to])
		}
		out.SymRankOne(out, 1, mat.NewVecDense(m, score))
	}
	return out
}

// regress is the least squares of r on columns.
func regress(cols [][]float64, r []float64) ([]float64, bool) {
	m := len(cols)
	slope := make([]float64, m)
	for i, c := range cols {
		slope[i] = dot(c, r)
	}
	return damped(products(cols), slope, 0, nil)
}

// leftover is what r has beside its regression.
func leftover(cols [][]float64, r, b []float64) []float64 {
	out := make([]float64, len(r))
	for k := range r {
		out[k] = r[k]
		for i, c := range cols {
			out[k] -= b[i] * c[k]
		}
	}
	return out
}
