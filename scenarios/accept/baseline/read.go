package baseline

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"antelag/scenarios"
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// Read reads a baseline file. Errors name file, line and key. That there is no
// such file is fs.ErrNotExist.
func Read(path string) (*Baseline, error) {
	tree, err := scenarios.ReadTree(path)
	if err != nil {
		return nil, err
	}
	return read(tree)
}

// Parse reads the text of a baseline; file names it in errors.
func Parse(file string, text []byte) (*Baseline, error) {
	tree, err := scenarios.ParseTree(file, text)
	if err != nil {
		return nil, err
	}
	return read(tree)
}

// reader keeps the first error and does nothing after it.
type reader struct {
	tree *scenarios.Tree
	err  error
}

func (r *reader) fail(path string, err error) {
	if r.err == nil {
		r.err = r.tree.ErrorAt(path, err)
	}
}

func (r *reader) failf(path, format string, args ...any) { r.fail(path, fmt.Errorf(format, args...)) }

func read(tree *scenarios.Tree) (*Baseline, error) {
	r := &reader{tree: tree}
	root, b := tree.Root(), &Baseline{}
	r.known(root, "", "format", "version", "lane", "settings")
	r.format(root)
	b.Version = r.text(root, "version", "version")
	lanes := r.table(root, "lane", "lane")
	if len(lanes) == 0 {
		r.failf("lane", "has no lanes")
	}
	for _, name := range sorted(lanes) {
		r.lane(b, name, r.table(lanes, name, join("lane", name)))
	}
	settings := r.table(root, "settings", "settings")
	for _, path := range sorted(settings) {
		b.Settings = append(b.Settings, scenarios.Resolved{Path: path, Text: r.text(settings, path, join("settings", path))})
	}
	if r.err != nil {
		return nil, r.err
	}
	return b, nil
}

// format refuses what a later program wrote in a form that this one does not
// know, before it complains of anything else.
func (r *reader) format(root map[string]any) {
	switch v, ok := root["format"]; {
	case !ok:
		r.failf("format", "is missing; a baseline says format = %d; antelag check --record writes one", format)
	case v != int64(format):
		r.err = nil
		r.failf("format", "%v is not %d, the form of baselines that this version reads; use the version that wrote it, or record anew", v, format)
	}
}

func (r *reader) lane(b *Baseline, lane string, t map[string]any) {
	path := join("lane", lane)
	names := []string{"channel", "outcome", "trip", "trip_time"}
	for i := range laneFigures {
		names = append(names, laneFigures[i].name)
	}
	r.entries(b, Entry{Lane: lane}, path, t, names)
	if t["outcome"] == nil {
		r.failf(path, "has no outcome")
	}
	if _, ok := t["channel"]; !ok {
		return
	}
	channels := r.table(t, "channel", path+".channel")
	names = names[:0]
	for i := range channelFigures {
		names = append(names, channelFigures[i].name)
	}
	for _, name := range sorted(channels) {
		inner := join(path+".channel", name)
		if name == "" {
			r.failf(inner, "a channel has a name")
		}
		r.entries(b, Entry{Lane: lane, Channel: name}, inner, r.table(channels, name, inner), names)
	}
}

// entries reads the figures of a lane or channel.
func (r *reader) entries(b *Baseline, of Entry, path string, t map[string]any, names []string) {
	for _, name := range sorted(t) {
		e, at := of, join(path, name)
		e.Figure = name
		switch {
		case !slices.Contains(names, name):
			r.fail(at, &kind.UnknownError{What: "figure", Got: name, Known: names})
			return
		case name == "channel":
			continue
		case e.word():
			e.Word = r.text(t, name, at)
		default:
			figure := r.table(t, name, at)
			r.known(figure, at, "was", "within")
			dim, _, _ := described(name)
			e.Was, e.Within = r.number(figure, "was", at, dim), r.number(figure, "within", at, dim)
			if !(e.Within >= 0) {
				r.failf(at+".within", "%s is no tolerance; it must be 0 or more", value(e.Within, dim, 4))
			}
		}
		b.Entries = append(b.Entries, e)
	}
}

// number reads a figure: text with its unit, or "undefined".
func (r *reader) number(t map[string]any, key, path string, dim quantity.Dim) float64 {
	text := r.text(t, key, join(path, key))
	if r.err != nil {
		return 0
	}
	v, err := parse(text, dim)
	if err == nil && math.IsInf(v, 0) {
		err = errors.New("is not finite")
	}
	if err != nil {
		r.fail(join(path, key), err)
	}
	return v
}

func (r *reader) text(t map[string]any, key, path string) string {
	raw, ok := t[key]
	text, isText := raw.(string)
	switch {
	case r.err != nil:
	case !ok:
		r.failf(path, "is missing")
	case !isText:
		r.failf(path, "%v is not a text in quotes", raw)
	}
	return text
}

func (r *reader) table(t map[string]any, key, path string) map[string]any {
	if r.err != nil {
		return nil
	}
	inner, ok := t[key].(map[string]any)
	if !ok {
		r.failf(path, "is missing, or not a table")
	}
	return inner
}

func (r *reader) known(t map[string]any, path string, names ...string) {
	for _, name := range sorted(t) {
		if !slices.Contains(names, name) {
			r.fail(join(path, name), &kind.UnknownError{What: "key of a baseline", Got: name, Known: names})
			return
		}
	}
}

func sorted(t map[string]any) []string { return slices.Sorted(maps.Keys(t)) }

func join(path, key string) string { return strings.TrimPrefix(path+"."+key, ".") }
