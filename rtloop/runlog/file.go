package runlog

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
)

// file is an output file that knows whether it was there before.
type file struct {
	*os.File
	made bool
}

// open opens a file to be written. Without force it must not exist. What
// stands in an existing file stays there until empty.
func open(path string, force bool) (*file, error) {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err == nil {
		return &file{f, true}, nil
	}
	if !errors.Is(err, fs.ErrExist) {
		return nil, err
	}
	if !force {
		return nil, fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
	}
	// O_CREATE makes what a dangling link points to.
	if f, err = os.OpenFile(path, os.O_WRONLY|os.O_CREATE, 0o644); err != nil {
		return nil, err
	}
	return &file{f, false}, nil
}

// empty cuts an existing file down to nothing. Pipes and devices hold nothing.
func (f *file) empty() error {
	if f.made {
		return nil
	}
	info, err := f.Stat()
	if err != nil || !info.Mode().IsRegular() {
		return err
	}
	return f.Truncate(0)
}

// discard closes the file and removes it if it was not there before.
func (f *file) discard() {
	f.Close()
	if f.made {
		os.Remove(f.Name()) //nolint:errcheck // there is an error to report already
	}
}
