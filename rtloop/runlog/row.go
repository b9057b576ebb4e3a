package runlog

import (
	"bytes"
	"fmt"
	"math"
	"slices"
)

// prepare readies what rows are read into.
func (r *Reader) prepare() {
	cols := r.chosen.columns
	r.order = make([]int, len(cols))
	for i := range r.order {
		r.order[i] = i
	}
	slices.SortStableFunc(r.order, func(a, b int) int { return cols[a].at - cols[b].at })
	r.row = make([]float64, len(cols))
	r.pos, r.line = r.layout.at, r.layout.first-1
	r.holes.prepare(r.chosen)
}

// badTail is what stands behind the last row and is none: it is an error when a
// row follows after all.
type badTail struct {
	err   error
	lines int
	first int
	cut   bool // one line without its end
}

// nextRow reads the next row into r.row; more is false at the end. Lines that are
// no rows are forgiven only at the very end of the file.
func (r *Reader) nextRow() (more bool, err error) {
	for {
		text, closed, err := r.nextLine()
		if err != nil {
			return false, err
		}
		if text == nil {
			return false, nil
		}
		if idle(text) || len(text) == 1 && text[0] == '\r' {
			continue
		}
		bad := r.parse(text, !closed)
		if bad == nil {
			if r.tail.err != nil {
				return false, r.tail.err
			}
			r.rowLine = r.line
			return true, nil
		}
		if r.tail.err == nil {
			r.tail = badTail{err: r.errorf(r.line, "%w", bad), first: r.line, cut: !closed}
		}
		if r.tail.lines++; r.tail.lines > badMost {
			return false, r.tail.err
		}
	}
}

// parse reads the cells of a row. Of one without a line end the last cell may be
// cut off, and must not be one that is read.
func (r *Reader) parse(text []byte, open bool) error {
	if n := len(text); n > 0 && text[n-1] == '\r' {
		text = text[:n-1]
	}
	var err error
	switch {
	case r.layout.quoted:
		err = r.parseSplit(text)
	case r.layout.separator == ' ':
		err = r.parseBlank(text)
	default:
		err = r.parseFast(text)
	}
	if err == nil && open && r.chosen.columns[r.order[len(r.order)-1]].at == r.layout.columns-1 {
		return fmt.Errorf("the line has no end, so that its last number may be cut off")
	}
	return err
}

// parseFast reads the cells between single separators in one pass.
func (r *Reader) parseFast(text []byte) error {
	at, i := 0, 0
	sep, mark := r.layout.separator, r.layout.mark
	for _, k := range r.order {
		c := &r.chosen.columns[k]
		for ; at < c.at; at++ {
			j := bytes.IndexByte(text[i:], sep)
			if j < 0 {
				return r.width(text)
			}
			i += j + 1
		}
		v, n := scan(text[i:], mark)
		if end := i + n; n == 0 || end < len(text) && text[end] != sep || !(math.Abs(v) <= largest) {
			cell := text[i:]
			if j := bytes.IndexByte(cell, sep); j >= 0 {
				cell = cell[:j]
			}
			var err error
			if v, err = value(cell, mark); err != nil {
				return r.badCell(c, err, text)
			}
		}
		if !c.plain {
			v = c.scale.SI(v)
		}
		r.row[k] = v
	}
	if at+bytes.Count(text[i:], []byte{sep})+1 != r.layout.columns {
		return r.width(text)
	}
	return nil
}

// parseBlank reads the cells between blanks and tabs in one pass.
func (r *Reader) parseBlank(text []byte) error {
	k, i := 0, 0
	for at := 0; ; at++ {
		for i < len(text) && blank(text[i]) {
			i++
		}
		if i == len(text) {
			if at != r.layout.columns {
				return r.width(text)
			}
			return nil
		}
		from, end := i, i
		for ; k < len(r.order) && r.chosen.columns[r.order[k]].at == at; k++ {
			c := &r.chosen.columns[r.order[k]]
			v, n := scan(text[from:], r.layout.mark)
			if end = from + n; n == 0 || end < len(text) && !blank(text[end]) || !(math.Abs(v) <= largest) {
				end = from + word(text[from:])
				var err error
				if v, err = value(text[from:end], r.layout.mark); err != nil {
					return r.badCell(c, err, text)
				}
			}
			r.row[r.order[k]] = c.scale.SI(v)
		}
		if i = end; end == from {
			i += word(text[from:])
		}
	}
}

func blank(c byte) bool { return c == ' ' || c == '\t' }

// word returns the length of the word at the start of text.
func word(text []byte) int {
	for i, c := range text {
		if blank(c) {
			return i
		}
	}
	return len(text)
}

// parseSplit takes the row apart first.
func (r *Reader) parseSplit(text []byte) error {
	r.cells = split(text, r.layout.separator, r.cells[:0])
	if len(r.cells) != r.layout.columns {
		if err := r.width(text); err != nil {
			return err
		}
	}
	for _, k := range r.order {
		c := &r.chosen.columns[k]
		v, err := value(r.cells[c.at], r.layout.mark)
		if err != nil {
			return r.badCell(c, err, text)
		}
		r.row[k] = c.scale.SI(v)
	}
	return nil
}

// width complains of a row with another number of cells, if that is so. A
// separator too many at the end is no matter.
func (r *Reader) width(text []byte) error {
	cells := split(text, r.layout.separator, nil)
	n := len(cells)
	if n == r.layout.columns || n == r.layout.columns+1 && len(bytes.TrimSpace(cells[n-1])) == 0 {
		return nil
	}
	return fmt.Errorf("%s found, where the rows above have %d", plural(int64(n), "column", "columns"), r.layout.columns)
}

// badCell names the column of a cell that is no number, unless the whole row is
// of another kind.
func (r *Reader) badCell(c *column, err error, text []byte) error {
	if e := r.width(text); e != nil {
		return e
	}
	return fmt.Errorf("column %d (%s): %w", c.at+1, c.what, err)
}
