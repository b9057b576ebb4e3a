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
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
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
	return WriteFile(path, picture.Bytes(), force)
}

// WriteFile writes a whole file at once. It must not exist unless force is set;
// the error is then fs.ErrExist. One that cannot be written to its end is not
// there afterwards, or still the one that was there before.
func WriteFile(path string, data []byte, force bool) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return writeNew(path, data)
	case err != nil:
		return err
	case info.IsDir():
		return fmt.Errorf("%s: %w and is a directory; a file name is needed", path, fs.ErrExist)
	case !force:
		return fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
	case !info.Mode().IsRegular(): // a device, a pipe: nothing in it to lose
		f, err := os.OpenFile(path, os.O_WRONLY, 0)
		if err != nil {
			return err
		}
		_, err = f.Write(data)
		return errors.Join(err, f.Close())
	}
	return replace(path, data, info.Mode().Perm())
}

func writeNew(path string, data []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	if err := fillFile(f, data); err != nil {
		os.Remove(path) //nolint:errcheck // there is an error to report already
		return err
	}
	return nil
}

// replace writes beside the old file and puts the new one in its place when it
// is whole.
func replace(path string, data []byte, mode fs.FileMode) error {
	path, err := filepath.EvalSymlinks(path)
	if err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return &fs.PathError{Op: "write", Path: path, Err: errors.Unwrap(err)}
	}
	err = fillFile(f, data)
	if err == nil {
		err = os.Chmod(f.Name(), mode)
	}
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name()) //nolint:errcheck // there is an error to report already
		return &fs.PathError{Op: "write", Path: path, Err: errors.Unwrap(err)}
	}
	return nil
}

// fillFile writes all data and closes the file.
func fillFile(f *os.File, data []byte) error {
	_, err := f.Write(data)
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}
