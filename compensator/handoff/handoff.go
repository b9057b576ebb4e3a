// Package handoff writes tuned compensators as C99 for a laboratory's
// controller: for every channel a header and a source, together a file of test
// vectors made by the Go code, a self-test that runs them, and a Makefile.
//
// The C allocates nothing, has no variables but the caller's struct, and does
// the arithmetic of the Go code in its order. In front of it stands a guard,
// which holds the last good command when what comes in, or goes out, is none
// that the channel's limits allow.
//
// The package knows compensators; it knows neither scenarios nor the loop.
package handoff

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

// Channel is one compensator to be handed over.
type Channel struct {
	Name   string
	Kind   string
	Values kind.Values // resolved settings
	Limits Limits
}

// Test is what is handed over: the channels of one lane, and where they come
// from.
type Test struct {
	Title    string
	Scenario string // its name, for people
	Text     []byte // the resolved scenario; its digest goes into every file
	Lane     string
	Version  string // of this program
	Rate     float64
	Slowdown float64
	Hold     string // how the commands go out, "ramp" or "step"
	Seed     uint64 // of the input of the test vectors
	Channels []Channel
}

// File is one file of the handoff.
type File struct {
	Name string
	Data []byte
}

// Report says what was made, in the form of --json.
type Report struct {
	Scenario string          `json:"scenario"`
	Lane     string          `json:"lane"`
	Digest   string          `json:"scenario_sha256"`
	Rate     float64         `json:"rate_hz"`
	Channels []ChannelReport `json:"channels"`
	Files    []string        `json:"files"`
}

// ChannelReport says what was made of one channel.
type ChannelReport struct {
	Name        string   `json:"name"`
	Compensator string   `json:"compensator"`
	Identifier  string   `json:"identifier"`
	StateBytes  int      `json:"state_bytes"` // of the double build
	Steps       int      `json:"steps"`       // in the vectors
	Peak        float64  `json:"peak_command_m"`
	DoubleBound float64  `json:"double_bound_m"`
	FloatBound  float64  `json:"float_bound_m"`
	Unguarded   []string `json:"unguarded"` // limits that the channel does not have
}

// doublePart is the part of the peak command by which the double build may
// differ from the Go code. Both do the same operations in the same order, so
// that a compiler that keeps to the standard leaves no difference at all; where
// products are fused into sums, a rounding of 1e-16 of the peak is drawn out by
// the least-squares fit, whose pivots may be 1e-3, to some 1e-13.
const doublePart = 1e-12

// unit is one channel on its way into C.
type unit struct {
	Channel
	test   *Test
	ident  string
	digest string
	tick   float64
	entry  *kind.Kind
	code   code
	rows   []row
	report ChannelReport
}

// Make writes the handoff of a test. The same test comes to the same bytes. An
// error names the channel and the setting.
func Make(t *Test) ([]File, *Report, error) {
	sum := sha256.Sum256(t.Text)
	r := &Report{Scenario: t.Scenario, Lane: t.Lane, Digest: hex.EncodeToString(sum[:]), Rate: t.Rate}
	var files []File
	var units []*unit
	names := identifiers(t.Channels)
	for i := range t.Channels {
		u := &unit{Channel: t.Channels[i], test: t, ident: names[i], digest: r.Digest, tick: 1 / t.Rate}
		if err := u.make(i); err != nil {
			return nil, nil, fmt.Errorf("%s: %w", u.Name, err)
		}
		units = append(units, u)
		r.Channels = append(r.Channels, u.report)
		files = append(files, File{u.ident + ".h", u.header()}, File{u.ident + ".c", u.source()})
	}
	files = append(files,
		File{"vectors.csv", vectorsCSV(units)},
		File{"selftest.c", selfTest(t, r.Digest, units)},
		File{"Makefile", makefile(t, r.Digest, units)},
		File{"scenario.toml", t.Text})
	for _, f := range files {
		r.Files = append(r.Files, f.Name)
	}
	return files, r, nil
}

// make builds the compensator, its C, and its vectors.
func (u *unit) make(index int) error {
	m, err := find(u.Kind)
	if err != nil {
		return err
	}
	comp, err := u.build()
	if err != nil {
		return err
	}
	u.code = m.write(tuned{u.tick, u.Values, comp})
	if u.rows, err = u.vectors(u.test.Seed + uint64(index)<<32); err != nil {
		return err
	}
	p := peaksOf(u.rows)
	u.report = ChannelReport{
		Name: u.Name, Compensator: u.Kind, Identifier: u.ident,
		StateBytes: u.code.bytes() + guardBytes, Steps: steps(u.rows), Peak: p.u,
		DoubleBound: doublePart * p.u, FloatBound: u.code.floatBound(p) + doublePart*p.u,
		Unguarded: u.Limits.missing(),
	}
	return nil
}

// build makes the compensator of the channel.
func (u *unit) build() (compensator.Compensator, error) {
	e, err := compensator.Kinds.Find(u.Kind)
	if err != nil {
		return nil, err
	}
	u.entry = &e.Kind
	return e.New(u.tick, u.Values)
}

// unitRoundoff is the largest relative error of rounding to float, 24 bits.
var unitRoundoff = math.Ldexp(1, -24)
