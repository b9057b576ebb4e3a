package handoff

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
)

// Write puts the files into a directory, which is made if it is not there. Files
// that stand there are replaced under force only; without it the error is
// fs.ErrExist and nothing is written. The files take their places only when all
// of them are on the disk: a compensator that is cut off must not be there to be
// compiled.
func Write(ctx context.Context, dir string, files []File, force bool) (err error) {
	if err := free(dir, files, force); err != nil {
		return err
	}
	made, err := makeDir(dir)
	if err != nil {
		return err
	}
	aside, err := os.MkdirTemp(dir, ".handoff-")
	if err != nil {
		unmake(made)
		return naming(err, dir)
	}
	defer func() {
		os.RemoveAll(aside) //nolint:errcheck // what is left of it is empty or beside the point
		if err != nil {
			unmake(made)
		}
	}()
	for _, f := range files {
		if err := ctx.Err(); err != nil {
			return err
		}
		if err := writeFile(filepath.Join(aside, f.Name), f.Data); err != nil {
			return naming(err, filepath.Join(dir, f.Name))
		}
	}
	for _, f := range files {
		if err := os.Rename(filepath.Join(aside, f.Name), filepath.Join(dir, f.Name)); err != nil {
			return err
		}
	}
	return nil
}

// free checks that the files may be written.
func free(dir string, files []File, force bool) error {
	if info, err := os.Stat(dir); err == nil && !info.IsDir() {
		return fmt.Errorf("%s: %w, and is no directory", dir, fs.ErrExist)
	}
	for _, f := range files {
		path := filepath.Join(dir, f.Name)
		info, err := os.Lstat(path)
		switch {
		case errors.Is(err, fs.ErrNotExist):
		case err != nil:
			return err
		case info.IsDir():
			return fmt.Errorf("%s: %w, and is a directory", path, fs.ErrExist)
		case !force:
			return fmt.Errorf("%s: %w; --force overwrites it", path, fs.ErrExist)
		}
	}
	return nil
}

// makeDir makes a directory and those above it, and returns those that it made,
// the innermost first.
func makeDir(dir string) (made []string, err error) {
	for d := filepath.Clean(dir); ; d = filepath.Dir(d) {
		if _, err := os.Stat(d); err == nil || d == filepath.Dir(d) {
			break
		}
		made = append(made, d)
	}
	if err := os.MkdirAll(dir, 0o755); err != nil {
		unmake(made)
		return nil, err
	}
	return made, nil
}

// unmake takes away directories that were made, as far as they were and nothing is
// in them.
func unmake(dirs []string) {
	for _, d := range dirs {
		os.Remove(d) //nolint:errcheck // what is not there, or not empty, is left alone
	}
}

func writeFile(path string, data []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	if err == nil {
		err = f.Sync()
	}
	return errors.Join(err, f.Close())
}

// naming lets an error speak of the file that was meant.
func naming(err error, path string) error {
	var at *fs.PathError
	if errors.As(err, &at) {
		return &fs.PathError{Op: at.Op, Path: path, Err: at.Err}
	}
	return fmt.Errorf("%s: %w", path, err)
}
