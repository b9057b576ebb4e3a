package handoff

import (
	"context"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

var some = []File{{"a.c", []byte("new a\n")}, {"b.h", []byte("new b\n")}}

// tree lists everything under a directory with what is in it.
func tree(t *testing.T, dir string) []string {
	t.Helper()
	out := []string{}
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || path == dir {
			return err
		}
		name, _ := filepath.Rel(dir, path)
		switch {
		case d.IsDir():
			name += "/"
		case d.Type().IsRegular():
			text, err := os.ReadFile(path)
			if err != nil {
				return err
			}
			name += "=" + strings.TrimSpace(string(text))
		}
		out = append(out, name)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func TestWrite(t *testing.T) {
	for _, c := range []struct {
		name  string
		there []string // files, directories with a slash, links name>target
		dir   string
		force bool
		err   string
		exist bool // the error is fs.ErrExist
		want  []string
	}{
		{"new directory", nil, "out", false, "", false, []string{"out/", "out/a.c=new a", "out/b.h=new b"}},
		{"deep, with spaces", nil, "one two/three", false, "", false, []string{"one two/", "one two/three/", "one two/three/a.c=new a", "one two/three/b.h=new b"}},
		{"existing directory", []string{"out/", "out/mine.c=mine"}, "out", false, "", false, []string{"out/", "out/a.c=new a", "out/b.h=new b", "out/mine.c=mine"}},
		{"existing file", []string{"out/", "out/b.h=old"}, "out", false, "out/b.h: file already exists; --force overwrites it", true, []string{"out/", "out/b.h=old"}},
		{"existing file, forced", []string{"out/", "out/b.h=old and long"}, "out", true, "", false, []string{"out/", "out/a.c=new a", "out/b.h=new b"}},
		{"a link, forced, is replaced and not followed", []string{"precious=x", "out/", "out/b.h>../precious"}, "out", true, "", false,
			[]string{"out/", "out/a.c=new a", "out/b.h=new b", "precious=x"}},
		{"a dangling link", []string{"out/", "out/b.h>nowhere"}, "out", false, "out/b.h: file already exists; --force overwrites it", true, []string{"out/", "out/b.h"}},
		{"a directory in the place of a file", []string{"out/", "out/b.h/"}, "out", true, "out/b.h: file already exists, and is a directory", true, []string{"out/", "out/b.h/"}},
		{"the directory is a file", []string{"out=x"}, "out", true, "out: file already exists, and is no directory", true, []string{"out=x"}},
		{"below a file", []string{"out=x"}, "out/in", false, "out/in/a.c: not a directory", false, []string{"out=x"}},
		{"a name too long", nil, "deep/" + strings.Repeat("x", 300), false, "file name too long", false, []string{}},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := t.TempDir()
			for _, name := range c.there {
				var err error
				if path, target, ok := strings.Cut(name, ">"); ok {
					err = os.Symlink(target, filepath.Join(dir, path))
				} else if path, text, ok := strings.Cut(name, "="); ok {
					err = os.WriteFile(filepath.Join(dir, path), []byte(text), 0o644)
				} else {
					err = os.Mkdir(filepath.Join(dir, name), 0o755)
				}
				if err != nil {
					t.Fatal(err)
				}
			}
			err := Write(t.Context(), filepath.Join(dir, c.dir), some, c.force)
			switch {
			case c.err == "" && err != nil:
				t.Error(err)
			case c.err != "" && (err == nil || !strings.HasSuffix(err.Error(), c.err) || errors.Is(err, fs.ErrExist) != c.exist):
				t.Errorf("got %v, want %s", err, c.err)
			}
			if got := tree(t, dir); !slices.Equal(got, c.want) {
				t.Errorf("there is %q, want %q", got, c.want)
			}
		})
	}
}

// What is interrupted leaves everything as it was.
func TestWriteInterrupted(t *testing.T) {
	dir := t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "a.c"), []byte("old"), 0o644); err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(t.Context())
	stop()
	for _, to := range []string{dir, filepath.Join(dir, "new", "deep")} {
		if err := Write(ctx, to, some, true); !errors.Is(err, context.Canceled) {
			t.Errorf("got %v", err)
		}
	}
	if got := tree(t, dir); !slices.Equal(got, []string{"a.c=old"}) {
		t.Errorf("there is %q", got)
	}
}
