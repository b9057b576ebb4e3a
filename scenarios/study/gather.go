package study

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"antelag/scenarios/outfile"
)

// Gather puts the tables of all shards of a study, which lie beside path, into
// one table there, as if it had never been shared out. All must be there, whole
// and of one study. It hands every row to have, in order. An existing table is
// refused unless force is set.
func Gather(path string, force bool, open func(*Study), have func(Row)) (st *Study, version string, err error) {
	if !force {
		for _, p := range []string{path, path + ".toml"} {
			if _, err := os.Lstat(p); err == nil {
				return nil, "", &mismatch{fmt.Errorf("%s: %w; --force overwrites it", p, fs.ErrExist)}
			}
		}
	}
	n, err := parts(path)
	if err != nil {
		return nil, "", err
	}
	provenance, err := agree(path, n)
	if err != nil {
		return nil, "", err
	}
	if st, _, version, err = Recorded(path+".toml", []byte(provenance), filepath.Dir(path)); err != nil {
		return nil, "", err
	}
	open(st)
	err = outfile.Stream(path, true, func(w io.Writer) error {
		if _, err := io.WriteString(w, st.Header()+"\n"); err != nil {
			return err
		}
		return st.copyParts(path, n, w, have)
	})
	if err == nil {
		err = outfile.Write(path+".toml", []byte(provenance), true)
	}
	return st, version, err
}

// agree returns what the provenances of all shards say in common, which is that
// of the whole.
func agree(path string, n int) (string, error) {
	common := ""
	var absent []string
	for i := range n {
		s := Shard{i + 1, n}
		name := s.Path(path) + ".toml"
		text, err := os.ReadFile(name)
		if errors.Is(err, fs.ErrNotExist) {
			absent = append(absent, s.String())
			continue
		}
		if err != nil {
			return "", err
		}
		whole, ok := strings.CutSuffix(string(text), "shard = "+tomlText(s.String())+"\n")
		if n > 1 && !ok {
			return "", fmt.Errorf("%s: is not of shard %s", name, s)
		}
		if common == "" {
			common = whole
		}
		if whole != common {
			return "", fmt.Errorf("%s: %w", name, difference(whole, common))
		}
	}
	if len(absent) > 0 {
		return "", missingShards(path, absent)
	}
	return common, nil
}

func missingShards(path string, absent []string) error {
	what, verb := "shard ", " is missing"
	if len(absent) > 1 {
		what, verb = "shards ", " are missing"
	}
	return fmt.Errorf("%s: %s%s%s or not whole; run them to their end first", path, what, strings.Join(absent, ", "), verb)
}

// copyParts appends the rows of every shard in turn.
func (st *Study) copyParts(path string, n int, w io.Writer, have func(Row)) error {
	var absent []string
	var line []byte
	for i := range n {
		s := Shard{i + 1, n}
		f, err := os.Open(s.Path(path))
		if errors.Is(err, fs.ErrNotExist) {
			absent = append(absent, s.String())
			continue
		}
		if err != nil {
			return err
		}
		var failed error
		part := newRows(st, s, func(r Row) {
			line = st.appendRow(line[:0], &r)
			if _, e := w.Write(line); e != nil && failed == nil {
				failed = e
			}
			have(r)
		})
		_, err = part.read(s.Path(path), f)
		f.Close()
		if err := errors.Join(err, failed); err != nil {
			return firstOf(failed, err)
		}
		if part.next < part.last {
			absent = append(absent, s.String())
		}
	}
	if len(absent) > 0 {
		return missingShards(path, absent)
	}
	return nil
}

// parts are the tables of a study's shards that lie beside path, and how many
// shards there are; all must agree on that.
func parts(path string) (n int, err error) {
	ext := filepath.Ext(path)
	found, err := filepath.Glob(escape(strings.TrimSuffix(path, ext)) + ".*-of-*" + escape(ext))
	if err != nil {
		return 0, err
	}
	base := strings.TrimSuffix(path, ext)
	for _, name := range found {
		var s Shard
		middle := strings.TrimSuffix(strings.TrimPrefix(name, base+"."), ext)
		if _, err := fmt.Sscanf(middle, "%d-of-%d", &s.I, &s.N); err != nil || s.Path(path) != name {
			continue
		}
		if n != 0 && s.N != n {
			return 0, fmt.Errorf("%s: there are shards of %d and of %d beside it; take away those that do not belong", path, n, s.N)
		}
		n = s.N
	}
	if n == 0 {
		return 0, fmt.Errorf("%s: there are no shards of it, like %s", path, Shard{1, 7}.Path(path))
	}
	return n, nil
}

var globs = strings.NewReplacer("*", `\*`, "?", `\?`, "[", `\[`, `\`, `\\`)

func escape(s string) string { return globs.Replace(s) }
