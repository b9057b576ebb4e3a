package study

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// Table is a study's results on disk: a CSV with one row a run, in order, and
// beside it the provenance, <table>.toml. It grows at its end only. What a
// killed program left, up to a cut last row, is gone on with.
type Table struct {
	study *Study
	path  string
	file  *os.File
	next  int64 // the run that comes next
	last  int64 // before this one
	line  []byte
}

// ErrMismatch is an error about files that are there and are not to be touched:
// of another study, or damaged.
var ErrMismatch = errors.New("")

type mismatch struct{ err error }

func (m *mismatch) Error() string   { return m.err.Error() }
func (m *mismatch) Unwrap() []error { return []error{m.err, ErrMismatch} }

// OpenTable opens or creates the table of a study's shard. Rows that are there
// are handed to have, in order, and stay; a last row that was cut off is taken
// off. Files that are not of this very study are refused with ErrMismatch and
// left alone, unless force is set: then they are begun anew.
func OpenTable(path string, st *Study, shard Shard, version string, force bool, have func(Row)) (*Table, error) {
	provenance, err := st.Provenance(version, shard)
	if err != nil {
		return nil, err
	}
	t := &Table{study: st, path: shard.Path(path)}
	t.next, t.last = shard.Part(st.Runs())
	err = t.resume(provenance, have)
	switch {
	case err == nil:
		return t, nil
	case errors.Is(err, fs.ErrNotExist), force && errors.Is(err, ErrMismatch):
		t.next, t.last = shard.Part(st.Runs())
		err = t.create(provenance)
	}
	if err != nil {
		return nil, err
	}
	return t, nil
}

// resume opens a table that is there.
func (t *Table) resume(provenance string, have func(Row)) error {
	switch info, err := os.Stat(t.path); {
	case err != nil:
		return err
	case info.Size() == 0: // nothing in it to lose
		return fs.ErrNotExist
	}
	text, err := os.ReadFile(t.path + ".toml")
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return &mismatch{fmt.Errorf("%s: exists, and there is no %s.toml that says what it is of; choose another name, or --force", t.path, t.path)}
	case err != nil:
		return err
	case string(text) != provenance:
		return &mismatch{fmt.Errorf("%s: %w; choose another name, or --force", t.path, difference(string(text), provenance))}
	}
	f, err := os.OpenFile(t.path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	if err := lock(f); err != nil {
		f.Close()
		return &mismatch{fmt.Errorf("%s: %w", t.path, err)}
	}
	whole, err := t.read(f, have)
	if err == nil {
		err = f.Truncate(whole)
	}
	if err == nil {
		_, err = f.Seek(whole, io.SeekStart)
	}
	if err == nil && whole == 0 { // killed before the header was out
		_, err = f.WriteString(t.study.Header() + "\n")
	}
	if err != nil {
		f.Close()
		return err
	}
	t.file = f
	return nil
}

// longestRow bounds a line of a table, bytes.
const longestRow = 1 << 20

// read hands over the whole rows of a table and returns how many bytes they and
// the header take.
func (t *Table) read(f io.Reader, have func(Row)) (whole int64, err error) {
	in := bufio.NewReaderSize(f, longestRow)
	for number := 1; ; number++ {
		line, err := in.ReadSlice('\n')
		if errors.Is(err, io.EOF) {
			return whole, nil // a last line without end was cut off
		}
		wrong := func(err error) error { return &mismatch{fmt.Errorf("%s:%d: %w", t.path, number, err)} }
		if errors.Is(err, bufio.ErrBufferFull) {
			return 0, wrong(errors.New("is longer than a row can be"))
		}
		if err != nil {
			return 0, err
		}
		text := string(line[:len(line)-1])
		switch {
		case number == 1 && text != t.study.Header():
			return 0, wrong(errors.New("is not the header of this study"))
		case number == 1:
		case t.next == t.last:
			return 0, wrong(errors.New("comes after the last run"))
		default:
			row, err := t.study.parseRow(text, t.next)
			if err != nil {
				return 0, wrong(err)
			}
			have(row)
			t.next++
		}
		whole += int64(len(line))
	}
}

// create makes both files. The table is locked before anything is written.
func (t *Table) create(provenance string) error {
	f, err := os.OpenFile(t.path, os.O_RDWR|os.O_CREATE, 0o644)
	if err != nil {
		return err
	}
	if err = lock(f); err != nil {
		err = &mismatch{fmt.Errorf("%s: %w", t.path, err)}
	}
	if err == nil {
		err = f.Truncate(0)
	}
	if err == nil {
		err = writeWhole(t.path+".toml", provenance)
	}
	if err == nil {
		_, err = f.WriteString(t.study.Header() + "\n")
	}
	if err != nil {
		f.Close()
		return err
	}
	t.file = f
	return nil
}

// writeWhole writes a file so that it is there whole or not at all.
func writeWhole(path, text string) error {
	return writeAtomic(path, func(w *bufio.Writer) error {
		_, err := w.WriteString(text)
		return err
	})
}

// writeAtomic is writeWhole for what is written piece by piece.
func writeAtomic(path string, write func(w *bufio.Writer) error) error {
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return renamed(err, path)
	}
	w := bufio.NewWriterSize(f, 1<<16)
	err = write(w)
	for _, finish := range []func() error{w.Flush, func() error { return f.Chmod(0o644) }, f.Close} {
		if e := finish(); err == nil {
			err = e
		}
	}
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name()) //nolint:errcheck // what it is about has failed already
	}
	return renamed(err, path)
}

// renamed makes an error speak of the file that was meant, not of its temporary
// name.
func renamed(err error, path string) error {
	var p *fs.PathError
	if errors.As(err, &p) && strings.HasPrefix(filepath.Base(p.Path), "."+filepath.Base(path)+".") {
		return &fs.PathError{Op: "write", Path: path, Err: p.Err}
	}
	return err
}

// Path returns where the table lies.
func (t *Table) Path() string { return t.path }

// Left returns the runs that are still to be made, from first to before last.
func (t *Table) Left() (first, last int64) { return t.next, t.last }

// Append writes rows that come next.
func (t *Table) Append(rows []Row) error {
	t.line = t.line[:0]
	for i := range rows {
		t.line = t.study.appendRow(t.line, &rows[i])
	}
	if _, err := t.file.Write(t.line); err != nil {
		return fmt.Errorf("%w; what is there can be gone on with by the same command", err)
	}
	t.next += int64(len(rows))
	return nil
}

// Close closes the table.
func (t *Table) Close() error { return t.file.Close() }
