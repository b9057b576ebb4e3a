package runlog

import (
	"bytes"
	"fmt"
	"slices"
	"unicode/utf8"

	"golang.org/x/text/encoding/charmap"
)

// layout is how a table is written, as its first lines show it.
type layout struct {
	separator byte // ' ' stands for any run of blanks and tabs
	mark      byte // decimal mark beside the point; a point: none
	end       byte // of lines: '\n', or '\r' alone
	quoted    bool // cells may stand in quotes
	columns   int
	first     int      // line of the first row, from 1
	at        int      // where that line begins in the head
	names     []string // of the columns; nil where no line names them
	units     []string // from a line of their own, nil where there is none
	skipped   int      // lines before the first row that are neither blank nor the names
}

// line is one line of the head.
type line struct {
	text   []byte // without outer blanks and comment sign
	number int
	at     int
	idle   bool // blank or a comment
}

// findLayout finds out how the table is written of which head is the beginning;
// whole says that there is no more of it. Before the rows there may be anything:
// the rows are those lines that hold mostly numbers, in as many columns as in the
// longest run of such lines.
func findLayout(head []byte, whole bool) (layout, error) {
	l := layout{end: '\n'}
	if bytes.IndexByte(head, '\n') < 0 && bytes.IndexByte(head, '\r') >= 0 {
		l.end = '\r'
	}
	lines := splitLines(head, l.end, whole)
	var best run
	for _, sep := range []byte{'\t', ';', ',', ' '} {
		if r := longestRun(lines, sep); r.score > best.score {
			best = r
			l.separator = sep
		}
	}
	if best.rows == 0 {
		return l, noRows(lines)
	}
	l.mark = decimalMark(l.separator)
	l.columns = best.columns
	first, err := firstRow(lines, l.separator, best)
	if err != nil {
		return l, err
	}
	at := lines[first]
	l.first, l.at = at.number, at.at
	l.quoted = bytes.IndexByte(head[at.at:], '"') >= 0
	return l, l.heading(lines[:first])
}

// firstRow finds the first line of the width of the longest run. Before it there
// may be single lines of numbers, but no other table.
func firstRow(lines []line, sep byte, best run) (int, error) {
	const table = 3 // rows are no accident
	other := run{}
	for i, l := range lines[:best.first] {
		if l.idle {
			continue
		}
		n, columns := numbers(l.text, sep)
		switch {
		case n <= 0:
			other = run{}
			continue
		case columns == best.columns:
			return i, nil
		case columns != other.columns:
			other = run{first: i, columns: columns}
		}
		if other.rows++; other.rows == table {
			return 0, fmt.Errorf("%d: %s here, but %d from line %d on; one table must have the same columns throughout", lines[other.first].number,
				plural(int64(columns), "column", "columns"), best.columns, lines[best.first].number)
		}
	}
	return best.first, nil
}

func noRows(lines []line) error {
	for _, l := range lines {
		if !l.idle {
			return fmt.Errorf("%d: no row of numbers found here or below; the line is %q", l.number, clip(l.text))
		}
	}
	return fmt.Errorf("no row of numbers; there is nothing but blank lines and comments")
}

// clip shortens what is quoted in a message.
func clip(b []byte) string {
	const most = 60
	runes := []rune(toUTF8(b[:min(len(b), 4*most)]))
	if len(runes) > most {
		return string(runes[:most]) + "…"
	}
	return string(runes)
}

// splitLines takes the head apart. A last line without an end counts only where
// the head is the whole file.
func splitLines(head []byte, end byte, whole bool) []line {
	var out []line
	at := 0
	for n := 1; at < len(head); n++ {
		i := bytes.IndexByte(head[at:], end)
		next := at + i + 1
		if i < 0 {
			if !whole && len(out) > 0 {
				break
			}
			i, next = len(head)-at, len(head)
		}
		text := bytes.TrimRight(head[at:at+i], " \r\n")
		l := line{text: text, number: n, at: at, idle: idle(text)}
		if l.idle {
			l.text = bytes.TrimLeft(text, "#%!/ \t")
		}
		out = append(out, l)
		at = next
	}
	return out
}

// idle reports whether a line is blank or a comment.
func idle(text []byte) bool {
	text = bytes.TrimLeft(text, " \t")
	return len(text) == 0 || text[0] == '#' || text[0] == '%' || text[0] == '!' || bytes.HasPrefix(text, []byte("//"))
}

// run is a run of lines with equally many columns that are mostly numbers.
type run struct {
	first, rows, columns, score int
}

