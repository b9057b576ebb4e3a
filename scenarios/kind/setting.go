package kind

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"antelag/scenarios/quantity"
)

// Type is what sort of value a setting takes.
type Type int

const (
	NumberType  Type = iota // a physical value, or a plain number
	IntegerType             // a whole number
	WordType                // one of a few words
	TextType                // free text, such as a file name
	ListType                // several physical values
	MatrixType              // rows of physical values
)

// Value is the value of one setting: a number in SI, a text, or a list in SI.
type Value struct {
	Num  float64
	Text string
	List []float64
	Rows int // of a matrix, whose elements stand in List row by row
}

// Num is a Value that is a number, in SI.
func Num(v float64) Value { return Value{Num: v} }

// Text is a Value that is a text or a word.
func Text(s string) Value { return Value{Text: s} }

// List is a Value that is a list of numbers, in SI.
func List(v ...float64) Value { return Value{List: v} }

// Values holds the settings of one part by name, resolved: every setting of
// the kind is there, but for optional ones that were not given.
type Values map[string]Value

// Num returns a number. Asking for a setting that the kind's table does not
// promise is a mistake in the program, so it panics.
func (v Values) Num(name string) float64 { return v.must(name).Num }

// Int returns a whole number.
func (v Values) Int(name string) int { return int(v.must(name).Num) }

// Text returns a text or word.
func (v Values) Text(name string) string { return v.must(name).Text }

// List returns a list of numbers.
func (v Values) List(name string) []float64 { return v.must(name).List }

// Has reports whether an optional setting was given.
func (v Values) Has(name string) bool { _, ok := v[name]; return ok }

func (v Values) must(name string) Value {
	value, ok := v[name]
	if !ok {
		panic("kind: setting " + name + " is not in the table or was not resolved")
	}
	return value
}

type presence int

const (
	required presence = iota
	defaulted
	optional
)

// Setting describes one setting of a kind. Make one with Number, Integer,
// Word, Words, Numbers or Matrix, and refine it with the methods.
type Setting struct {
	Name     string
	Doc      string
	Type     Type
	Dim      quantity.Dim
	Driven   bool     // the dimension is that of what the excitation drives
	Fallback Value    // the default, where there is one
	Min, Max float64  // smallest and largest sensible value, SI, inclusive
	Words    []string // what a WordType may be
	presence presence
	sample   string
}

// Number describes a physical value of dimension dim (quantity.None: a plain
// number). Without Default or Optional it is required.
func Number(name string, dim quantity.Dim, doc string) Setting {
	return Setting{Name: name, Doc: doc, Dim: dim, Min: math.Inf(-1), Max: math.Inf(1)}
}

// Integer describes a whole number.
func Integer(name, doc string) Setting {
	s := Number(name, quantity.None, doc)
	s.Type = IntegerType
	return s
}

// Word describes a choice of words; the first is the default.
func Word(name, doc string, words ...string) Setting {
	return Setting{Name: name, Doc: doc, Type: WordType, Words: words, Fallback: Text(words[0]), presence: defaulted}
}

// FreeText describes a text such as a file name.
func FreeText(name, doc string) Setting { return Setting{Name: name, Doc: doc, Type: TextType} }

// Numbers describes a list of physical values of one dimension.
func Numbers(name string, dim quantity.Dim, doc string) Setting {
	s := Number(name, dim, doc)
	s.Type = ListType
	return s
}

// Matrix describes rows of physical values of one dimension.
func Matrix(name string, dim quantity.Dim, doc string) Setting {
	s := Number(name, dim, doc)
	s.Type = MatrixType
	return s
}

// Driven describes a physical value whose dimension is that of what the
// excitation drives: an acceleration, a force or a displacement.
func Driven(name, doc string) Setting {
	s := Number(name, quantity.None, doc)
	s.Driven = true
	return s
}

// Default gives the setting a default, in SI.
func (s Setting) Default(v float64) Setting {
	s.Fallback, s.presence = Num(v), defaulted
	return s
}

