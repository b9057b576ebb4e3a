package excitation

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"math"
	"slices"
	"strconv"
)

// Record is a time history as a file holds it: its values in the file's own
// unit, neither scaled nor trimmed.
type Record struct {
	// Times are the instants of the values, s, strictly increasing, where the
	// file gives them; nil where the values are evenly spaced.
	Times []float64
	// Step is the time between evenly spaced values, s; 0 where Times stand.
	// The first value is then at record time 0.
	Step   float64
	Values []float64
	// Unit is the unit that the file itself declares, in the notation of
	// quantity.ParseUnit, or "" where it declares none.
	Unit string
}

// First returns the record time of the first value, s.
func (r *Record) First() float64 {
	if r.Times != nil {
		return r.Times[0]
	}
	return 0
}

// Last returns the record time of the last value, s.
func (r *Record) Last() float64 {
	if r.Times != nil {
		return r.Times[len(r.Times)-1]
	}
	return float64(len(r.Values)-1) * r.Step
}

const (
	maxRecordBytes = 64e6 // more is no accelerogram, and would fill the memory
	maxLineBytes   = 1e6
	maxMagnitude   = 1e15 // a larger number in a file is a slip, not a value
)

// ReadRecord reads a record in any of the forms that record files have, told
// apart by their content:
//
//   - PEER NGA AT2: title lines, then a line with NPTS= and DT= (or the older
//     "4000 0.005 NPTS, DT"), then NPTS values in reading order;
//   - two columns, time in s and value, where step is 0;
//   - any number of columns where step, s, is above 0: then every number is
//     a value, row by row.
//
// Columns are separated by commas, semicolons, tabs or blanks; where
// semicolons separate, a comma is a decimal mark. Blank lines, lines that
// start with # % ! or //, and heading lines of words before the first row are
// skipped. An error names the file by name, the line, and what was found.
func ReadRecord(r io.Reader, name string, step float64) (Record, error) {
	if math.IsNaN(step) || math.IsInf(step, 0) || step < 0 {
		return Record{}, fmt.Errorf("step: %v s between values; it must be above zero", step)
	}
	data, err := readAll(r, name, maxRecordBytes)
	if err != nil {
		return Record{}, err
	}
	s := &lines{data: bytes.TrimPrefix(data, []byte("\xef\xbb\xbf")), name: name}
	var rec Record
	if h, ok, err := findAT2(*s); err != nil {
		return Record{}, err
	} else if ok {
		rec, err = readAT2(s, h, step)
		if err != nil {
			return Record{}, err
		}
	} else if rec, err = readTable(s, step); err != nil {
		return Record{}, err
	}
	if n := len(rec.Values); n < 2 {
		return Record{}, fmt.Errorf("%s: %d values found; a record needs at least 2", name, n)
	}
	return rec, nil
}

// readAll reads up to limit bytes and refuses a longer file.
func readAll(r io.Reader, name string, limit int64) ([]byte, error) {
	data, err := io.ReadAll(io.LimitReader(r, limit+1))
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	if int64(len(data)) > limit {
		return nil, fmt.Errorf("%s: larger than %g MB, the largest record file that is read", name, float64(limit)/1e6)
	}
	return data, nil
}

// lines walks over the lines of a file, ended by LF, CR LF or CR alone.
type lines struct {
	data []byte
	name string
	line int    // number of the current line, from 1
	text []byte // the current line without its end and outer blanks
}

func (s *lines) next() bool {
	if len(s.data) == 0 {
		return false
	}
	s.line++
	i := bytes.IndexAny(s.data, "\r\n")
	if i < 0 {
		s.text, s.data = bytes.TrimSpace(s.data), nil
		return true
	}
	s.text = bytes.TrimSpace(s.data[:i])
	if s.data[i] == '\r' && i+1 < len(s.data) && s.data[i+1] == '\n' {
		i++
	}
	s.data = s.data[i+1:]
	return true
}

// idle reports whether the current line is blank or a comment.
func (s *lines) idle() bool {
	return len(s.text) == 0 || bytes.IndexByte([]byte("#%!"), s.text[0]) >= 0 ||
		bytes.HasPrefix(s.text, []byte("//"))
}

// errorf is an error at the current line.
func (s *lines) errorf(format string, args ...any) error {
	return fmt.Errorf("%s:%d: %w", s.name, s.line, fmt.Errorf(format, args...))
}

// fields appends the columns of the current line to into. Two separators in a
// row leave an empty column between them; one at the end of the line closes
// the last column. A line too long for any row is an error.
func (s *lines) fields(into [][]byte) ([][]byte, error) {
	if len(s.text) > maxLineBytes {
		return into, s.errorf("a line of %d bytes; the longest that is read has 1 MB", len(s.text))
	}
	for _, sep := range []byte{';', ','} {
		if bytes.IndexByte(s.text, sep) < 0 {
			continue
		}
		rest, more := s.text, true
		for more {
			var cell []byte
			cell, rest, more = bytes.Cut(rest, []byte{sep})
			if !more && len(bytes.TrimSpace(cell)) == 0 {
				break
			}
			into = appendCell(into, cell)
		}
		return into, nil
	}
	return slices.AppendSeq(into, bytes.FieldsSeq(s.text)), nil
}

// appendCell appends what stands between two separators.
func appendCell(into [][]byte, cell []byte) [][]byte {
	n := len(into)
	if into = slices.AppendSeq(into, bytes.FieldsSeq(cell)); len(into) == n {
		return append(into, nil)
	}
	return into
}

var errEmpty = errors.New("an empty column")

// number reads one column. Decimal marks are points, or commas in a column
// that semicolons separate; the exponent may be Fortran's D.
func number(text []byte) (float64, error) {
	text = bytes.Trim(text, `"`)
	if len(text) == 0 {
		return 0, errEmpty
	}
	var buf [64]byte
	if len(text) > len(buf) {
		return 0, fmt.Errorf("%.20q… is not a number", text)
	}
	n := copy(buf[:], text)
	for i, c := range buf[:n] {
		switch {
		case c == 'd' || c == 'D':
			buf[i] = 'e'
		case c == ',':
			buf[i] = '.'
		case c >= '0' && c <= '9', c == '.', c == '+', c == '-', c == 'e', c == 'E':
		default:
			return 0, notNumber(text)
		}
	}
	v, err := strconv.ParseFloat(string(buf[:n]), 64)
	switch {
	case err != nil && !errors.Is(err, strconv.ErrRange):
		return 0, notNumber(text)
	case math.Abs(v) > maxMagnitude:
		return 0, fmt.Errorf("%s is too large; a record holds values up to %g", text, maxMagnitude)
	}
	return v, nil
}

// notNumber tells words from the texts that other programs write for a value
// they could not compute.
func notNumber(text []byte) error {
	if v, err := strconv.ParseFloat(string(text), 64); err == nil && (math.IsNaN(v) || math.IsInf(v, 0)) {
		return fmt.Errorf("%s is not a finite number", text)
	}
	return fmt.Errorf("%q is not a number", text)
}
