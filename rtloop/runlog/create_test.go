package runlog

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/rtloop/excitation"
)

// A log that cannot be made leaves nothing of itself behind, neither the log
// nor its provenance, and what was there stays.
func TestCreateErrors(t *testing.T) {
	old := map[string]string{"x.csv": "old log\n", "x.csv.toml": "old = true\n"}
	for _, c := range []struct {
		name   string
		there  []string // files of old, directories with a slash, links to a full device with an @
		path   string
		force  bool
		exists bool // the error is fs.ErrExist
		want   string
	}{
		{"log exists", []string{"x.csv"}, "x.csv", false, true, "x.csv: file already exists; --force overwrites it"},
		{"provenance exists", []string{"x.csv.toml"}, "x.csv", false, true, "x.csv.toml: file already exists; --force overwrites it"},
		{"both exist", []string{"x.csv", "x.csv.toml"}, "x.csv", false, true, "x.csv: file already exists; --force overwrites it"},
		{"log is a directory", []string{"x.csv/"}, "x.csv", true, false, "x.csv: is a directory"},
		{"provenance is a directory", []string{"x.csv.toml/"}, "x.csv", true, false, "x.csv.toml: is a directory"},
		{"provenance is a directory, log exists", []string{"x.csv", "x.csv.toml/"}, "x.csv", true, false, "x.csv.toml: is a directory"},
		{"no such directory", nil, "nowhere/x.csv", false, false, "nowhere/x.csv: no such file or directory"},
		{"no such directory, forced", nil, "nowhere/x.csv", true, false, "nowhere/x.csv: no such file or directory"},
		{"name too long", nil, strings.Repeat("x", 252), false, false, "file name too long"},
		{"no room for the provenance", []string{"x.csv.toml@"}, "x.csv", true, false, "x.csv.toml: no space left on device"},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := t.TempDir()
			for _, name := range c.there {
				path := filepath.Join(dir, strings.TrimRight(name, "/@"))
				var err error
				switch {
				case strings.HasSuffix(name, "/"):
					err = os.Mkdir(path, 0o755)
				case strings.HasSuffix(name, "@"):
					err = os.Symlink("/dev/full", path)
				default:
					err = os.WriteFile(path, []byte(old[name]), 0o644)
				}
				if err != nil {
					t.Fatal(err)
				}
			}
			w, err := Create(filepath.Join(dir, c.path), []string{"a"}, excitation.Ground, "new = true\n", c.force)
			if err == nil {
				w.Close()
				t.Fatal("no error")
			}
			if !strings.HasSuffix(err.Error(), c.want) || errors.Is(err, fs.ErrExist) != c.exists {
				t.Errorf("got %v, want %s", err, c.want)
			}
			entries, err := os.ReadDir(dir)
			if err != nil || len(entries) != len(c.there) {
				t.Errorf("left behind: %v, %v", entries, err)
			}
			for _, name := range c.there {
				if want, ok := old[name]; ok {
					if text, err := os.ReadFile(filepath.Join(dir, name)); err != nil || string(text) != want {
						t.Errorf("%s became %q, %v", name, text, err)
					}
				}
			}
		})
	}
}

// Under force the new files hold nothing of longer old ones.
func TestForceReplaces(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.csv")
	for _, p := range []string{path, path + ".toml"} {
		if err := os.WriteFile(p, []byte(strings.Repeat("old\n", 1000)), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	w, err := Create(path, []string{"a"}, excitation.Target, "new = true\n", true)
	if err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	for p, want := range map[string]string{
		path:           "time_s,a.target_m,a.command_m,a.measured_m,a.force_N,energy_margin\n",
		path + ".toml": "new = true\n",
	} {
		if text, err := os.ReadFile(p); err != nil || string(text) != want {
			t.Errorf("%s holds %q, %v", p, text, err)
		}
	}
}

// A log may go to a device or a pipe, where there is nothing to cut off.
func TestCreateOnDevice(t *testing.T) {
	path := filepath.Join(t.TempDir(), "x.csv")
	if err := os.Symlink(os.DevNull, path); err != nil {
		t.Fatal(err)
	}
	w, err := Create(path, nil, excitation.Target, "", true)
	if err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Error(err)
	}
}
