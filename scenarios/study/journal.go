package study

import (
	"bufio"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"

	"antelag/scenarios/outfile"
)

// Journal is a CSV that grows at its end only, with its provenance beside it,
// <path>.toml. What a killed program left, up to a cut last row, is gone on with.
type Journal struct {
	path   string
	header string
	file   *os.File
}

// ErrMismatch is an error about files that are there and are not to be touched:
// of something else, or damaged.
var ErrMismatch = errors.New("")

type mismatch struct{ err error }

func (m *mismatch) Error() string   { return m.err.Error() }
func (m *mismatch) Unwrap() []error { return []error{m.err, ErrMismatch} }

// OpenJournal opens or creates a journal. Rows that are there are handed to row,
// in order and without their ends, and stay; a last row that was cut off is taken
// off. Files of another header or provenance, and rows that row refuses, are
// ErrMismatch and left alone, unless force is set: then the journal is begun
// anew; check is asked about all rows first, so that none is handed to row then.
func OpenJournal(path, header, provenance string, force bool, check, row func(line string) error) (*Journal, error) {
	j := &Journal{path: path, header: header}
	err := j.resume(provenance, force, check, row)
	if errors.Is(err, fs.ErrNotExist) || force && errors.Is(err, ErrMismatch) {
		err = j.create(provenance)
	}
	if err != nil {
		return nil, err
	}
	return j, nil
}

// resume opens a journal that is there.
func (j *Journal) resume(provenance string, force bool, check, row func(line string) error) error {
	switch info, err := os.Stat(j.path); {
	case err != nil:
		return err
	case !info.Mode().IsRegular():
		return fmt.Errorf("%s: is no ordinary file; a table that can be gone on with needs one", j.path)
	case info.Size() == 0: // nothing in it to lose
		return fs.ErrNotExist
	}
	text, err := os.ReadFile(j.path + ".toml")
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return &mismatch{fmt.Errorf("%s: exists, and there is no %s.toml that says what it is of; choose another name, or --force", j.path, j.path)}
	case err != nil:
		return err
	case string(text) != provenance:
		return &mismatch{fmt.Errorf("%s: %w; choose another name, or --force", j.path, difference(string(text), provenance))}
	}
	f, err := os.OpenFile(j.path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	if err := j.goOn(f, force, check, row); err != nil {
		f.Close()
		return err
	}
	j.file = f
	return nil
}

// goOn reads what is there and puts the end where it belongs. Where a damaged
// file would be begun anew, it is looked through before any row is handed over.
func (j *Journal) goOn(f *os.File, force bool, check, row func(line string) error) error {
	if err := lock(f); err != nil {
		return fmt.Errorf("%s: %w", j.path, err)
	}
	if force {
		if _, err := readRows(j.path, j.header, f, check); err != nil {
			return err
		}
		if _, err := f.Seek(0, io.SeekStart); err != nil {
			return err
		}
	}
	whole, err := readRows(j.path, j.header, f, row)
	if err == nil {
		err = f.Truncate(whole)
	}
	if err == nil {
		_, err = f.Seek(whole, io.SeekStart)
	}
	if err == nil && whole == 0 { // killed before the header was out
		_, err = f.WriteString(j.header + "\n")
	}
	return err
}

// longestRow bounds a line of a journal, bytes.
const longestRow = 1 << 20

// readRows hands over the whole rows of a journal and returns how many bytes they
// and the header take.
func readRows(path, header string, in io.Reader, row func(line string) error) (whole int64, err error) {
	lines := bufio.NewReaderSize(in, longestRow)
	for number := 1; ; number++ {
		line, err := lines.ReadSlice('\n')
		switch {
		case errors.Is(err, io.EOF):
			return whole, nil // a last line without end was cut off
		case errors.Is(err, bufio.ErrBufferFull):
			err = errors.New("is longer than a row can be")
		case err != nil:
			return 0, err
		case number > 1:
			err = row(string(line[:len(line)-1]))
		case string(line[:len(line)-1]) != header:
			err = errors.New("is not the header that belongs here")
		}
		if err != nil {
			return 0, &mismatch{fmt.Errorf("%s:%d: %w", path, number, err)}
		}
		whole += int64(len(line))
	}
}

// create makes both files. The journal is locked before anything is written.
func (j *Journal) create(provenance string) error {
	f, err := os.OpenFile(j.path, os.O_RDWR|os.O_CREATE, 0o644)
	if err != nil {
		return err
	}
	if err = lock(f); err != nil {
		err = fmt.Errorf("%s: %w", j.path, err)
	}
	if err == nil {
		err = f.Truncate(0)
	}
	if err == nil {
		err = outfile.Write(j.path+".toml", []byte(provenance), true)
	}
	if err == nil {
		_, err = f.WriteString(j.header + "\n")
	}
	if err != nil {
		f.Close()
		return err
	}
	j.file = f
	return nil
}

// Append writes whole rows, each with its end.
func (j *Journal) Append(rows []byte) error {
	if _, err := j.file.Write(rows); err != nil {
		return fmt.Errorf("%w; what is there can be gone on with by the same command", err)
	}
	return nil
}

// Path returns where the journal lies.
func (j *Journal) Path() string { return j.path }

// Close closes the journal.
func (j *Journal) Close() error { return j.file.Close() }
