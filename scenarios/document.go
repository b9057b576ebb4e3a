package scenarios

import (
	"errors"
	"fmt"
	"strconv"
	"strings"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"
)

// document is a scenario file as text understands it: the tree of values, and
// where each came from.
type document struct {
	file  string
	tree  map[string]any
	where map[string]string // path, as in "channel[0].actuator.delay", to "file:line"
}

// Error is what is wrong with a scenario: where it stands, which key, and
// what to do about it.
type Error struct {
	Where string // "file:line", or the flag that set the value
	Key   string
	Err   error
}

func (e *Error) Error() string {
	if e.Key == "" {
		return e.Where + ": " + e.Err.Error()
	}
	return e.Where + ": " + e.Key + ": " + e.Err.Error()
}

func (e *Error) Unwrap() error { return e.Err }

// maxFile bounds a scenario file, bytes; real ones are a few kilobytes.
const maxFile = 1 << 20

// parse reads TOML text. Syntax errors carry file and line.
func parse(file string, text []byte) (*document, error) {
	if len(text) > maxFile {
		return nil, &Error{Where: file, Err: fmt.Errorf("is longer than %d bytes, which is more than a scenario has", maxFile)}
	}
	d := &document{file: file, where: map[string]string{}}
	if err := toml.Unmarshal(text, &d.tree); err != nil {
		var bad *toml.DecodeError
		if errors.As(err, &bad) {
			row, _ := bad.Position()
			key := strings.Join(bad.Key(), ".")
			return nil, &Error{Where: at(file, row), Key: key, Err: errors.New(strings.TrimPrefix(bad.Error(), "toml: "))}
		}
		return nil, &Error{Where: file, Err: err}
	}
	if d.tree == nil {
		d.tree = map[string]any{}
	}
	d.locate(text)
	return d, nil
}

func at(file string, line int) string { return file + ":" + strconv.Itoa(line) }

// locate notes the line of every key and table.
func (d *document) locate(text []byte) {
	var p unstable.Parser
	p.Reset(text)
	line, counted := 1, 0
	lineOf := func(r unstable.Range) string {
		for ; counted < int(r.Offset); counted++ {
			if text[counted] == '\n' {
				line++
			}
		}
		return at(d.file, line)
	}
	arrays := map[string]int{} // how many tables an array of tables has so far
	table := ""
	for p.NextExpression() {
		e := p.Expression()
		if e.Kind == unstable.Comment {
			continue
		}
		path, where := "", ""
		if e.Kind == unstable.KeyValue {
			path = table
		}
		keys := e.Key()
		for keys.Next() {
			key := keys.Node()
			if where == "" {
				where = lineOf(key.Raw)
			}
			path = join(path, string(key.Data))
			last := keys.IsLast()
			if e.Kind == unstable.ArrayTable && last {
				arrays[path]++
			}
			if n := arrays[path]; n > 0 && (e.Kind != unstable.KeyValue) {
				path += "[" + strconv.Itoa(n-1) + "]"
			}
			if _, seen := d.where[path]; !seen {
				d.where[path] = where
			}
		}
		if e.Kind == unstable.KeyValue {
			d.locateValue(e.Value(), path, where)
		} else {
			table = path
		}
	}
}

// locateValue gives the parts of an inline value the line of its key.
func (d *document) locateValue(v *unstable.Node, path, where string) {
	switch v.Kind {
	case unstable.InlineTable:
		for it := v.Children(); it.Next(); {
			kv := it.Node()
			inner := path
			for keys := kv.Key(); keys.Next(); {
				inner = join(inner, string(keys.Node().Data))
			}
			d.where[inner] = where
			d.locateValue(kv.Value(), inner, where)
		}
	case unstable.Array:
		i := 0
		for it := v.Children(); it.Next(); {
			if it.Node().Kind == unstable.Comment {
				continue
			}
			inner := path + "[" + strconv.Itoa(i) + "]"
			d.where[inner] = where
			d.locateValue(it.Node(), inner, where)
			i++
		}
	}
}

func join(path, key string) string {
	if path == "" {
		return key
	}
	return path + "." + key
}

// parent cuts the last step off a path.
func parent(path string) string {
	if strings.HasSuffix(path, "]") {
		return path[:strings.LastIndexByte(path, '[')]
	}
	if i := strings.LastIndexByte(path, '.'); i >= 0 {
		return path[:i]
	}
	return ""
}

// ErrorAt makes an Error that says where in the scenario something does not do,
// like channel[0].specimen[1].
func (s *Scenario) ErrorAt(path string, err error) error { return s.doc.errorAt(path, err) }

// errorAt makes an Error for a path: at its line, or at that of the nearest
// table around it. Indexes are left out of the key: the line says which.
func (d *document) errorAt(path string, err error) error {
	where := d.file
	for p := path; p != ""; p = parent(p) {
		if w, ok := d.where[p]; ok {
			where = w
			break
		}
	}
	return &Error{Where: where, Key: plainPath(path), Err: err}
}
