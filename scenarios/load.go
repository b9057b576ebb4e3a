package scenarios

import (
	"embed"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"antelag/scenarios/kind"
)

//go:embed *.toml *.txt
var shipped embed.FS

// Default is the embedded scenario that runs when none is named.
const Default = "archive"

// embedded marks the name of a data file that ships with the program.
const embedded = "embedded:"

// path returns where a data file that the scenario names lies.
func (s *Scenario) path(name string) string {
	if filepath.IsAbs(name) || strings.HasPrefix(name, embedded) {
		return name
	}
	return filepath.Join(s.dir, name)
}

func (s *Scenario) open(name string) (io.ReadCloser, error) {
	if inside, ok := strings.CutPrefix(name, embedded); ok {
		f, err := shipped.Open(inside)
		if err != nil {
			known, _ := fs.Glob(shipped, "*.txt") //nolint:errcheck // the pattern is a constant
			return nil, &kind.UnknownError{What: "embedded data file", Got: inside, Known: known}
		}
		return f, nil
	}
	return os.Open(s.path(name))
}

// Names lists the embedded scenarios.
func Names() []string {
	files, err := fs.Glob(shipped, "*.toml")
	if err != nil {
		panic(err) // the pattern is a constant
	}
	files = slices.DeleteFunc(files, func(name string) bool { return strings.HasSuffix(name, ".baseline.toml") })
	for i := range files {
		files[i] = strings.TrimSuffix(files[i], ".toml")
	}
	slices.Sort(files)
	return files
}

// Text returns the text of an embedded scenario.
func Text(name string) ([]byte, error) {
	text, err := shipped.ReadFile(strings.TrimSuffix(name, ".toml") + ".toml")
	if err != nil {
		return nil, &kind.UnknownError{What: "embedded scenario", Got: name, Known: Names()}
	}
	return text, nil
}

// Load reads a scenario: a file, or, where no such file exists, the embedded
// scenario of that name, with the changes applied. Errors are *Error where
// they concern the text.
func Load(name string, changes ...Change) (*Scenario, error) {
	text, err := readFile(name)
	switch {
	case err == nil:
		return Parse(name, text, filepath.Dir(name), changes...)
	case !errors.Is(err, fs.ErrNotExist):
		return nil, err
	}
	text, unknown := Text(name)
	if unknown != nil {
		return nil, fmt.Errorf("%s: there is no such file, nor an embedded scenario of that name (embedded: %s)",
			name, strings.Join(Names(), ", "))
	}
	return Parse(name, text, ".", changes...)
}

// readFile reads a scenario file, but no more of it than shows that it is none.
func readFile(name string) ([]byte, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return io.ReadAll(io.LimitReader(f, maxFile+1))
}

// Parse reads a scenario from text. file names it in errors; files that it
// names are looked for in dir.
func Parse(file string, text []byte, dir string, changes ...Change) (*Scenario, error) {
	doc, err := parse(file, text)
	if err != nil {
		return nil, err
	}
	return resolve(doc, dir, changes)
}

// With returns the scenario with some settings changed, checked again as a
// whole. The receiver stays as it is.
func (s *Scenario) With(changes ...Change) (*Scenario, error) {
	return resolve(s.doc.clone(), s.dir, changes)
}

func resolve(doc *document, dir string, changes []Change) (*Scenario, error) {
	// What chooses a kind comes first: it drops the settings of the old one.
	for _, choosing := range []bool{true, false} {
		for _, c := range changes {
			if c.chooses() != choosing {
				continue
			}
			if err := doc.apply(c); err != nil {
				return nil, err
			}
		}
	}
	return read(doc, dir)
}

// clone copies a document, so that changes to one do not show in the other.
func (d *document) clone() *document {
	c := &document{file: d.file, tree: cloneTree(d.tree).(map[string]any), where: make(map[string]string, len(d.where))}
	for k, v := range d.where {
		c.where[k] = v
	}
	return c
}

func cloneTree(v any) any {
	switch x := v.(type) {
	case map[string]any:
		m := make(map[string]any, len(x))
		for k, inner := range x {
			m[k] = cloneTree(inner)
		}
		return m
	case []any:
		l := make([]any, len(x))
		for i, inner := range x {
			l[i] = cloneTree(inner)
		}
		return l
	}
	return v
}
