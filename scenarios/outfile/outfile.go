// Package outfile writes the files that people ask for: whole or not at all, and
// over an existing one only when that is wanted. It knows nothing of what is in
// them.
package outfile

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

// Write writes a whole file at once. It must not exist unless force is set; the
// error is then fs.ErrExist. One that cannot be written to its end, or whose
// writer is killed, is not there afterwards, or still the one that was there
// before. Under force a link stays a link, a file that may not be written stays,
// and a device or pipe is written to. An error names the path, and what could not
// be done is to "write" it.
func Write(path string, data []byte, force bool) error {
	return Stream(path, force, func(w io.Writer) error {
		_, err := w.Write(data)
		return err
	})
}

// Stream is Write for what is written piece by piece. The pieces are gathered into
// large ones. An error of write is returned as it is.
func Stream(path string, force bool, write func(w io.Writer) error) error {
	info, err := os.Stat(path)
	switch {
	case strings.HasSuffix(path, string(os.PathSeparator)):
		return fmt.Errorf("%q is a directory; a file name is needed", path)
	case errors.Is(err, fs.ErrNotExist):
		return about(path, replace(path, write, 0o644))
	case err != nil:
		return err
	case info.IsDir():
		return fmt.Errorf("%s: %w and is a directory; a file name is needed", path, fs.ErrExist)
	case !force:
		return fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
	}
	old, err := os.OpenFile(path, os.O_WRONLY, 0)
	if err != nil {
		return about(path, err)
	}
	if !info.Mode().IsRegular() { // nothing in it to lose
		return about(path, fill(old, write))
	}
	old.Close() //nolint:errcheck // nothing was written to it
	if path, err = filepath.EvalSymlinks(path); err != nil {
		return err
	}
	return about(path, replace(path, write, info.Mode().Perm()))
}

// replace writes beside the place and moves the file there when it is whole and
// on the disk.
func replace(path string, write func(w io.Writer) error, mode fs.FileMode) error {
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return err
	}
	err = errors.Join(f.Chmod(mode), fill(f, write))
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name()) //nolint:errcheck // there is an error to report already
	}
	return err
}

// fill has all written and closes the file.
func fill(f *os.File, write func(w io.Writer) error) error {
	w := bufio.NewWriterSize(f, 1<<16)
	err := write(w)
	if err == nil {
		err = w.Flush()
	}
	if info, e := f.Stat(); err == nil && e == nil && info.Mode().IsRegular() {
		err = f.Sync()
	}
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}

// about makes an error speak of the file that was meant, not of the one beside it.
// Those of other files stay: what is written may be read from there.
func about(path string, err error) error {
	var at *fs.PathError
	if errors.As(err, &at) && (at.Path == path || strings.HasPrefix(filepath.Base(at.Path), "."+filepath.Base(path)+".")) {
		return &fs.PathError{Op: "write", Path: path, Err: at.Err}
	}
	return err
}
