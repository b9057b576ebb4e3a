package study

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"antelag/scenarios"
)

// A table that was broken off at any byte is gone on with to the same bytes as
// one that never was.
func TestResumeAtEveryByte(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 6})
	whole := read(t, tabled(t, in(t, "whole.csv"), st, Shard{}))
	if rows := strings.Count(whole, "\n"); rows != 7 {
		t.Fatalf("%d lines", rows)
	}
	path := in(t, "x.csv")
	tabled(t, path, st, Shard{})
	rows := all(t, st, 1)
	for cut := range len(whole) {
		write(t, path, whole[:cut])
		seen := int64(0)
		table, err := OpenTable(path, st, Shard{}, "test", false, func(r Row) {
			if r.Run != seen {
				t.Fatalf("cut at %d: run %d where %d was due", cut, r.Run, seen)
			}
			seen++
		})
		if err != nil {
			t.Fatalf("cut at %d: %v", cut, err)
		}
		first, last := table.Left()
		if first != seen || last != 6 {
			t.Fatalf("cut at %d: %d to %d are left after %d", cut, first, last, seen)
		}
		if err := table.Append(rows[first:]); err != nil {
			t.Fatal(err)
		}
		if err := table.Close(); err != nil {
			t.Fatal(err)
		}
		if read(t, path) != whole {
			t.Fatalf("cut at %d: gone on with to\n%s\nnever cut\n%s", cut, read(t, path), whole)
		}
	}
}

// Rows that are there give the same summary as rows that are made.
func TestSummaryOfATableIsThatOfItsRuns(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 30, Over: []string{"spring.actuator.gain=0.9:1.5:4"}})
	path := tabled(t, in(t, "x.csv"), st, Shard{})
	again := NewSummary(st)
	table, err := OpenTable(path, st, Shard{}, "test", false, again.Add)
	if err != nil {
		t.Fatal(err)
	}
	table.Close() //nolint:errcheck // nothing was written
	if a, b := wordy(t, again), wordy(t, summed(st, all(t, st, 2))); a != b {
		t.Errorf("from the table\n%s\nfrom the runs\n%s", a, b)
	}
}

// What is of another study, or damaged, is refused and left alone, and begun anew
// only by force.
func TestFilesInTheWay(t *testing.T) {
	request := Request{Draws: 4, Seed: 1}
	good := studyOf(t, scene(t, short), request)
	other := func(change func(*Request), sets ...scenarios.Change) *Study {
		r := request
		change(&r)
		return studyOf(t, scene(t, short, sets...), r)
	}
	spoil := func(old, new string) func(t *testing.T, path string) {
		return func(t *testing.T, path string) {
			text := read(t, path)
			if !strings.Contains(text, old) {
				t.Fatalf("no %q in\n%s", old, text)
			}
			write(t, path, strings.Replace(text, old, new, 1))
		}
	}
	for _, c := range []struct {
		name  string
		st    *Study
		spoil func(t *testing.T, path string)
		want  string
	}{
		{"other seed", other(func(r *Request) { r.Seed = 2 }), nil, "is of another study: there seed = 1, here seed = 2"},
		{"other number of draws", other(func(r *Request) { r.Draws = 5 }), nil, "there draws = 4, here draws = 5"},
		{"other law", other(func(r *Request) { r.Law = Normal }), nil, "there law = 'uniform', here law = 'normal'"},
		{"other lane", other(func(r *Request) { r.Lane = "bare" }), nil, "there lane = 'configured', here lane = 'bare'"},
		{"other scenario", other(func(*Request) {}, scenarios.Change{Path: "loop.seed", Value: "9"}), nil, "there seed = 1 in [loop], here seed = 9 in [loop]"},
		{"no provenance", good, func(t *testing.T, path string) {
			if err := os.Remove(path + ".toml"); err != nil {
				t.Fatal(err)
			}
		}, "exists, and there is no"},
		{"other header", good, spoil("nrmse", "nrsme"), "x.csv:1: is not the header that belongs here"},
		{"other number", good, spoil("\n2,", "\n2,1"), "x.csv:4: is not run 2 of this study"},
		{"cell that is no number", good, spoil(",completed,,,1,", ",completed,,,one,"), `x.csv:2: "one" is no number`},
		{"cell too few", good, spoil(",completed,,,1,", ",completed,,1,"), "x.csv:2: has "},
		{"neither true nor false", good, spoil(",true,", ",yes,"), `"yes" is neither true nor false`},
		{"row too many", good, func(t *testing.T, path string) { write(t, path, read(t, path)+"4,\n") }, "x.csv:6: comes after the last run"},
		{"binary", good, func(t *testing.T, path string) { write(t, path, "\x00\xff\n") }, "x.csv:1: is not the header that belongs here"},
	} {
		t.Run(c.name, func(t *testing.T) {
			path := tabled(t, in(t, "x.csv"), good, Shard{})
			if c.spoil != nil {
				c.spoil(t, path)
			}
			before := read(t, path)
			_, err := OpenTable(path, c.st, Shard{}, "test", false, func(Row) {})
			says(t, err, c.want)
			if !errors.Is(err, ErrMismatch) {
				t.Errorf("not a mismatch: %v", err)
			}
			if read(t, path) != before {
				t.Error("the file was changed")
			}
			table, err := OpenTable(path, c.st, Shard{}, "test", true, func(r Row) { t.Errorf("row %d was handed over", r.Run) })
			if err != nil {
				t.Fatal(err)
			}
			if first, last := table.Left(); first != 0 || last != c.st.Runs() {
				t.Errorf("by force %d to %d are left", first, last)
			}
			if err := table.Close(); err != nil {
				t.Fatal(err)
			}
			if got := read(t, path); got != c.st.Header()+"\n" {
				t.Errorf("by force\n%s", got)
			}
		})
	}
}

