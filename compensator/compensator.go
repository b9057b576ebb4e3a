// Package compensator holds the delay compensators: each turns the target of
// a tick into the command that makes a late actuator arrive in time. There is
// one interface, one file per published method, and one table of kinds. The
// package knows nothing of plants, structures or the loop.
//
// Everything is SI and in physical time: with a slowed-down test the loop
// converts velocities and accelerations before they come here.
package compensator

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Input is all that a compensator may know in the tick from t_k to t_{k+1}.
type Input struct {
	X float64 // target displacement at t_{k+1}, m
	V float64 // target velocity at t_{k+1}, m/s
	A float64 // latest known target acceleration (at t_k), m/s²
	Y float64 // measured displacement at t_k, m
	R float64 // measured force at t_k, N
}

// Compensator turns targets into commands, one call a tick. A compensator
// holds its whole history and allocates nothing in Command.
type Compensator interface {
	// Start forgets the past and fills the history as if the target had been x
	// and the measured displacement y, m, for ever.
	Start(x, y float64)
	// Command returns the command u_k, m: the displacement to ask of the
	// actuator for t_{k+1}. Inputs must be finite; the loop sees to that.
	Command(in Input) float64
	// Prime takes in one past tick in which another method commanded u, m: the
	// history becomes what it would be, but nothing is learned from an error
	// that was another's. It follows Start and comes before Command.
	Prime(in Input, u float64)
	// Retune changes the settings between two ticks and keeps the history, so
	// that the command moves by no more than the change itself implies. On an
	// error nothing is changed.
	Retune(v kind.Values) error
	// Coefficients appends what the method works with now to dst: for fixed
	// methods what follows from the settings, for adaptive ones the adapted
	// values. Appending to a slice with room allocates nothing.
	Coefficients(dst []Coefficient) []Coefficient
	// Memory calls each for every past value that commands are made of with the
	// coefficients of now, always in the same order, pasts with the newest first.
	// each may read it or write it: to write what was read takes a run up again
	// to the last bit. What a method learns, and learns from, is no part of it;
	// see Adaptive.
	Memory(each func(*float64))
}

// Coefficient is one named figure of a compensator, SI.
type Coefficient struct {
	Name  string
	Value float64
	Dim   quantity.Dim
}

// New builds a compensator for a tick of so many physical seconds from
// resolved settings. An error names the setting that cannot work.
type New func(tick float64, v kind.Values) (Compensator, error)

// Kinds is the table of compensator kinds.
var Kinds = kind.Table[New]{What: "compensator", Entries: []kind.Entry[New]{
	noneKind, polynomialKind, linearAccelerationKind, taylorKind, modelInverseKind, inverseKind,
	leastSquaresPolynomialKind, delaySeekingKind, adaptiveInverseKind, adaptiveTimeSeriesKind,
}}