// DefaultText gives a text setting a default.
func (s Setting) DefaultText(text string) Setting {
	s.Fallback, s.presence = Text(text), defaulted
	return s
}

// Optional says that the setting may be left out and then has no value.
func (s Setting) Optional() Setting {
	s.presence = optional
	return s
}

// Range sets the smallest and the largest sensible value, SI, inclusive.
func (s Setting) Range(lo, hi float64) Setting {
	s.Min, s.Max = lo, hi
	return s
}

// HasDefault reports whether the setting has a default.
func (s *Setting) HasDefault() bool { return s.presence == defaulted }

// IsOptional reports whether the setting may have no value at all.
func (s *Setting) IsOptional() bool { return s.presence == optional }

// IsRequired reports whether the setting must be given.
func (s *Setting) IsRequired() bool { return s.presence == required }

// In returns the setting with the driven dimension filled in, and with it the
// ends of the range that the setting leaves open.
func (s Setting) In(driven quantity.Dim) Setting {
	if s.Driven {
		s.Dim, s.Driven = driven, false
		if largest, ok := largestDriven[driven]; ok {
			s.Min, s.Max = max(s.Min, -largest), min(s.Max, largest)
		}
	}
	return s
}

// largestDriven is what no excitation of a test can sensibly exceed: a ground
// acceleration of about 100 g, a force of 1 GN, a target of 10 m.
var largestDriven = map[quantity.Dim]float64{quantity.Acceleration: 1000, quantity.Force: 1e9, quantity.Length: 10}

func (s *Setting) missing(of string) error {
	return fmt.Errorf("is missing; %s needs it: %s, %s", of, s.Doc, s.Allowed())
}

// Missing is the error for a required setting that was not given.
func (s *Setting) Missing(of string) error { return s.missing(of) }

// Allowed says in words what the setting takes: "a time (s), 0 s to 500 ms".
func (s *Setting) Allowed() string {
	switch s.Type {
	case WordType:
		return "one of " + strings.Join(s.Words, ", ")
	case TextType:
		return "a text"
	}
	what := s.Dim.String()
	if s.Driven {
		what = "an amplitude of what is driven"
	}
	switch s.Type {
	case IntegerType:
		what = "a whole number"
	case ListType:
		what = "a list, each " + what
	case MatrixType:
		what = "rows of values, each " + what
	}
	if r := s.RangeText(); r != "" {
		return what + ", " + r
	}
	return what
}

// HasRange reports whether the setting has a smallest and a largest value.
func (s *Setting) HasRange() bool {
	return (s.Type == NumberType || s.Type == IntegerType || s.Type == ListType || s.Type == MatrixType) &&
		!math.IsInf(s.Min, -1) && !math.IsInf(s.Max, 1)
}

// RangeText says the sensible range in words, or "" where there is none.
func (s *Setting) RangeText() string {
	lo, hi := !math.IsInf(s.Min, -1), !math.IsInf(s.Max, 1)
	switch {
	case lo && hi:
		return s.Format(s.Min) + " to " + s.Format(s.Max)
	case lo:
		return "at least " + s.Format(s.Min)
	case hi:
		return "at most " + s.Format(s.Max)
	}
	return ""
}

