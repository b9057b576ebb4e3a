package outfile

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func content(t *testing.T, path, want string) {
	t.Helper()
	if got, err := os.ReadFile(path); err != nil || string(got) != want {
		t.Errorf("%s holds %q, %v; it should hold %q", path, got, err, want)
	}
}

// A file is there whole, stays what it was without force, and nothing is left
// beside it.
func TestWrite(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	path, link := filepath.Join(dir, "a b.csv"), filepath.Join(dir, "link")
	if err := Write(path, []byte("one"), false); err != nil {
		t.Fatal(err)
	}
	if err := Write(path, []byte("two"), false); !errors.Is(err, fs.ErrExist) || !strings.Contains(err.Error(), "--force overwrites it") {
		t.Errorf("an existing file: %v", err)
	}
	content(t, path, "one")
	if err := os.Chmod(path, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink(path, link); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ at, text string }{{path, "longer than before"}, {link, "3"}} {
		if err := Write(c.at, []byte(c.text), true); err != nil {
			t.Fatal(err)
		}
		content(t, path, c.text)
	}
	if info, err := os.Lstat(link); err != nil || info.Mode()&fs.ModeSymlink == 0 {
		t.Errorf("the link is gone: %v, %v", info, err)
	}
	if info, err := os.Stat(path); err != nil || info.Mode().Perm() != 0o600 {
		t.Errorf("it may be read by others now: %v, %v", info, err)
	}
	if names, err := os.ReadDir(dir); err != nil || len(names) != 2 {
		t.Errorf("left behind: %v, %v", names, err)
	}
}

// What cannot be written is said of the file that was meant.
func TestCannotWrite(t *testing.T) {
	t.Parallel()
	dir := t.TempDir()
	plain := filepath.Join(dir, "plain")
	if err := Write(plain, []byte("precious"), false); err != nil {
		t.Fatal(err)
	}
	for path, want := range map[string]string{
		dir:                                 "is a directory",
		filepath.Join(plain, "x"):           "not a directory",
		filepath.Join(dir, "nowhere", "x"):  "write " + filepath.Join(dir, "nowhere", "x") + ": no such file",
		filepath.Join(dir, long()):          "file name too long",
		filepath.Join(dir, "nowhere") + "/": "is a directory",
	} {
		if err := Write(path, []byte("x"), true); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v does not say %q", path, err, want)
		}
	}
	content(t, plain, "precious")
	if _, err := os.Stat("/dev/full"); err == nil { // not every system has it
		if err := Write("/dev/full", []byte("x"), true); err == nil || err.Error() != "write /dev/full: no space left on device" {
			t.Error(err)
		}
		if info, err := os.Stat("/dev/full"); err != nil || info.Mode().IsRegular() {
			t.Error("the device was taken away")
		}
	}
	if names, err := os.ReadDir(dir); err != nil || len(names) != 1 {
		t.Errorf("left behind: %v, %v", names, err)
	}
}

func long() string { return strings.Repeat("x", 300) }
