package plant

import (
	"fmt"
	"math"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var boucWenKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "bouc-wen",
		Doc:      "smooth hysteresis: yielding steel, rubber bearings, friction devices",
		Equation: "f = k·(h·y + (1−h)·y_d·z), y_d·dz/dy = 1 − |z|^n·(γ + β·sgn(ẏ·z)), γ = 1 − β",
		Source:   "Bouc 1967; Wen 1976",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "initial stiffness k").Range(0, 1e12),
			kind.Number("yield_displacement", quantity.Length, "yield displacement y_d").Range(1e-9, 10),
			kind.Number("hardening", quantity.None, "post-yield over initial stiffness h").Default(0).Range(0, 1),
			kind.Number("n", quantity.None, "sharpness n of the yield knee").Default(1).Range(1, 20),
			kind.Number("beta", quantity.None, "share β of hysteresis in the shape; γ = 1 − β").Default(0.5).Range(0.01, 1),
		},
	},
	New: func(v kind.Values) (Element, error) {
		yield := v.Num("yield_displacement")
		if !(yield > 0) {
			return nil, fmt.Errorf("yield_displacement: %v m is not above 0", yield)
		}
		if n := v.Num("n"); !(n >= 1) {
			return nil, fmt.Errorf("n: %v is below 1", n)
		}
		return NewBoucWen(v.Num("stiffness"), yield, v.Num("hardening"), v.Num("n"), v.Num("beta")), nil
	},
}

// BoucWen is a smooth hysteretic spring,
//
//	f = k·(h·y + (1−h)·y_d·z),
//	y_d·dz/dy = 1 − |z|^n·(γ + β·sgn(ẏ·z)),   γ = 1 − β,
//
// f the force, N; y the displacement, m; k the initial stiffness, N/m; h the
// ratio of post-yield to initial stiffness; y_d the yield displacement, m; z
// the hysteretic variable, −1 … 1; n the sharpness of the knee. With
// γ + β = 1 the yield force is k·y_d and |z| never passes 1. First loading with
// n = 1 is z = 1 − e^(−y/y_d); with β = ½ unloading is elastic. β above ½ makes
// the unloading branch stiffer than k, β below ½ softer; β = 0 would be elastic
// without hysteresis and is out of range.
//
// The force depends on the path alone, not on time. Each Advance is a straight
// path, along which z is followed by its closed form where n = 1 and by the
// classical fourth-order Runge–Kutta method in y otherwise, both split where z
// passes zero and the right-hand side has its kink. A path of zero length
// changes nothing.
//
// Stored is ½k·h·y² + ½(1−h)·k·y_d²·z², the energy that elastic unloading with
// stiffness k would return. Dissipated is the work by the trapezoid rule on
// ticks less what is stored. For β < ½ it shrinks a little on unloading, which
// is softer than k then (Erlicher & Point 2004); over a cycle it grows.
type BoucWen struct {
	k, h, yield float64
	perYield    float64 // 1/y_d, 1/m
	elastic     float64 // k·h, N/m
	hysteretic  float64 // (1−h)·k·y_d, N
	n           float64
	whole       int     // n if it is a whole number, else 0
	unload      float64 // γ − β, which stands before |z|^n while z runs to zero
	step        float64 // longest Runge–Kutta step, in yield displacements

	z       float64
	atStart float64 // stored by Start, J
	work    work
}

var _ Element = (*BoucWen)(nil)

// NewBoucWen makes an element of initial stiffness, N/m, yield displacement,
// m, above 0, hardening ratio 0 … 1, sharpness n, 1 … 20, and beta, 0.01 … 1,
// at rest at zero. It does not check them: settings are checked by their
// table.
func NewBoucWen(stiffness, yieldDisplacement, hardening, n, beta float64) *BoucWen {
	b := &BoucWen{
		k: stiffness, h: hardening, yield: yieldDisplacement,
		perYield:   1 / yieldDisplacement,
		elastic:    stiffness * hardening,
		hysteretic: (1 - hardening) * stiffness * yieldDisplacement,
		n:          n,
		unload:     1 - 2*beta,
		// The knee is 1/n wide, and the method wants several steps in it. The
		// error then stays below 1e-6 of the yield force, or 5e-6 for n
		// between 1 and 2, whose right-hand side is rough at zero.
		step: min(0.05, 0.25/n),
	}
	if n == math.Trunc(n) {
		b.whole = int(n)
	}
	return b
}

// Start puts the element at displacement y, m, along the loading path from
// zero. What that dissipated does not count.
func (b *BoucWen) Start(y float64) {
	b.z = 0
	b.work.start(0, 0)
	b.follow(y)
	b.work.start(b.force(y), y)
	b.atStart = b.stored()
}

// Advance follows the straight path to displacement y, m, and returns the
// force there, N. Velocity and time do not matter.
func (b *BoucWen) Advance(y, _, _ float64) float64 {
	b.follow(y)
	f := b.force(y)
	b.work.move(f, y)
	return f
}

