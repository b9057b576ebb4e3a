package study

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Shards are all runs, each once, in order, of sizes that differ by one at most.
func TestShardsArePartsOfTheWhole(t *testing.T) {
	for _, runs := range []int64{1, 6, 7, 100, 1e9 - 1} {
		for _, n := range []int{1, 2, 7, 64} {
			next := int64(0)
			for i := range n {
				first, last := Shard{i + 1, n}.Part(runs)
				if size := last - first; first != next || size < runs/int64(n) || size > runs/int64(n)+1 {
					t.Errorf("%d runs: shard %d/%d is %d to %d", runs, i+1, n, first, last)
				}
				next = last
			}
			if next != runs {
				t.Errorf("%d runs in %d shards end at %d", runs, n, next)
			}
		}
	}
}

func TestParseShard(t *testing.T) {
	env := func(pairs ...string) map[string]string {
		m := map[string]string{}
		for i := 0; i < len(pairs); i += 2 {
			m["SLURM_ARRAY_TASK_"+pairs[i]] = pairs[i+1]
		}
		return m
	}
	for _, c := range []struct {
		text string
		env  map[string]string
		want Shard
		err  string
	}{
		{"", nil, Shard{}, ""},
		{"1/1", nil, Shard{1, 1}, ""},
		{"3/7", nil, Shard{3, 7}, ""},
		{"0/7", nil, Shard{}, "a shard is given as i/n"},
		{"8/7", nil, Shard{}, "a shard is given as i/n"},
		{"-1/7", nil, Shard{}, "a shard is given as i/n"},
		{"3", nil, Shard{}, "a shard is given as i/n"},
		{"3/7/2", nil, Shard{}, "a shard is given as i/n"},
		{"a/b", nil, Shard{}, "a shard is given as i/n"},
		{"slurm", nil, Shard{}, "SLURM_ARRAY_TASK_ID is not set; this is no task of a job array"},
		{"slurm", env("ID", "3", "COUNT", "7", "MIN", "1"), Shard{3, 7}, ""},
		{"slurm", env("ID", "0", "COUNT", "7", "MIN", "0", "MAX", "6", "STEP", "1"), Shard{1, 7}, ""},
		{"slurm", env("ID", "15", "COUNT", "4", "MIN", "10", "MAX", "25", "STEP", "5"), Shard{2, 4}, ""},
		{"slurm", env("ID", "7", "COUNT", "3", "MIN", "1", "MAX", "7", "STEP", "1"), Shard{}, "number the tasks without gaps"},
		{"slurm", env("ID", "9", "COUNT", "7", "MIN", "1", "MAX", "7", "STEP", "1"), Shard{}, "number the tasks without gaps"},
		{"slurm", env("ID", "x", "COUNT", "7", "MIN", "1"), Shard{}, `is "x", which is no whole number`},
	} {
		got, err := ParseShard(c.text, func(name string) (string, bool) { v, ok := c.env[name]; return v, ok })
		says(t, err, c.err)
		if got != c.want {
			t.Errorf("%q: %v", c.text, got)
		}
	}
}

// Seven shards, each made by itself, put together are one table, byte for byte,
// with its provenance.
func TestGather(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 23, Over: []string{"spring.actuator.gain=0.9:1.1:2"}})
	dir := t.TempDir()
	whole := tabled(t, filepath.Join(dir, "whole.csv"), st, Shard{})
	path := filepath.Join(dir, "x[1].csv")
	for i := range 7 {
		tabled(t, path, st, Shard{i + 1, 7})
	}
	var sum *Summary
	_, version, err := Gather(path, false, func(st *Study) { sum = NewSummary(st) }, func(r Row) { sum.Add(r) })
	if err != nil || version != "test" {
		t.Fatal(version, err)
	}
	for _, end := range []string{"", ".toml"} {
		if a, b := read(t, path+end), read(t, whole+end); a != b {
			t.Errorf("gathered%s\n%s\nwhole\n%s", end, a, b)
		}
	}
	if a, b := wordy(t, sum), wordy(t, summed(st, all(t, st, 2))); a != b {
		t.Errorf("gathered\n%s\nwhole\n%s", a, b)
	}
	_, _, err = Gather(path, false, func(*Study) {}, func(Row) {})
	says(t, err, "x[1].csv: file already exists; --force overwrites it")
	if _, _, err = Gather(path, true, func(*Study) {}, func(Row) {}); err != nil {
		t.Error(err)
	}
}

func TestGatherRefuses(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 9})
	other := studyOf(t, scene(t, short), Request{Draws: 9, Seed: 5})
	for _, c := range []struct {
		name  string
		spoil func(t *testing.T, path string)
		want  string
	}{
		{"no shards", func(t *testing.T, path string) {
			for i := range 3 {
				os.Remove(Shard{i + 1, 3}.Path(path))
			}
		}, "there are no shards of it, like "},
		{"shards missing", func(t *testing.T, path string) {
			for _, i := range []int{1, 3} {
				os.Remove(Shard{i, 3}.Path(path))
				os.Remove(Shard{i, 3}.Path(path) + ".toml")
			}
		}, "x.csv: shards 1/3, 3/3 are missing or not whole"},
		{"a table missing", func(t *testing.T, path string) { os.Remove(Shard{2, 3}.Path(path)) }, "x.csv: shard 2/3 is missing or not whole"},
		{"a row missing", func(t *testing.T, path string) {
			p := Shard{2, 3}.Path(path)
			text := read(t, p)
			write(t, p, text[:strings.LastIndexByte(text[:len(text)-1], '\n')+1])
		}, "x.csv: shard 2/3 is missing or not whole"},
		{"a row cut", func(t *testing.T, path string) {
			p := Shard{3, 3}.Path(path)
			text := read(t, p)
			write(t, p, text[:len(text)-4])
		}, "x.csv: shard 3/3 is missing or not whole"},
		{"two of one", func(t *testing.T, path string) {
			write(t, Shard{2, 3}.Path(path), read(t, Shard{1, 3}.Path(path)))
		}, "x.2-of-3.csv:2: is not run 3 of this study"},
		{"another study", func(t *testing.T, path string) {
			for _, end := range []string{"", ".toml"} {
				os.Remove(Shard{2, 3}.Path(path) + end)
			}
			tabled(t, path, other, Shard{2, 3})
		}, "x.2-of-3.csv.toml: is of another study: there seed = 5, here seed = 0"},
		{"of 3 and of 4", func(t *testing.T, path string) { tabled(t, path, st, Shard{2, 4}) }, "there are shards of 3 and of 4 beside it"},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := filepath.Join(t.TempDir(), "x.csv")
			for i := range 3 {
				tabled(t, path, st, Shard{i + 1, 3})
			}
			c.spoil(t, path)
			_, _, err := Gather(path, false, func(*Study) {}, func(Row) {})
			says(t, err, c.want)
			if _, err := os.Stat(path); err == nil {
				t.Error("a table was made")
			}
			left, err := filepath.Glob(filepath.Join(filepath.Dir(path), ".*"))
			if err != nil || len(left) > 0 {
				t.Errorf("left behind: %v %v", left, err)
			}
		})
	}
}
