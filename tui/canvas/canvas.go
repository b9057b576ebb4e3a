// Package canvas draws on character cells: text, frames, plots in braille
// dots, sparklines and bars, clipped to rectangles. What is drawn is plain data
// that can be read back as text, so a dashboard can be tested without a
// terminal.
//
// The package knows no terminal, no colour and nothing of what is plotted. A
// cell carries an Ink, the role of what stands there; the screen maps roles to
// styles. Everything must be legible without ink: lines differ in pattern, a
// selected frame in the weight of its rule.
package canvas

// Ink is the role of a cell, not its colour.
type Ink uint8

// The roles. The zero value is Plain.
const (
	Plain    Ink = iota // running text
	Dim                 // what may recede: units, tracks, zero lines
	Bold                // headings and the figures that count
	Target              // what the integrator wants
	Command             // what is sent to the actuator
	Measured            // what the sensors say
	Error               // the difference of target and measured
	Good                // within limits
	Bad                 // beyond limits
	Warn                // near limits, or to be noticed
	Accent              // keys, names, the reference
	Selected            // the entry under the cursor
	Frame               // rules and axes
	Limit               // lines that must not be crossed
	Cursor              // the place that is pointed at

	Inks // how many roles there are, for tables
)

var inkNames = [Inks]string{"plain", "dim", "bold", "target", "command", "measured",
	"error", "good", "bad", "warn", "accent", "selected", "frame", "limit", "cursor"}

// String is the name of the role.
func (i Ink) String() string {
	if i < Inks {
		return inkNames[i]
	}
	return "unknown"
}

// Cell is one character cell. The zero value is a blank.
type Cell struct {
	Rune rune // 0 is a blank, Tail the right half of a wide rune
	Ink  Ink
}

// Tail marks the right half of a rune that is two cells wide. A screen skips
// it: the rune in the cell to the left covers it.
const Tail rune = -1
