// Package check runs every scenario that it finds under some paths and holds
// each against its acceptance limits and its baseline.
package check

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/accept/baseline"
)

// Test is one scenario to be checked.
type Test struct {
	Name     string // as found: a path, or the name of an embedded scenario
	Scene    *scenarios.Scenario
	Path     string             // of the baseline
	Baseline *baseline.Baseline // nil where there is none
	// Err says why a scenario that was found in a directory cannot be checked:
	// it, or its baseline, does not read.
	Err error
}

// Found is what lies under the paths.
type Found struct {
	Tests   []*Test  // in the order of the paths, within a directory by name
	LeftOut []string // TOML files that are no scenarios, and logs' provenance
	Gone    []string // baselines whose scenario is not beside them
}

// Options say what to find and how.
type Options struct {
	Only    string             // a shell pattern or a part of the name; "" is all
	Changes []scenarios.Change // of every scenario
	Strict  bool               // the first file that does not read is an error
}

// Find gathers the scenarios under the paths: directories with all that is in
// them, but for hidden ones; files; names of embedded scenarios. What is named
// itself must read; of what lies in a directory the Test says if it does not.
func Find(paths []string, o Options) (*Found, error) {
	f := &finder{Options: o, seen: map[string]bool{}}
	if _, err := path.Match(o.Only, ""); err != nil {
		return nil, fmt.Errorf("--only: %q is no pattern: %w; * stands for any letters, ? for one, [ab] for a choice", o.Only, err)
	}
	for _, p := range paths {
		info, err := os.Stat(p)
		switch {
		case err == nil && info.IsDir():
			err = f.directory(p)
		case err == nil || errors.Is(err, fs.ErrNotExist):
			err = f.named(p)
		}
		if err != nil {
			return nil, err
		}
	}
	if len(f.Tests) == 0 {
		return nil, f.nothing(paths)
	}
	return &f.Found, nil
}

type finder struct {
	Options
	Found
	seen   map[string]bool
	passed []string // scenarios that Only left out
}

func (f *finder) nothing(paths []string) error {
	if len(f.passed) > 0 {
		return fmt.Errorf("--only %s: matches none of the %d scenarios: %s", f.Only, len(f.passed), strings.Join(f.passed, ", "))
	}
	return fmt.Errorf("%s: there are no scenarios; a scenario is a TOML file with [loop], [excitation] and [[channel]]", strings.Join(paths, ", "))
}

// named takes a file or an embedded scenario that somebody asked for.
func (f *finder) named(name string) error {
	if strings.HasSuffix(name, baseline.Ending) {
		return fmt.Errorf("%s: is a baseline; name the scenario that it is of, %s.toml", name, strings.TrimSuffix(name, baseline.Ending))
	}
	t := f.load(name)
	if t == nil {
		return nil
	}
	return t.Err
}

// directory takes every scenario in a directory and below.
func (f *finder) directory(dir string) error {
	root := dir
	if !strings.HasSuffix(root, string(filepath.Separator)) {
		root += string(filepath.Separator) // a link to a directory is walked too
	}
	var found []string
	err := filepath.WalkDir(root, func(p string, d fs.DirEntry, err error) error {
		switch {
		case err != nil:
			return err
		case p != root && strings.HasPrefix(d.Name(), "."):
			if d.IsDir() {
				return fs.SkipDir
			}
		case strings.HasSuffix(p, ".toml") && plain(p):
			found = append(found, filepath.Clean(p))
		}
		return nil
	})
	if err != nil {
		return err
	}
	for _, p := range found {
		if err := f.file(p, found); err != nil {
			return err
		}
	}
	return nil
}

// plain reports whether a path leads to a file.
func plain(p string) bool {
	info, err := os.Stat(p)
	return err != nil || info.Mode().IsRegular()
}

// file takes one TOML file of a directory.
func (f *finder) file(p string, beside []string) error {
	if scenario, ok := strings.CutSuffix(p, baseline.Ending); ok {
		if !slices.Contains(beside, scenario+".toml") && !slices.Contains(f.Gone, p) {
			if _, err := os.Stat(scenario); err != nil { // one without an ending of its own
				f.Gone = append(f.Gone, p)
			}
		}
		return nil
	}
	if tree, err := scenarios.ReadTree(p); err == nil && !looksLike(tree.Root()) {
		if !slices.Contains(f.LeftOut, p) {
			f.LeftOut = append(f.LeftOut, p)
		}
		return nil
	}
	if t := f.load(p); t != nil && t.Err != nil && f.Strict {
		return t.Err
	}
	return nil
}

// looksLike tells a scenario, with whatever mistakes in it, from other TOML
// files and from the provenance of a log.
func looksLike(root map[string]any) bool {
	if _, ok := root["provenance"]; ok {
		return false
	}
	_, loop := root["loop"]
	_, channel := root["channel"]
	_, excitation := root["excitation"]
	return loop && (channel || excitation) || channel && excitation
}

// load reads and builds a scenario and reads its baseline; nil where the
// scenario is not asked for or there already.
func (f *finder) load(name string) *Test {
	if !f.wanted(name) {
		f.passed = append(f.passed, name)
		return nil
	}
	if full, err := filepath.Abs(name); err == nil {
		if f.seen[full] {
			return nil
		}
		f.seen[full] = true
	}
	t := &Test{Name: name, Path: baseline.Path(name)}
	f.Tests = append(f.Tests, t)
	if t.Scene, t.Err = scenarios.Load(name, f.Changes...); t.Err == nil {
		_, t.Err = t.Scene.Build()
	}
	if t.Err != nil {
		return t
	}
	switch b, err := baseline.Read(t.Path); {
	case err == nil:
		t.Baseline = b
	case !errors.Is(err, fs.ErrNotExist):
		t.Err = err
	}
	return t
}

// wanted reports whether Only names a scenario: as a pattern of its path, of
// its file's name with or without ending, or as a part of its path.
func (f *finder) wanted(name string) bool {
	if f.Only == "" || !strings.ContainsAny(f.Only, "*?[") && strings.Contains(name, f.Only) {
		return true
	}
	base := filepath.Base(name)
	for _, n := range []string{name, base, strings.TrimSuffix(base, ".toml")} {
		if ok, err := filepath.Match(f.Only, n); err == nil && ok {
			return true
		}
	}
	return false
}
