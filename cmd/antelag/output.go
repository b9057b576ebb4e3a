package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"

	"golang.org/x/term"

	"antelag/scenarios/outfile"
	"antelag/scenarios/report/figure"
)

// writeJSON writes the one JSON object of a command.
func writeJSON(out io.Writer, v any) error {
	e := json.NewEncoder(out)
	e.SetIndent("", " ")
	return e.Encode(v)
}

// inColour reports whether stdout takes colours and nobody said no
// (https://no-color.org).
func inColour() bool {
	return term.IsTerminal(int(os.Stdout.Fd())) && os.Getenv("NO_COLOR") == "" && os.Getenv("TERM") != "dumb"
}

// columns is how wide the terminal is; 80 where there is none.
func columns() int {
	if wide, _, err := term.GetSize(int(os.Stdout.Fd())); err == nil {
		return wide
	}
	return 80
}

// output is a file that a flag asks for; without a path it was not asked for.
type output struct {
	flag, path string
	picture    bool // PNG or SVG by its ending
	goesOn     bool // it may be there: it is gone on with
}

// refuse looks at what is to be written before anything runs: a long run whose
// result cannot be kept is lost. Inputs are what must not be written over, and
// whose says of what they are.
func refuse(outputs []output, force bool, whose string, inputs ...string) error {
	seen := map[string]string{}
	for _, o := range outputs {
		if o.path == "" {
			continue
		}
		if err := o.refuse(force, whose, inputs); err != nil {
			return fmt.Errorf("%s: %w", o.flag, err)
		}
		path := filepath.Clean(o.path)
		if other, ok := seen[path]; ok {
			return fmt.Errorf("%s and %s name the same file, %s", other, o.flag, o.path)
		}
		seen[path] = o.flag
	}
	return nil
}

func (o output) refuse(force bool, whose string, inputs []string) error {
	if o.picture {
		if _, err := figure.Format(o.path); err != nil {
			return err
		}
	}
	for _, input := range inputs {
		if sameFile(o.path, input) {
			return fmt.Errorf("%s %s; choose another name", o.path, whose)
		}
	}
	return free(o.path, force || o.goesOn)
}

// What outputs must not be: words for refuse.
const (
	theScenario = "is the scenario itself"
	ofTheLog    = "belongs to the log itself"
)

func sameFile(a, b string) bool {
	x, err := os.Stat(a)
	if err != nil {
		return false
	}
	y, err := os.Stat(b)
	return err == nil && os.SameFile(x, y)
}

// free reports what stands in the way of writing a file. What is there already is
// for the user to put right; that there is no place for it is a failure.
func free(path string, force bool) error {
	if dir, err := os.Stat(filepath.Dir(path)); err != nil || !dir.IsDir() {
		return &failure{fmt.Errorf("%s: there is no directory %s", path, filepath.Dir(path))}
	}
	info, err := os.Lstat(path)
	if err == nil && info.Mode()&fs.ModeSymlink != 0 {
		if target, err := os.Stat(path); err == nil {
			info = target
		}
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		return &failure{err}
	case info.IsDir():
		return fmt.Errorf("%s: %w and is a directory; a file name is needed", path, fs.ErrExist)
	case !force:
		return fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
	}
	return nil
}

// saveFile writes what a flag asks for, if it does.
func saveFile(flag, path string, force bool, data func() []byte) error {
	if path == "" {
		return nil
	}
	if err := outfile.Write(path, data(), force); err != nil {
		return fmt.Errorf("%s: %w", flag, err)
	}
	return nil
}

// savePicture draws what a flag asks for, if it does.
func savePicture(flag, path string, force bool, draw func() figure.Figure) error {
	if path == "" {
		return nil
	}
	if err := figure.Save(path, draw(), force); err != nil {
		return fmt.Errorf("%s: %w", flag, err)
	}
	return nil
}

// checkWorkers reads a number of workers; 0 is what it is when nobody says.
func checkWorkers(workers int) error {
	if workers < 0 {
		return fmt.Errorf("--workers %d: allowed is a whole number from 1 on", workers)
	}
	return nil
}