// Preview returns the force that Advance would return, N, and changes nothing.
func (b *BoucWen) Preview(y, _, _ float64) float64 {
	next := *b
	next.follow(y)
	return next.force(y)
}

// Energy returns what is stored now and what was dissipated since Start, J.
func (b *BoucWen) Energy() (stored, dissipated float64) {
	stored = b.stored()
	return stored, b.work.total() - (stored - b.atStart)
}

// Stiffness returns the initial stiffness, N/m.
func (b *BoucWen) Stiffness() float64 { return b.k }

func (b *BoucWen) force(y float64) float64 { return b.elastic*y + b.hysteretic*b.z }

func (b *BoucWen) stored() float64 {
	y := b.work.y
	return 0.5*b.elastic*y*y + 0.5*b.hysteretic*b.yield*b.z*b.z
}

// follow carries z along the straight path from the last displacement to y.
// Seen along the path, with x = |Δy|/y_d its length and ζ = z·sgn Δy, the
// equation is the same in both directions:
//
//	dζ/dx = 1 − (γ−β)·|ζ|^n for ζ < 0,   dζ/dx = 1 − ζ^n for ζ ≥ 0.
func (b *BoucWen) follow(y float64) {
	x := (y - b.work.y) * b.perYield
	zeta := b.z
	if x < 0 {
		x, zeta = -x, -zeta
	}
	if b.n == 1 {
		zeta = b.exact(zeta, x)
	} else {
		zeta = b.rungeKutta(zeta, x)
	}
	if y < b.work.y {
		zeta = -zeta
	}
	b.z = zeta
}

// exact is the solution for n = 1. Towards zero, with a = γ − β,
// ζ = ζ₀ + (1 + aζ₀)·(e^(ax) − 1)/a, which gets there at
// x = −log(1 + aζ₀)/a; from there on the distance to 1 decays.
func (b *BoucWen) exact(zeta, x float64) float64 {
	if zeta < 0 {
		a := b.unload
		if a == 0 {
			if zeta+x <= 0 {
				return zeta + x
			}
			x += zeta
		} else {
			zero := -math.Log1p(a*zeta) / a
			if x <= zero {
				return min(0, zeta+(1+a*zeta)*math.Expm1(a*x)/a)
			}
			x -= zero
		}
		zeta = 0
	}
	return zeta + (1-zeta)*approach(x)
}

// approach is 1 − e^(−x), to full relative precision for x of any size. The
// moves of one tick are mostly small, where nine terms of the series, summed
// in pairs so that they overlap, are exact and faster than the library.
func approach(x float64) float64 {
	if !(x < 1.0/16) {
		return -math.Expm1(-x)
	}
	x2 := x * x
	x4 := x2 * x2
	low := (1 - x*(1.0/2)) + x2*(1.0/6-x*(1.0/24))
	high := (1.0/120 - x*(1.0/720)) + x2*(1.0/5040-x*(1.0/40320))
	return x * (low + x4*(high+x4*(1.0/362880)))
}

// farthest, in yield displacements, is a straight path after which z is ±1 to
// the last digit wherever it came from. No longer path is followed in steps,
// so that a loop that runs away does not hang the tick.
const farthest = 64

func (b *BoucWen) rungeKutta(zeta, x float64) float64 {
	x = min(x, farthest)
	for x > 0 {
		d := min(x, b.step)
		if zeta >= 0 {
			next := min(1, b.rk4(zeta, d, 1))
			if next == zeta {
				return zeta // as far as the digits go
			}
			zeta, x = next, x-d
			continue
		}
		next := b.rk4(zeta, d, b.unload)
		if next > 0 {
			next, d = 0, b.toZero(-zeta)
		}
		zeta, x = next, x-d
	}
	return zeta
}

// rk4 is one step of length d of dζ/dx = 1 − c·|ζ|^n.
func (b *BoucWen) rk4(zeta, d, c float64) float64 {
	k1 := 1 - c*b.pow(zeta)
	k2 := 1 - c*b.pow(zeta+0.5*d*k1)
	k3 := 1 - c*b.pow(zeta+0.5*d*k2)
	k4 := 1 - c*b.pow(zeta+d*k3)
	return zeta + d/6*(k1+2*(k2+k3)+k4)
}

// toZero is the path length from ζ = −s to zero,
// ∫₀ˢ dσ/(1 − aσ^n) = s·Σ (a·s^n)^j/(jn+1), a = γ − β. It is asked for less
// than one step ahead, where the series is short.
func (b *BoucWen) toZero(s float64) float64 {
	q := b.unload * b.pow(s)
	sum, term := 1.0, q
	for j := 1.0; math.Abs(term) > 1e-17 && j < 64; j++ {
		sum += term / (j*b.n + 1)
		term *= q
	}
	return s * sum
}

// pow is |ζ|^n.
func (b *BoucWen) pow(zeta float64) float64 {
	base := math.Abs(zeta)
	if b.whole == 0 {
		return math.Pow(base, b.n)
	}
	p := 1.0
	for m := b.whole; m > 0; m >>= 1 {
		if m&1 != 0 {
			p *= base
		}
		base *= base
	}
	return p
}
