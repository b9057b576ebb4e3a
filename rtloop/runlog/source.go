package runlog

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
	"os"

	"golang.org/x/text/encoding/unicode"
	"golang.org/x/text/transform"
)

// formats are files that people take for tables, by how they begin, with what
// to do about each.
var formats = []struct{ begins, is string }{
	{"MATLAB 5.0 MAT-file", "a MATLAB MAT file of version 5, which is not read here; write its columns as CSV"},
	{"MATLAB 7.3 MAT-file", "a MATLAB MAT file of version 7.3, which is not read here; write its columns as CSV"},
	{"\x89HDF", "an HDF5 file (MATLAB writes such too), which is not read here; write its columns as CSV"},
	{"PK\x03\x04", "a zip archive or a spreadsheet workbook, not text; export the sheet as CSV"},
	{"\xd0\xcf\x11\xe0", "an old spreadsheet workbook, not text; export the sheet as CSV"},
	{"\xfd7zXZ", "compressed with xz; of compressed files gzip is read"},
	{"\x28\xb5\x2f\xfd", "compressed with zstd; of compressed files gzip is read"},
	{"BZh", "compressed with bzip2; of compressed files gzip is read"},
}

// source is the text of a file: unpacked where it was compressed, and in
// UTF-8 where it says that it is in UTF-16.
type source struct {
	io.Reader
	file *os.File
	size int64 // bytes of the file, 0 where that is not known
	read int64 // bytes of it that have been read

	packed bool // the text is longer than the file, or shorter
}

// openSource opens a file and finds out what it is by how it begins.
func openSource(path string) (*source, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	s := &source{file: f}
	if err := s.recognize(path); err != nil {
		f.Close()
		return nil, err
	}
	return s, nil
}

func (s *source) recognize(path string) error {
	info, err := s.file.Stat()
	switch {
	case err != nil:
		return err
	case info.IsDir():
		return fmt.Errorf("%s: is a directory, not a log", path)
	case info.Mode().IsRegular():
		s.size = info.Size()
	}
	b := bufio.NewReaderSize(counted{s}, 4096)
	head, err := peek(b)
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	if bytes.HasPrefix(head, []byte{0x1f, 0x8b}) {
		zipped, err := gzip.NewReader(b)
		if err != nil {
			return fmt.Errorf("%s: begins like a gzip file but is none: %w", path, err)
		}
		s.packed = true
		b = bufio.NewReaderSize(zipped, 1<<16)
		if head, err = peek(b); err != nil {
			return fmt.Errorf("%s: %w", path, err)
		}
	}
	for _, f := range formats {
		if bytes.HasPrefix(head, []byte(f.begins)) {
			return fmt.Errorf("%s: is %s", path, f.is)
		}
	}
	s.Reader = b
	switch {
	case bytes.HasPrefix(head, []byte("\xef\xbb\xbf")):
		b.Discard(3) //nolint:errcheck // they have been peeked at
	case bytes.HasPrefix(head, []byte{0xff, 0xfe}), bytes.HasPrefix(head, []byte{0xfe, 0xff}):
		s.packed = true
		s.Reader = transform.NewReader(b, unicode.UTF16(unicode.LittleEndian, unicode.ExpectBOM).NewDecoder())
	case bytes.IndexByte(head, 0) >= 0:
		return fmt.Errorf("%s: is a binary file (byte %d is zero), not text", path, bytes.IndexByte(head, 0)+1)
	}
	return nil
}

// peek returns what there is of the first bytes.
func peek(b *bufio.Reader) ([]byte, error) {
	head, err := b.Peek(512)
	if err != nil && !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
		return nil, err
	}
	return head, nil
}

// counted reads the file and counts.
type counted struct{ s *source }

func (c counted) Read(p []byte) (int, error) {
	n, err := c.s.file.Read(p)
	c.s.read += int64(n)
	return n, err
}

func (s *source) Close() error { return s.file.Close() }
