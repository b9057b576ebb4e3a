package identify

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// trend is how delay, s, and gain change with the amplitude A, m, over the
// windows of a record: the least squares of
//
//	r = −(α + β·A)·v + (γ + δ·A)·y
//
// in all of them; it returns β, s/m, and its standard error, from the scatter of
// the windows' scores (the sandwich form, by clusters; Liang & Zeger 1986), which
// asks nothing of the residual within a window.
func trend(windows []window) Estimate {
	centre, far := 0.0, 0.0
	for _, w := range windows {
		centre += w.amplitude / float64(len(windows))
	}
	for _, w := range windows {
		far = max(far, math.Abs(w.amplitude-centre))
	}
	const m = 4
	sum := mat.NewSymDense(m, nil)
	right := mat.NewVecDense(m, nil)
	each := func(w window, do func(a *mat.SymDense, b *mat.VecDense)) {
		a := (w.amplitude - centre) / far
		scale := []float64{1, a, 1, a}
		part := []float64{w.vv, -w.vy, w.yy}
		n, b := mat.NewSymDense(m, nil), mat.NewVecDense(m, nil)
		for i := range m {
			for j := i; j < m; j++ {
				n.SetSym(i, j, scale[i]*scale[j]*part[i/2+j/2])
			}
			b.SetVec(i, scale[i]*[]float64{-w.rv, w.ry}[i/2])
		}
		do(n, b)
	}
	for _, w := range windows {
		each(w, func(a *mat.SymDense, b *mat.VecDense) {
			sum.AddSym(sum, a)
			right.AddVec(right, b)
		})
	}
	var c mat.Cholesky
	if n := len(windows); n <= 2*m || !(far > 0) || !c.Factorize(sum) || c.Cond() > 1e12 {
		return Estimate{0, math.Inf(1)}
	}
	var theta mat.VecDense
	var inverse mat.SymDense
	if c.SolveVecTo(&theta, right) != nil || c.InverseTo(&inverse) != nil {
		return Estimate{0, math.Inf(1)}
	}
	meat := mat.NewSymDense(m, nil)
	for _, w := range windows {
		each(w, func(a *mat.SymDense, b *mat.VecDense) {
			var score mat.VecDense
			score.MulVec(a, &theta)
			score.SubVec(b, &score)
			meat.SymRankOne(meat, 1, &score)
		})
	}
	n := float64(len(windows))
	variance := sandwich(&inverse, meat).At(1, 1) * n / (n - m)
	return Estimate{theta.AtVec(1) / far, math.Sqrt(variance) / far}
}
