package accept

import (
	"fmt"
	"io"
	"io/fs"
	"math"
	"strconv"
	"strings"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// value draws a setting; given is false where it is left out. Lists of one kind
// have one length, mostly.
func (d *drawn) value(s *kind.Setting, list int) (v kind.Value, given bool) {
	example, shown := s.ExampleValue()
	if !s.IsRequired() && d.chance(0.7) && (s.HasDefault() || s.Type == kind.TextType) || !shown && !d.chance(d.odd) {
		return v, false
	}
	switch s.Type {
	case kind.WordType:
		return kind.Text(pick(d, s.Words...)), true
	case kind.TextType:
		return kind.Text(d.word(s)), true
	case kind.MatrixType:
		return v, false
	}
	base := typicalOf(s)
	whole := false
	if v, err := s.Read(unquoted(example)); err == nil && s.Type != kind.ListType {
		base = v.Num
	} else if n, err := strconv.Atoi(example); err == nil {
		base, whole = float64(n), d.chance(0.9)
	}
	if s.Type != kind.ListType {
		return kind.Num(d.number(s, base)), true
	}
	v = d.list(s, pick(d, 1, list), base)
	for i := range v.List {
		if whole {
			v.List[i] = clip(s, math.Round(v.List[i]))
		}
	}
	return v, true
}

// word draws a text: files and units of the records, or what an example shows.
func (d *drawn) word(s *kind.Setting) string {
	switch s.Name {
	case "file":
		return pick(d, "acceleration.txt", "force.csv", "displacement.txt", "none.txt")
	case "unit":
		return pick(d, "g", "m/s^2", "kN", "mm", "m")
	}
	text, _ := s.ExampleValue()
	return strings.Trim(text, `"`)
}

// records are the files that drawn scenarios name: time, s, and a value.
var records = map[string]string{
	"acceleration.txt": record("%.3f %.6f\n", 0.3), "force.csv": record("%.3f,%.6f\n", 80), "displacement.txt": record("%.3f\t%.6f\n", 12),
}

func record(format string, amplitude float64) string {
	var text strings.Builder
	for i := range 200 {
		t := 0.01 * float64(i)
		fmt.Fprintf(&text, format, t, amplitude*math.Sin(2*math.Pi*1.7*t)*math.Exp(-t))
	}
	return text.String()
}

func openRecord(name string) (io.ReadCloser, error) {
	text, ok := records[name]
	if !ok {
		return nil, fs.ErrNotExist
	}
	return io.NopCloser(strings.NewReader(text)), nil
}

func (d *drawn) typical(k *kind.Kind, name string) string {
	s := setting(k, name)
	return written(s, kind.Num(d.number(s, typicalOf(s))))
}

// typicalOf is a typical value of the setting's dimension, inside its range.
func typicalOf(s *kind.Setting) float64 {
	plain := kind.Number(s.Name, s.Dim, s.Doc).Range(s.Min, s.Max)
	text, _ := plain.ExampleValue()
	v, err := plain.Read(unquoted(text))
	if err != nil {
		return clip(s, 1)
	}
	return v.Num
}

// unquoted is a TOML string or number as the reader hands it on.
func unquoted(text string) any {
	if plain, err := strconv.ParseFloat(text, 64); err == nil {
		return plain
	}
	return strings.Trim(text, `"`)
}

func (d *drawn) list(s *kind.Setting, n int, base float64) kind.Value {
	v := kind.Value{List: make([]float64, n)}
	for i := range v.List {
		v.List[i] = d.number(s, base)
	}
	return v
}

// number draws a number of the setting: mostly near base, or anywhere inside
// the range, evenly or by orders of magnitude, or at one of its ends.
func (d *drawn) number(s *kind.Setting, base float64) float64 {
	if !d.chance(d.wild) {
		return clip(s, base*math.Exp2(4*d.Float64()-2))
	}
	lo, hi := max(s.Min, -math.MaxFloat64), min(s.Max, math.MaxFloat64)
	switch d.IntN(6) {
	case 0:
		return lo
	case 1:
		return hi
	case 2, 3:
		return clip(s, uniform(d, lo, hi))
	}
	v := logUniform(d, max(lo, hi*1e-12, 1e-300), hi)
	if lo < 0 && d.chance(0.5) {
		v = -v
	}
	return clip(s, v)
}

// uniform draws between two finite numbers.
func uniform(d *drawn, lo, hi float64) float64 {
	u := d.Float64()
	return lo*(1-u) + hi*u
}

// logUniform draws by orders of magnitude; both ends are above 0.
func logUniform(d *drawn, lo, hi float64) float64 {
	return math.Exp(uniform(d, math.Log(lo), math.Log(hi)))
}

// clip keeps a number inside the range of the setting, and whole where it must be.
func clip(s *kind.Setting, v float64) float64 {
	if s.Type == kind.IntegerType {
		v = math.Round(v)
	}
	return min(max(v, s.Min, -math.MaxFloat64), s.Max, math.MaxFloat64)
}

// written is a value as TOML with its SI unit, in all its digits.
func written(s *kind.Setting, v kind.Value) string {
	switch s.Type {
	case kind.WordType, kind.TextType:
		return strconv.Quote(v.Text)
	case kind.ListType:
		return row(s, v.List)
	case kind.MatrixType:
		width, rows := len(v.List)/v.Rows, make([]string, v.Rows)
		for i := range rows {
			rows[i] = row(s, v.List[i*width:(i+1)*width])
		}
		return "[" + strings.Join(rows, ", ") + "]"
	case kind.IntegerType:
		return strconv.FormatFloat(v.Num, 'f', -1, 64)
	}
	return number(s, v.Num)
}

func row(s *kind.Setting, list []float64) string {
	items := make([]string, len(list))
	for i, v := range list {
		items[i] = number(s, v)
	}
	return "[" + strings.Join(items, ", ") + "]"
}

func number(s *kind.Setting, v float64) string {
	text := quantity.Exact(v, s.Dim)
	if s.Dim != quantity.None {
		return strconv.Quote(text)
	}
	return text
}