// Format writes a number of this setting for people, in as few digits as
// tell it apart.
func (s *Setting) Format(v float64) string {
	if s.Type == IntegerType {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return quantity.Short(v, s.Dim)
}

// beyond writes a number that is outside a bound, in all its digits where few
// would make the two look alike.
func (s *Setting) beyond(v, bound float64) (string, string) {
	if a, b := s.Format(v), s.Format(bound); a != b {
		return a, b
	}
	return quantity.Exact(v, s.Dim), quantity.Exact(bound, s.Dim)
}

// FormatValue writes any value of this setting for people.
func (s *Setting) FormatValue(v Value) string {
	switch s.Type {
	case WordType, TextType:
		return v.Text
	case ListType, MatrixType:
		parts := make([]string, len(v.List))
		for i, x := range v.List {
			parts[i] = s.Format(x)
		}
		return strings.Join(parts, ", ")
	}
	return s.Format(v.Num)
}

// Check judges a value against the range, the words or wholeness. The error
// says what was found and what is allowed.
func (s *Setting) Check(v Value) error {
	switch s.Type {
	case WordType:
		if !slices.Contains(s.Words, v.Text) {
			return &UnknownError{What: "word", Got: v.Text, Known: s.Words}
		}
	case TextType:
		if v.Text == "" {
			return errors.New("is empty; it must be a text")
		}
	case ListType, MatrixType:
		if len(v.List) == 0 {
			return fmt.Errorf("is empty; it must be %s", s.Allowed())
		}
		for _, x := range v.List {
			if err := s.checkNum(x); err != nil {
				return err
			}
		}
	default:
		return s.checkNum(v.Num)
	}
	return nil
}

func (s *Setting) checkNum(v float64) error {
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return fmt.Errorf("%v is no finite number; allowed is %s", v, s.Allowed())
	case s.Type == IntegerType && v != math.Trunc(v):
		return fmt.Errorf("%v is not a whole number; allowed is %s", v, s.Allowed())
	case v < s.Min:
		got, bound := s.beyond(v, s.Min)
		return fmt.Errorf("%s is below %s; allowed is %s", got, bound, s.Allowed())
	case v > s.Max:
		got, bound := s.beyond(v, s.Max)
		return fmt.Errorf("%s is above %s; allowed is %s", got, bound, s.Allowed())
	}
	return nil
}

// Read turns what a scenario file or a flag holds (a string with a unit, a
// number, a list of them) into a checked value. A Driven setting must have
// been given its dimension by In.
func (s *Setting) Read(raw any) (Value, error) {
	var v Value
	var err error
	switch s.Type {
	case WordType, TextType:
		text, ok := raw.(string)
		if !ok {
			return v, fmt.Errorf("%v is not a text; allowed is %s", raw, s.Allowed())
		}
		v.Text = text
	case ListType:
		v.List, err = s.readRow(raw)
	case MatrixType:
		v, err = s.readMatrix(raw)
	default:
		v.Num, err = s.readNum(raw)
	}
	if err == nil {
		err = s.Check(v)
	}
	return v, err
}

func (s *Setting) readMatrix(raw any) (Value, error) {
	rows, ok := raw.([]any)
	if !ok {
		return Value{}, fmt.Errorf("%v is not a list of rows; allowed is %s", raw, s.Allowed())
	}
	v := Value{Rows: len(rows)}
	width := 0
	for i, r := range rows {
		row, err := s.readRow(r)
		if err != nil {
			return Value{}, fmt.Errorf("row %d: %w", i+1, err)
		}
		if i > 0 && len(row) != width {
			return Value{}, fmt.Errorf("row %d has %d values, the first has %d", i+1, len(row), width)
		}
		width = len(row)
		v.List = append(v.List, row...)
	}
	return v, nil
}

// readRow reads a list; a single value is a list of one.
func (s *Setting) readRow(raw any) ([]float64, error) {
	items, ok := raw.([]any)
	if !ok {
		items = []any{raw}
	}
	row := make([]float64, len(items))
	for i, item := range items {
		var err error
		if row[i], err = s.readNum(item); err != nil {
			return nil, err
		}
	}
	return row, nil
}

func (s *Setting) readNum(raw any) (float64, error) {
	var plain float64
	switch x := raw.(type) {
	case float64:
		plain = x
	case int64:
		plain = float64(x)
	case int:
		plain = float64(x)
	case string:
		v, err := quantity.ParseAs(x, s.Dim)
		if err != nil {
			return 0, fmt.Errorf("%w; allowed is %s", err, s.Allowed())
		}
		return v, nil
	default:
		return 0, fmt.Errorf("%v is not a number; allowed is %s", raw, s.Allowed())
	}
	if s.Dim != quantity.None && plain != 0 {
		return 0, fmt.Errorf("%v has no unit; allowed is %s, in quotes with its unit", raw, s.Allowed())
	}
	return plain, nil
}
