package excitation

import (
	"bytes"
	"fmt"
	"math"
)

// readTable reads rows of columns: time and value where step is 0, else
// nothing but values.
func readTable(s *lines, step float64) (Record, error) {
	rec := Record{Step: step}
	var cols [][]byte
	var row []float64
	pairs := step > 0 // every row so far has two columns
	for s.next() {
		if s.idle() {
			continue
		}
		var err error
		if cols, err = s.fields(cols[:0]); err != nil {
			return rec, err
		}
		if len(rec.Values) == 0 && heading(cols) {
			continue
		}
		if row, err = s.numbers(row[:0], cols); err != nil {
			return rec, err
		}
		if step > 0 {
			rec.Values = append(rec.Values, row...)
			pairs = pairs && len(row) == 2
			continue
		}
		if err := s.addPair(&rec, row); err != nil {
			return rec, err
		}
	}
	if pairs && clocked(rec.Values, step) {
		return rec, fmt.Errorf("%s: the first of its two columns counts up by the step, %g s, so it holds times; leave step out",
			s.name, step)
	}
	return rec, nil
}

// addPair appends a row that must be time and value.
func (s *lines) addPair(rec *Record, row []float64) error {
	switch len(row) {
	case 2:
	case 1:
		return s.errorf("1 column found where time and value must stand; if every number is a value, give step")
	default:
		return s.errorf("%d columns found where time and value must stand; if every number is a value, give step", len(row))
	}
	if n := len(rec.Times); n > 0 && !(row[0] > rec.Times[n-1]) {
		return s.errorf("time %g s does not come after %g s in the row before", row[0], rec.Times[n-1])
	}
	rec.Times = append(rec.Times, row[0])
	rec.Values = append(rec.Values, row[1])
	return nil
}

// numbers appends the numbers of a row to into.
func (s *lines) numbers(into []float64, cols [][]byte) ([]float64, error) {
	for i, c := range cols {
		v, err := number(c)
		if err != nil {
			return into, s.errorf("column %d: %w", i+1, err)
		}
		into = append(into, v)
	}
	return into, nil
}

// heading reports whether a line before the first row is words rather than a
// row with a slip in it: its first column is a word, and it has more words
// than anything else.
func heading(cols [][]byte) bool {
	words := 0
	for i, c := range cols {
		switch {
		case len(c) == 0: // a heading may leave the first column unnamed
		case worded(c):
			words++
		case i == 0:
			return false
		default:
			words--
		}
	}
	return words > 0
}

// worded reports whether a column is a word: it starts with a letter and is
// none of the texts that stand for a value that could not be computed.
func worded(c []byte) bool {
	if c = bytes.TrimLeft(c, "\"'([{"); len(c) == 0 {
		return false
	}
	switch string(bytes.ToLower(c)) {
	case "nan", "inf", "infinity":
		return false
	}
	b := c[0] | 0x20 // lower case
	return b >= 'a' && b <= 'z' || c[0] >= 0x80
}

// clocked reports whether the first of every two values counts up by step, as
// only a column of times does. Taking such times for values would send the
// actuator off on a ramp, so a step given beside them is refused.
func clocked(values []float64, step float64) bool {
	const rows = 3 // fewer could be chance
	if len(values) < 2*rows {
		return false
	}
	for i := 2; i < len(values); i += 2 {
		if !(math.Abs(values[i]-values[i-2]-step) <= 0.01*step) {
			return false
		}
	}
	return true
}
