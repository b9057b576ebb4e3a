// Package outfile writes the files that people ask for: whole or not at all, and
// over an existing one only when that is wanted. It knows nothing of what is in
// them.
package outfile

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// Write writes a whole file at once. It must not exist unless force is set; the
// error is then fs.ErrExist. One that cannot be written to its end is not there
// afterwards, or still the one that was there before. Under force a link stays a
// link, a file that may not be written stays, and a device or pipe is written to.
// An error names the path, and what could not be done is to "write" it.
func Write(path string, data []byte, force bool) error {
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return about(path, writeNew(path, data))
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
		return about(path, fill(old, data))
	}
	old.Close() //nolint:errcheck // nothing was written to it
	return about(path, replace(path, data, info.Mode().Perm()))
}

func writeNew(path string, data []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	if err = fill(f, data); err != nil {
		os.Remove(path) //nolint:errcheck // there is an error to report already
	}
	return err
}

// replace writes beside the old file and puts the new one in its place when it
// is whole and on the disk.
func replace(path string, data []byte, mode fs.FileMode) error {
	path, err := filepath.EvalSymlinks(path)
	if err != nil {
		return err
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".*")
	if err != nil {
		return err
	}
	err = errors.Join(f.Chmod(mode), fill(f, data))
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name()) //nolint:errcheck // there is an error to report already
	}
	return err
}

// fill writes all data and closes the file.
func fill(f *os.File, data []byte) error {
	_, err := f.Write(data)
	if info, e := f.Stat(); err == nil && e == nil && info.Mode().IsRegular() {
		err = f.Sync()
	}
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}

// about makes an error speak of the file that was meant, not of the one beside it.
func about(path string, err error) error {
	var at *fs.PathError
	if errors.As(err, &at) {
		return &fs.PathError{Op: "write", Path: path, Err: at.Err}
	}
	return err
}
