// Package excitation makes what shakes the structure: recorded and generated
// ground motions, forces, and target histories for tracking tests. It knows
// nothing of the structure or the loop.
package excitation

import (
	"io"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Drives says what the excitation acts as.
type Drives int

const (
	Ground Drives = iota // ground acceleration, m/s²
	Force                // a force on one level, N
	Target               // the target displacement itself, m
)

// Words names the values of Drives, in their order, as scenarios write them.
var Words = []string{"ground", "force", "target"}

// Dim returns the dimension of a sample.
func (d Drives) Dim() quantity.Dim {
	return [...]quantity.Dim{quantity.Acceleration, quantity.Force, quantity.Length}[d]
}

// Context is what a source must know of the run it feeds.
type Context struct {
	Step     float64 // model seconds between samples, > 0
	Duration float64 // model seconds of the whole run, > 0
	Seed     uint64
	Drives   Drives
	// Open opens a data file named in the settings.
	Open func(name string) (io.ReadCloser, error)
}

// Source is a stream of samples, the first at t = 0 and then one a step. The
// motion depends on model time alone, never on the step: at another rate or
// slowdown the same motion is sampled elsewhere. Memory does not grow with
// the length of the run.
type Source interface {
	// Fill writes the next len(dst) samples, in the unit of Drives.Dim.
	Fill(dst []float64)
}

// Release is a Source that also sets the initial state.
type Release interface {
	Source
	// Initial returns the displacement, m, at which the given level (1 is the
	// lowest; 0 means the topmost) is held before t = 0.
	Initial() (displacement float64, level int)
}

// New builds a source from resolved settings. An error names the setting, or
// the file and line, that cannot work.
type New func(c Context, v kind.Values) (Source, error)

// Kinds is the table of excitation kinds.
var Kinds = kind.Table[New]{What: "excitation", Entries: []kind.Entry[New]{
	recordKind, filteredNoiseKind, bandNoiseKind, sineKind, sweepKind, pulseKind, cyclicKind, releaseKind,
}}
