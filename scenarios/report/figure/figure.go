// Package figure draws every picture of the program in one style: time
// histories, loops, frequency responses, maps. It is made for print: white
// paper, thin lines, every label with its unit, lines told apart by dash and
// marker so that a grey copy reads as well as a coloured one. The same figure
// always comes to the same bytes.
//
// It knows nothing of tests or units: numbers are drawn as they are given, in
// the unit that the axis names.
package figure

import (
	"bytes"
	"fmt"
	"io"
	"path/filepath"
	"strings"

	"antelag/scenarios/outfile"
)

// Figure is one picture of one or more panels, one below the other, their
// vertical axes aligned.
type Figure struct {
	Title         string
	Panels        []Panel
	Width, Height float64 // mm; 0 takes 170 mm and what the panels need
}

// Panel is one diagram.
type Panel struct {
	Title  string
	X, Y   Axis
	Lines  []Line
	Marks  []Mark
	Levels []Level
	Map    *Map
	Equal  bool    // a length along X means as much as along Y
	Share  float64 // height beside the other panels; 0 counts as 1
}

// Axis is what one direction means. Values are in Unit.
type Axis struct {
	Label string // "time"
	Unit  string // "s"; empty for none
	Log   bool   // values of 0 and below are gaps
	// Low and High fix the ends; both 0 takes them from the data, NaN takes
	// that one from the data.
	Low, High float64
}

// Line is a curve, or a set of points. A value that is NaN or infinite is a gap.
type Line struct {
	Name string // empty: not in the legend
	X, Y []float64
	// Low and High, if given, are a band around the line, filled.
	Low, High []float64
	Points    bool // a marker at every point instead of a line
	Joined    bool // with Points: the line too
}

// Mark is a point that matters, such as the working point on a map.
type Mark struct {
	Name string
	X, Y float64
}

// Level is a limit: a straight line across the panel at a value of Y, or of X
// if Vertical. One that lies so far from the data that it would flatten them is
// written at the edge instead.
type Level struct {
	Name      string
	Value     float64
	Vertical  bool
	Reference bool // no limit but something to compare with: drawn in grey
}

// Map is a quantity over the plane, drawn in cells around its points. Contours
// are drawn as labelled lines. Z is [iy][ix]; NaN is left blank; an infinite
// value is beyond the last band.
type Map struct {
	X, Y        []float64 // strictly increasing, at least two each
	Z           [][]float64
	Label, Unit string
	Contours    []float64
	// Below, if it is not empty, is what to call the part of the map where Z is
	// below Edge: it is hatched, and the line of Edge, one of Contours or not, is
	// drawn bold.
	Below string
	Edge  float64
}

// Write draws the figure as "png" or "svg".
func (f Figure) Write(w io.Writer, format string) error {
	var picture []byte
	var err error
	switch format {
	case "svg":
		picture, err = f.SVG()
	case "png":
		picture, err = f.PNG()
	default:
		return fmt.Errorf("picture format %q is not known; allowed are png and svg", format)
	}
	if err != nil {
		return err
	}
	_, err = w.Write(picture)
	return err
}

// Format gives the picture format that a file's ending asks for.
func Format(path string) (string, error) {
	switch format := strings.TrimPrefix(strings.ToLower(filepath.Ext(path)), "."); format {
	case "png", "svg":
		return format, nil
	}
	return "", fmt.Errorf("%s: a picture ends in .png or .svg", path)
}

// Save draws the figure into a file, as PNG or SVG by its ending. The file must
// not exist unless force is set; the error is then fs.ErrExist.
func Save(path string, f Figure, force bool) error {
	format, err := Format(path)
	if err != nil {
		return err
	}
	var picture bytes.Buffer
	if err := f.Write(&picture, format); err != nil {
		return err
	}
	return outfile.Write(path, picture.Bytes(), force)
}
