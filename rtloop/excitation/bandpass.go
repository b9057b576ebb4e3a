package excitation

import (
	"math"
	"math/cmplx"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// bandOrder is the order n of the band-pass; the filter has 2n poles. It is
// even, so that no pole is real.
const bandOrder = 8

// bandpass is a digital Butterworth band-pass of order n = 8 between the
// frequencies f1 and f2: with Ω = tan(π·f/r), r the sampling rate,
//
//	|H(f)|² ∝ 1/(1 + ((Ω² − Ω1·Ω2)/(Ω·(Ω2 − Ω1)))²ⁿ),
//
// maximally flat between f1 and f2, half the power at either, and 48 dB an
// octave beyond. The n pairs of poles are split into the slower half, taken
// as high-pass sections, and the faster half, taken as low-pass sections:
// every section then passes the band with a gain near one, whatever its width.
type bandpass struct {
	high, low [bandOrder / 2]section
}

// newBandpass solves for the sections, low and high in Hz, low < high < rate/2.
func newBandpass(low, high, rate float64) bandpass {
	o1, o2 := warped(low, rate), warped(high, rate)
	poles := make([]complex128, 0, bandOrder)
	for i := range bandOrder / 2 {
		// A low-pass pole p gives s² − p·(Ω2−Ω1)·s + Ω1·Ω2 = 0. The larger root
		// is free of cancellation; the smaller follows from the product.
		b := cmplx.Rect(o2-o1, math.Pi/2+math.Pi*(float64(2*i+1))/(2*bandOrder))
		root := cmplx.Sqrt(b*b - complex(4*o1*o2, 0))
		q := (b + root) / 2
		if other := (b - root) / 2; cmplx.Abs(other) > cmplx.Abs(q) {
			q = other
		}
		poles = append(poles, q, complex(o1*o2, 0)/q)
	}
	slices.SortFunc(poles, func(a, b complex128) int {
		switch d := cmplx.Abs(a) - cmplx.Abs(b); {
		case d < 0:
			return -1
		case d > 0:
			return 1
		}
		return 0
	})
	var f bandpass
	for i, p := range poles {
		g := cmplx.Abs(p)
		s := newSection(g, -real(p)/g)
		if i < bandOrder/2 {
			f.high[i] = s
		} else {
			f.low[i-bandOrder/2] = s
		}
	}
	return f
}

// step takes the next sample of the input and returns that of the output.
func (f *bandpass) step(x float64) float64 {
	for i := range f.high {
		x = f.high[i].highpass(x)
	}
	for i := range f.low {
		x = f.low[i].lowpass(x)
	}
	return x
}

const bandStates = 2 * bandOrder

func (f *bandpass) state() (s [bandStates]float64) {
	for i := range f.high {
		s[2*i], s[2*i+1] = f.high[i].s1, f.high[i].s2
		s[bandOrder+2*i], s[bandOrder+2*i+1] = f.low[i].s1, f.low[i].s2
	}
	return s
}

func (f *bandpass) setState(s *[bandStates]float64) {
	for i := range f.high {
		f.high[i].s1, f.high[i].s2 = s[2*i], s[2*i+1]
		f.low[i].s1, f.low[i].s2 = s[bandOrder+2*i], s[bandOrder+2*i+1]
	}
}

// stationarity is what white noise of variance one makes of a bandpass: with
// the filter written as s⁺ = Φ s + b w, y = c s + d w,
//
//	P = Φ P Φᵀ + b bᵀ,   r(0) = c P cᵀ + d²,   r(k) = c Φᵏ⁻¹ (Φ P cᵀ + b d).
type stationarity struct {
	p *mat.Dense // covariance of the states
	r []float64  // autocovariance of the output at lags 0, 1, 2, …
}

// stationarity solves these equations for the given number of lags. Φ, b, c
// and d are read off the filter itself, one state at a time.
func (f *bandpass) stationarity(lags int) stationarity {
	const n = bandStates
	probe := *f
	phi, c := mat.NewDense(n, n, nil), mat.NewVecDense(n, nil)
	for j := range n {
		var unit [n]float64
		unit[j] = 1
		probe.setState(&unit)
		c.SetVec(j, probe.step(0))
		after := probe.state()
		phi.SetCol(j, after[:])
	}
	probe.setState(new([n]float64))
	d := probe.step(1)
	after := probe.state()
	b := mat.NewVecDense(n, after[:])

	out := stationarity{p: powerSum(phi, b), r: make([]float64, lags)}
	var pc, cross mat.VecDense
	pc.MulVec(out.p, c)
	cross.MulVec(phi, &pc)
	cross.AddScaledVec(&cross, d, b)
	out.r[0] = mat.Dot(c, &pc) + d*d
	for k := 1; k < lags; k++ {
		out.r[k] = mat.Dot(c, &cross)
		var next mat.VecDense
		next.MulVec(phi, &cross)
		cross.CopyVec(&next)
	}
	return out
}

// powerSum returns P = Σ Φᵏ b bᵀ Φᵀᵏ, k from 0 on, the solution of
// P = Φ P Φᵀ + b bᵀ, by doubling (Smith 1968): each pass adds as many terms as
// were there before, so a filter that remembers 2ᵐ samples takes m passes.
func powerSum(phi *mat.Dense, b *mat.VecDense) *mat.Dense {
	const passes = 60 // 2⁶⁰ samples: beyond the memory of any filter here
	n := b.Len()
	p := mat.NewDense(n, n, nil)
	p.Outer(1, b, b)
	a := mat.DenseCopyOf(phi)
	for range passes {
		var ap, apa, square mat.Dense
		ap.Mul(a, p)
		apa.Mul(&ap, a.T())
		p.Add(p, &apa)
		square.Mul(a, a)
		a.Copy(&square)
		if mat.Norm(a, 1) < 1e-10 {
			break
		}
	}
	return p
}