// longestRun finds the run in which most numbers stand under that separator.
func longestRun(lines []line, sep byte) run {
	var best, now run
	for i, l := range lines {
		if l.idle {
			continue
		}
		n, columns := numbers(l.text, sep)
		if n <= 0 {
			now = run{}
			continue
		}
		if now.rows == 0 || now.columns != columns {
			now = run{first: i, columns: columns}
		}
		now.rows++
		now.score += n
		if now.score > best.score {
			best = now
		}
	}
	return best
}

// numbers returns how many more numbers than other texts there are in a line, and
// how many columns.
func numbers(text []byte, sep byte) (n, columns int) {
	cells := split(text, sep, nil)
	for _, c := range cells {
		n += counts(c, sep)
	}
	return n, len(cells)
}

// counts tells numbers, 1, from missing values, 0, and other texts, −1.
func counts(cell []byte, sep byte) int {
	switch v, err := value(cell, decimalMark(sep)); {
	case err != nil:
		return -1
	case v != v:
		return 0
	}
	return 1
}

// decimalMark is the mark that may stand for a decimal point: a comma where it
// does not separate.
func decimalMark(sep byte) byte {
	if sep == ',' {
		return '.'
	}
	return ','
}

// split appends the cells of a line. Separators inside quotes are none.
func split(text []byte, sep byte, into [][]byte) [][]byte {
	if sep == ' ' {
		return slices.AppendSeq(into, bytes.FieldsSeq(text))
	}
	from, inside := 0, false
	for i, c := range text {
		switch {
		case c == '"':
			inside = !inside
		case c == sep && !inside:
			into = append(into, text[from:i])
			from = i + 1
		}
	}
	return append(into, text[from:])
}

// heading finds the names of the columns, and their units, in what stands before
// the rows: the last line of words with as many cells as the rows have columns.
// A line of units may stand between.
func (l *layout) heading(before []line) error {
	for i := len(before) - 1; i >= 0 && l.names == nil; i-- {
		cells := l.words(before[i])
		if cells == nil {
			continue
		}
		if l.units == nil && allUnits(cells) {
			l.units = cells
			continue
		}
		l.names = cells
	}
	if l.names == nil {
		l.names, l.units = l.units, nil
	}
	for _, b := range before {
		if !b.idle && len(b.text) > 0 {
			l.skipped++
		}
	}
	if l.names != nil && l.skipped > 0 {
		l.skipped--
	}
	if l.units != nil && l.skipped > 0 {
		l.skipped--
	}
	return l.decimalCommas(before)
}

// words returns the cells of a line, nil if they are not as many as the columns,
// or hold a number. The last column may be closed by a separator, or not.
func (l *layout) words(at line) []string {
	if len(at.text) == 0 {
		return nil
	}
	cells := split(at.text, l.separator, nil)
	if l.separator == ' ' {
		cells = joinUnits(cells)
	}
	if n := len(cells); n == l.columns+1 && len(bytes.TrimSpace(cells[n-1])) == 0 {
		cells = cells[:l.columns]
	} else if n == l.columns-1 && n > 0 && l.separator != ' ' {
		cells = append(cells, nil)
	}
	if len(cells) != l.columns {
		return nil
	}
	out := make([]string, len(cells))
	any := false
	for i, c := range cells {
		if counts(c, l.separator) == 1 {
			return nil
		}
		out[i] = toUTF8(bytes.Trim(c, " \t\"'\r"))
		any = any || out[i] != ""
	}
	if !any {
		return nil
	}
	return out
}

// joinUnits puts a unit in brackets back to the name that a blank cut it from.
func joinUnits(cells [][]byte) [][]byte {
	var out [][]byte
	for _, c := range cells {
		if n := len(out); n > 0 && (c[0] == '[' || c[0] == '(') {
			out[n-1] = append(append(bytes.Clone(out[n-1]), ' '), c...)
			continue
		}
		out = append(out, c)
	}
	return out
}

// decimalCommas refuses a table in which commas separate columns and are decimal
// marks too: the heading has half as many names as the rows have cells.
func (l *layout) decimalCommas(before []line) error {
	if l.separator != ',' || l.names != nil {
		return nil
	}
	for i := len(before) - 1; i >= 0; i-- {
		cells := split(before[i].text, ',', nil)
		if 2*len(cells) == l.columns && len(cells) > 1 {
			return fmt.Errorf("%d: %d cells in the first row under the %d names of line %d; commas that are decimal marks and separators at once cannot be told apart",
				l.first, l.columns, len(cells), before[i].number)
		}
	}
	return nil
}

// toUTF8 takes text that is no UTF-8 for Windows-1252, the usual western one.
func toUTF8(b []byte) string {
	if utf8.Valid(b) {
		return string(b)
	}
	out, err := charmap.Windows1252.NewDecoder().Bytes(b)
	if err != nil {
		return string(bytes.ToValidUTF8(b, []byte("?")))
	}
	return string(out)
}
