package plant

import (
	"fmt"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var bilinearKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "bilinear",
		Doc:      "elastoplastic spring with kinematic hardening: yielding steel with a sharp knee",
		Equation: "f = k·(h·y + (1−h)·e), e = y − x, |e| ≤ y_d, the plastic part x moves only while e is at its bound",
		Source:   "kinematic hardening after Prager 1956; return mapping after Simo & Hughes 1998",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "initial stiffness k").Range(0, 1e12),
			kind.Number("yield_displacement", quantity.Length, "yield displacement y_d").Range(1e-9, 10),
			kind.Number("hardening", quantity.None, "post-yield over initial stiffness h").Default(0).Range(0, 1),
		},
	},
	New: newBilinear,
}

// bilinear is an elastic spring beside an elastoplastic one,
//
//	f = k·(h·y + (1−h)·e),   e = y − x,   |e| ≤ y_d,
//
// f the force, N; y the displacement, m; k the initial stiffness, N/m; h the
// ratio of post-yield to initial stiffness; y_d the yield displacement, m; x
// the plastic displacement, m, which moves only while e is at its bound, and
// only as far as the bound asks. The yield force is k·y_d, and the elastic
// range stays 2·k·y_d wide while hardening moves it (kinematic hardening).
//
// The force depends on the path alone, not on time. Along a straight path e
// follows y and stops at its bound, so that each Advance is exact, however
// long. Elastic motion leaves no trace in x and thus does not drift.
//
// Stored is ½k·h·y² + ½(1−h)·k·e², the energy that elastic unloading would
// return. Dissipated is the work by the trapezoid rule on ticks less what is
// stored; a full cycle between ±y_m dissipates 4(1−h)·k·y_d·(y_m − y_d).
type bilinear struct {
	k, yield float64
	kinetic  float64 // k·h, N/m
	plastic  float64 // k·(1−h), N/m

	x, e, y float64
	atStart float64 // stored by Start, J
	work    work
}

var _ Element = (*bilinear)(nil)
var _ Previewer = (*bilinear)(nil)

func newBilinear(v kind.Values) (Element, error) {
	k, h := v.Num("stiffness"), v.Num("hardening")
	yield := v.Num("yield_displacement")
	if !(yield > 0) {
		return nil, fmt.Errorf("yield_displacement: %v m is not above 0", yield)
	}
	return &bilinear{k: k, yield: yield, kinetic: k * h, plastic: k * (1 - h)}, nil
}

// Start puts the element at displacement y, m, along the loading path from
// zero. What that dissipated does not count.
func (b *bilinear) Start(y float64) {
	b.x, b.e, b.y = 0, 0, 0
	b.follow(y)
	b.work.start(b.force(), y)
	b.atStart = b.stored()
}

func (b *bilinear) Advance(y, _, _ float64) float64 {
	b.follow(y)
	f := b.force()
	b.work.move(f, y)
	return f
}

// Preview returns the force that Advance would return, N, and changes nothing.
func (b *bilinear) Preview(y, _, _ float64) float64 {
	next := *b
	next.follow(y)
	return next.force()
}

// Energy returns what is stored now and what was dissipated since Start, J.
func (b *bilinear) Energy() (stored, dissipated float64) {
	stored = b.stored()
	return stored, b.work.total() - (stored - b.atStart)
}

// Stiffness returns the initial stiffness, N/m.
func (b *bilinear) Stiffness() float64 { return b.k }

func (b *bilinear) follow(y float64) {
	if y == b.y {
		return // else rounding could move a force at its bound
	}
	b.y, b.e = y, y-b.x
	if b.e > b.yield {
		b.x, b.e = y-b.yield, b.yield
	} else if b.e < -b.yield {
		b.x, b.e = y+b.yield, -b.yield
	}
}

func (b *bilinear) force() float64 { return b.kinetic*b.y + b.plastic*b.e }

func (b *bilinear) stored() float64 {
	return 0.5*b.kinetic*b.y*b.y + 0.5*b.plastic*b.e*b.e
}
