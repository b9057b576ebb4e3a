package baseline

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// Save writes the baseline to a file: a new one takes the place of an old one
// only when it is wholly there, so that nothing is lost on a full disk.
func (b *Baseline) Save(path, scenario string) error {
	var text bytes.Buffer
	if err := b.WriteTo(&text, filepath.Base(scenario)); err != nil {
		return err
	}
	return Replace(path, text.Bytes())
}

// Replace writes a file whole, or leaves what is there as it is. What is there
// and no plain file, a device or a pipe, is written to.
func Replace(path string, text []byte) error {
	if full, err := filepath.EvalSymlinks(path); err == nil {
		path = full // the link stays
	}
	mode := fs.FileMode(0o666)
	switch info, err := os.Stat(path); {
	case err == nil && !info.Mode().IsRegular():
		return overwrite(path, text)
	case err == nil:
		// A file that may not be written is not to be replaced either.
		f, err := os.OpenFile(path, os.O_WRONLY, 0)
		if err != nil {
			return err
		}
		f.Close()
		mode = info.Mode().Perm()
	case !errors.Is(err, fs.ErrNotExist):
		return err
	}
	return swap(path, text, mode)
}

// swap writes a file beside and puts it in the place of the old one.
func swap(path string, text []byte, mode fs.FileMode) error {
	beside := fmt.Sprintf("%s.%d", path, os.Getpid())
	f, err := os.OpenFile(beside, os.O_WRONLY|os.O_CREATE|os.O_EXCL, mode)
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	if err == nil {
		err = f.Sync()
	}
	if e := f.Close(); err == nil {
		err = e
	}
	if err == nil {
		err = os.Rename(beside, path)
	}
	if err != nil {
		os.Remove(beside) //nolint:errcheck // there is an error to report already
		return fmt.Errorf("%s is as it was: %w", path, err)
	}
	return nil
}

func overwrite(path string, text []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY, 0)
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	if e := f.Close(); err == nil {
		err = e
	}
	return err
}