func TestTwoCannotWriteOneTable(t *testing.T) {
	st := studyOf(t, scene(t, short), Request{Draws: 4})
	path := in(t, "x.csv")
	first, err := OpenTable(path, st, Shard{}, "test", false, func(Row) {})
	if err != nil {
		t.Fatal(err)
	}
	defer first.Close() //nolint:errcheck // nothing was written
	for _, force := range []bool{false, true} {
		_, err = OpenTable(path, st, Shard{}, "test", force, func(Row) {})
		says(t, err, "is being written by another run")
	}
}

// The provenance of a table reads as the same study, and as a scenario.
func TestProvenanceReadsBack(t *testing.T) {
	for _, r := range []Request{
		{Draws: 5, Law: Normal, Sampling: Independent, Seed: 1<<63 - 1, Lane: "bare", Sets: []string{"title=it's \"so\""}},
		{Over: []string{"spring.actuator.gain=0.9:1.1:3:log", "spring.compensator.order=1:2:2"}},
	} {
		st := studyOf(t, scene(t, short), r)
		for _, shard := range []Shard{{}, {2, 7}} {
			text, err := st.Provenance("v1 test", shard)
			if err != nil {
				t.Fatal(err)
			}
			back, part, version, err := Recorded("x.csv.toml", []byte(text), ".")
			if err != nil {
				t.Fatal(err)
			}
			again, err := back.Provenance(version, part)
			if err != nil || again != text || part != shard {
				t.Errorf("%v reads back as\n%s\nwas\n%s", err, again, text)
			}
			if back.Command(1) != st.Command(1) {
				t.Errorf("command %s was %s", back.Command(1), st.Command(1))
			}
		}
	}
}

// Another record in the same file is another study.
func TestProvenanceKnowsTheMotion(t *testing.T) {
	dir := t.TempDir()
	write(t, filepath.Join(dir, "m.txt"), "0\n1\n0\n-1\n")
	text := strings.Replace(short, "kind = \"sine\"\ndrives = \"ground\"\namplitude = \"0.1 g\"\nfrequency = \"1.5 Hz\"",
		"kind = \"record\"\ndrives = \"ground\"\nfile = \"m.txt\"\nstep = \"0.1 s\"\nunit = \"m/s^2\"", 1)
	s, err := scenarios.Parse("test.toml", []byte(text), dir)
	if err != nil {
		t.Fatal(err)
	}
	st := studyOf(t, s, Request{Draws: 3})
	path := tabled(t, filepath.Join(dir, "x.csv"), st, Shard{})
	write(t, filepath.Join(dir, "m.txt"), "0\n1\n0\n-2\n")
	_, err = OpenTable(path, st, Shard{}, "test", false, func(Row) {})
	says(t, err, "there motion_sha256 = ")
}

func FuzzTable(f *testing.F) {
	st := studyOf(f, scene(f, short), Request{Draws: 3})
	whole := read(f, tabled(f, filepath.Join(f.TempDir(), "x.csv"), st, Shard{}))
	f.Add(whole)
	f.Add(whole[:len(whole)-5])
	f.Add(strings.Replace(whole, "true", "false", 1))
	f.Fuzz(func(t *testing.T, text string) {
		rows := 0
		table := newRows(st, Shard{}, func(r Row) {
			if rows++; r.Run != int64(rows-1) || len(r.Figures) != len(st.Columns()) {
				t.Fatalf("row %v", r)
			}
		})
		whole, err := table.read("x.csv", strings.NewReader(text))
		if err == nil && (whole > int64(len(text)) || whole > 0 && text[whole-1] != '\n' || int(table.next) != rows) {
			t.Errorf("%d bytes are whole, %d rows", whole, rows)
		}
	})
}

func FuzzRecorded(f *testing.F) {
	for _, r := range []Request{{Draws: 3}, {Over: []string{"spring.actuator.gain=0.9:1.1:3"}}} {
		text, err := studyOf(f, scene(f, short), r).Provenance("v", Shard{1, 2})
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		if st, _, _, err := Recorded("x", []byte(text), "."); err == nil && st.Runs() < 1 {
			t.Errorf("%d runs", st.Runs())
		}
	})
}
