package study

import (
	"errors"
	"io"
)

// Table is a study's results on disk: a journal with one row a run, in order.
type Table struct {
	*Journal
	rows *rows
	line []byte
}

// rows reads the rows of a shard, each of which has its place.
type rows struct {
	study      *Study
	next, last int64 // the run that comes next; the first that is not the shard's
	have       func(Row)
}

func newRows(st *Study, shard Shard, have func(Row)) *rows {
	r := &rows{study: st, have: have}
	r.next, r.last = shard.Part(st.Runs())
	return r
}

func (r *rows) take(line string) error {
	if r.next == r.last {
		return errors.New("comes after the last run")
	}
	row, err := r.study.parseRow(line, r.next)
	if err != nil {
		return err
	}
	r.next++
	r.have(row)
	return nil
}

// read takes all rows of a table.
func (r *rows) read(path string, in io.Reader) (whole int64, err error) {
	return readRows(path, r.study.Header(), in, r.take)
}

// OpenTable opens or creates the table of a study's shard: OpenJournal. Rows that
// are there are handed to have, in order.
func OpenTable(path string, st *Study, shard Shard, version string, force bool, have func(Row)) (*Table, error) {
	provenance, err := st.Provenance(version, shard)
	if err != nil {
		return nil, err
	}
	t := &Table{rows: newRows(st, shard, have)}
	if t.Journal, err = OpenJournal(shard.Path(path), st.Header(), provenance, force, newRows(st, shard, func(Row) {}).take, t.rows.take); err != nil {
		return nil, err
	}
	return t, nil
}

// Left returns the runs that are still to be made, from first to before last.
func (t *Table) Left() (first, last int64) { return t.rows.next, t.rows.last }

// Append writes rows that come next.
func (t *Table) Append(rows []Row) error {
	t.line = t.line[:0]
	for i := range rows {
		t.line = t.rows.study.appendRow(t.line, &rows[i])
	}
	t.rows.next += int64(len(rows))
	return t.Journal.Append(t.line)
}
