package excitation

import (
	"bytes"
	"errors"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"testing/iotest"
)

// motion is the made-up record that testdata holds in every form.
var motion = []float64{0, 0.0063, -0.0021, 0.0177, 0.0412, -0.0338, -0.1015, 0.0754, 0.1623, -0.2107,
	0.0889, 0.3188, -0.2745, -0.1411, 0.2052, 0.0967, -0.1834, 0.0526, 0.0733, -0.0619, 0.0148, 0.0291, -0.0105}

func TestEveryFormOfAFileGivesTheSameRecord(t *testing.T) {
	for _, tt := range []struct {
		file string
		step float64
		unit string
	}{
		{"new.at2", 0, "g"},
		{"new.at2", 0.02, "g"},
		{"old.at2", 0, "g"},
		{"tight.at2", 0, "g"},
		{"blanks.txt", 0, ""},
		{"tabs.txt", 0, ""},
		{"commas.csv", 0, ""},
		{"semicolons.csv", 0, ""},
		{"cr.txt", 0, ""},
		{"columns8.txt", 0.02, ""},
		{"column1.txt", 0.02, ""},
	} {
		f, err := os.Open(filepath.Join("testdata", tt.file))
		if err != nil {
			t.Fatal(err)
		}
		r, err := ReadRecord(f, tt.file, tt.step)
		f.Close()
		if err != nil {
			t.Error(err)
			continue
		}
		if !slices.Equal(r.Values, motion) {
			t.Errorf("%s: values %v", tt.file, r.Values)
		}
		if r.Unit != tt.unit {
			t.Errorf("%s: unit %q, want %q", tt.file, r.Unit, tt.unit)
		}
		if r.First() != 0 || math.Abs(r.Last()-0.44) > 1e-15 {
			t.Errorf("%s: from %v to %v s, want 0 to 0.44", tt.file, r.First(), r.Last())
		}
		if r.Times != nil {
			for k, at := range r.Times {
				if math.Abs(at-float64(k)*0.02) > 1e-15 || r.Step != 0 {
					t.Errorf("%s: time %d is %v, step %v", tt.file, k, at, r.Step)
				}
			}
		} else if r.Step != 0.02 {
			t.Errorf("%s: step %v, want 0.02", tt.file, r.Step)
		}
	}
}

func TestSpellingsThatFilesHave(t *testing.T) {
	for label, tt := range map[string]struct {
		text string
		step float64
		want Record
	}{
		"AT2 with colons":              {"NPTS: 2, DT: 0.01\n1 2", 0, Record{Step: 0.01, Values: []float64{1, 2}, Unit: "g"}},
		"AT2 with blanks before =":     {"NPTS  =  2 , DT =.005 sec\n1\n2", 0, Record{Step: 0.005, Values: []float64{1, 2}, Unit: "g"}},
		"AT2 with SEC glued":           {"NPTS=2, DT=5e-3SEC\n1 2", 0, Record{Step: 0.005, Values: []float64{1, 2}, Unit: "g"}},
		"AT2 with Fortran's point":     {"NPTS=2, DT=1. SEC\n1. -.5", 0, Record{Step: 1, Values: []float64{1, -0.5}, Unit: "g"}},
		"AT2 with a blank title":       {"\n\nTITLE\n NPTS=2 DT=1\n\n1\n\n2\n", 0, Record{Step: 1, Values: []float64{1, 2}, Unit: "g"}},
		"AT2 of a displacement":        {"DISPLACEMENT TIME SERIES IN UNITS OF CM\nNPTS=2, DT=1\n1 2", 0, Record{Step: 1, Values: []float64{1, 2}, Unit: "cm"}},
		"AT2 of a velocity":            {"VELOCITY TIME SERIES IN UNITS OF CM/SEC\nNPTS=2, DT=1\n1 2", 0, Record{Step: 1, Values: []float64{1, 2}, Unit: "cm/s"}},
		"AT2 in cm/s/s":                {"ACCELERATION IN UNITS OF CM/S/S\nNPTS=2, DT=1\n1 2", 0, Record{Step: 1, Values: []float64{1, 2}, Unit: "cm/s^2"}},
		"title and heading":            {"El Centro 1940 NS\nt a\n0 1\n1 2\n", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"heading without first name":   {",acc\n0,1\n1,2\n", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"comments between rows":        {"0 1\n# x\n% x\n! x\n// x\n\n1 2", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"NPTS in a comment only":       {"# NPTS=9, DT=1\n0 1\n1 2", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"quoted numbers":               {"\"0\",\"1\"\n\"1\",\"2\"", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"blanks and commas":            {" 0 ,  1 \n 1 , 2 ", 0, Record{Times: []float64{0, 1}, Values: []float64{1, 2}}},
		"times before zero":            {"-0.5 1\n+1e-1 2D0", 0, Record{Times: []float64{-0.5, 0.1}, Values: []float64{1, 2}}},
		"rows of unequal length":       {"1 2 3\n4 5\n6", 0.1, Record{Step: 0.1, Values: []float64{1, 2, 3, 4, 5, 6}}},
		"pairs that are all values":    {"1 2\n3 4\n5 6\n7 8", 0.1, Record{Step: 0.1, Values: []float64{1, 2, 3, 4, 5, 6, 7, 8}}},
		"too small a number":           {"0 1e-400\n1 2", 0, Record{Times: []float64{0, 1}, Values: []float64{0, 2}}},
		"largest number that is taken": {"0 1e15\n1 -1e15", 0, Record{Times: []float64{0, 1}, Values: []float64{1e15, -1e15}}},
	} {
		r, err := ReadRecord(strings.NewReader(tt.text), "m", tt.step)
		if err != nil {
			t.Errorf("%s: %v", label, err)
		} else if !slices.Equal(r.Times, tt.want.Times) || !slices.Equal(r.Values, tt.want.Values) ||
			r.Step != tt.want.Step || r.Unit != tt.want.Unit {
			t.Errorf("%s: got %+v, want %+v", label, r, tt.want)
		}
	}
}

// malformed are files that cannot be read, with the error for each.
var malformed = []struct {
	text string
	step float64
	want string
}{
	{"", 0, "m.txt: 0 values found; a record needs at least 2"},
	{"# nothing\n", 0.1, "m.txt: 0 values found; a record needs at least 2"},
	{"Time Acc\n", 0, "m.txt: 0 values found; a record needs at least 2"},
	{"0 1\n", 0, "m.txt: 1 values found; a record needs at least 2"},
	{"0.5\n", 0.1, "m.txt: 1 values found; a record needs at least 2"},
	{"0 1\n1 2", -0.1, "step: -0.1 s between values; it must be above zero"},
	{"0 1\n1 2", math.NaN(), "step: NaN s between values; it must be above zero"},
	{"0 1\n1 2", math.Inf(1), "step: +Inf s between values; it must be above zero"},

	{"0.1\n0.2\n", 0, "m.txt:1: 1 column found where time and value must stand; if every number is a value, give step"},
	{"t a\n0 1\n0.1 2 3\n", 0, "m.txt:3: 3 columns found where time and value must stand; if every number is a value, give step"},
	{"1 2 3 4 5 6 7 8", 0, "m.txt:1: 8 columns found where time and value must stand; if every number is a value, give step"},
	{"0 1\n0.1 2\n0.1 3\n", 0, "m.txt:3: time 0.1 s does not come after 0.1 s in the row before"},
	{"0 1\r\n0.2 2\r\n\r\n0.1 3\r\n", 0, "m.txt:4: time 0.1 s does not come after 0.2 s in the row before"},
	{"0 1\n0.1 2\n0.2 3\n", 0.1, "m.txt: the first of its two columns counts up by the step, 0.1 s, so it holds times; leave step out"},

	{"0 1\n0.1 NaN\n", 0, "m.txt:2: column 2: NaN is not a finite number"},
	{"0 1\nnan 2\n", 0, "m.txt:2: column 1: nan is not a finite number"},
	{"nan 2\n", 0, "m.txt:1: column 1: nan is not a finite number"},
	{"0 1\n0.1 -Inf\n", 0, "m.txt:2: column 2: -Inf is not a finite number"},
	{"0 1\n0.1 infinity\n", 0, "m.txt:2: column 2: infinity is not a finite number"},
	{"0 1\n0.1 1e400\n", 0, "m.txt:2: column 2: 1e400 is too large; a record holds values up to 1e+15"},
	{"0 1\n0.1 -2e15\n", 0, "m.txt:2: column 2: -2e15 is too large; a record holds values up to 1e+15"},
	{"0 1\n1e16 2\n", 0, "m.txt:2: column 1: 1e16 is too large; a record holds values up to 1e+15"},
	{"0 1\n0.1 0x10\n", 0, `m.txt:2: column 2: "0x10" is not a number`},
	{"0 1\n0.1 1_000\n", 0, `m.txt:2: column 2: "1_000" is not a number`},
	{"0 1\n0.1 1.2.3\n", 0, `m.txt:2: column 2: "1.2.3" is not a number`},
	{"0;1\n0,1;1.000,5\n", 0, `m.txt:2: column 2: "1.000,5" is not a number`},
	{"O.0 1\n0.1 2\n", 0, `m.txt:1: column 1: "O.0" is not a number`},
	{"0.0 l\n0.1 2\n", 0, `m.txt:1: column 2: "l" is not a number`},
	{"0 1\nEnd of record\n", 0, `m.txt:2: column 1: "End" is not a number`},
	{"0 1\n0.1 \xff\n", 0, `m.txt:2: column 2: "\xff" is not a number`},
	{"0,1\n0.1,\n", 0, "m.txt:2: 1 column found where time and value must stand; if every number is a value, give step"},
	{"0,1\n,2\n", 0, "m.txt:2: column 1: an empty column"},
	{"1,,2\n", 0.1, "m.txt:1: column 2: an empty column"},
	{"0 1\n1 " + strings.Repeat("1", 65), 0, `m.txt:2: column 2: "11111111111111111111"… is not a number`},
	{strings.Repeat("1 ", 500001) + "\n2", 0.1, "m.txt:1: a line of 1000001 bytes; the longest that is read has 1 MB"},

	{"T\nNPTS= 3, DT= .01 SEC\n1 2\n", 0, "m.txt:2: NPTS= 3, but 2 values follow"},
	{"T\nNPTS= 3, DT= .01 SEC\n1 2\n3 4", 0, "m.txt:2: NPTS= 3, but 4 values follow"},
	{"T\n3 .01 NPTS, DT\n1 2\n", 0, "m.txt:2: NPTS= 3, but 2 values follow"},
	{"T\nNPTS= 3, DT= .01 SEC\n", 0, "m.txt:2: NPTS= 3, but 0 values follow"},
	{"NPTS= 1, DT= .01 SEC\n1\n", 0, "m.txt:1: NPTS= 1 is not a whole number of at least 2"},
	{"NPTS= -3, DT= .01 SEC\n1\n", 0, "m.txt:1: NPTS= -3 is not a whole number of at least 2"},
	{"NPTS= many, DT= .01 SEC\n1\n", 0, "m.txt:1: NPTS= many is not a whole number of at least 2"},
	{"NPTS= 99999999999999999999, DT= .01\n1\n", 0, "m.txt:1: NPTS= 99999999999999999999 is not a whole number of at least 2"},
	{"NPTS= 2\n1 2\n", 0, "m.txt:1: NPTS= 2 found, but no DT= in the same line"},
	{"NPTS= 2, DT= 0 SEC\n1 2\n", 0, "m.txt:1: DT= 0 is not a time above zero"},
	{"NPTS= 2, DT= -.1 SEC\n1 2\n", 0, "m.txt:1: DT= -.1 is not a time above zero"},
	{"NPTS= 2, DT= SEC\n1 2\n", 0, "m.txt:1: DT= SEC is not a time above zero"},
	{"NPTS= 2, DT= .01 SEC\n1 2\n", 0.02, "m.txt:1: the file says DT= 0.01 s, but step says 0.02 s; leave step out"},
	{"NPTS= 2, DT= .01 SEC\n1 NaN\n", 0, "m.txt:2: column 2: NaN is not a finite number"},
	{"NPTS= 2, DT= .01 SEC\n1 2\nEND\n", 0, `m.txt:3: column 1: "END" is not a number`},
}

func TestMalformedFilesSayWhereAndWhat(t *testing.T) {
	for _, tt := range malformed {
		_, err := ReadRecord(strings.NewReader(tt.text), "m.txt", tt.step)
		if err == nil || err.Error() != tt.want {
			t.Errorf("%.60q, step %v:\n got %v\nwant %s", tt.text, tt.step, err, tt.want)
		}
	}
}

func TestReadRecordPassesOnWhatTheReaderSays(t *testing.T) {
	broken := errors.New("disk gone")
	_, err := ReadRecord(iotest.ErrReader(broken), "m.txt", 0)
	if !errors.Is(err, broken) || err.Error() != "m.txt: disk gone" {
		t.Errorf("got %v", err)
	}
}

func TestFilesAreReadUpToALimit(t *testing.T) {
	const limit = 64e6
	r := bytes.NewReader(make([]byte, limit+100))
	_, err := ReadRecord(r, "m.txt", 0)
	if want := "m.txt: larger than 64 MB, the largest record file that is read"; err == nil || err.Error() != want {
		t.Errorf("got %v, want %s", err, want)
	}
	if r.Len() != 99 {
		t.Errorf("%d bytes behind the limit were left unread, want 99", r.Len())
	}
	for size, ok := range map[int]bool{999: true, 1000: true, 1001: false} {
		data, err := readAll(bytes.NewReader(make([]byte, size)), "m.txt", 1000)
		if (err == nil) != ok || ok && len(data) != size {
			t.Errorf("%d bytes of 1000 allowed: %d read, error %v", size, len(data), err)
		}
	}
}

func FuzzReadRecord(f *testing.F) {
	files, err := filepath.Glob("testdata/*")
	if err != nil || len(files) == 0 {
		f.Fatal("no seeds", err)
	}
	for _, name := range files {
		if info, err := os.Stat(name); err != nil || info.IsDir() || info.Size() > 1000 {
			continue
		}
		text, err := os.ReadFile(name)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(text, 0.0)
		f.Add(text, 0.02)
	}
	for _, m := range malformed {
		if len(m.text) < 1000 {
			f.Add([]byte(m.text), m.step)
		}
	}
	f.Fuzz(func(t *testing.T, text []byte, step float64) {
		r, err := ReadRecord(bytes.NewReader(text), "f", step)
		if err != nil {
			if msg := err.Error(); !strings.HasPrefix(msg, "f:") && !strings.HasPrefix(msg, "step: ") {
				t.Fatalf("an error that names neither file nor step: %s", msg)
			}
			return
		}
		if len(r.Values) < 2 || (r.Times == nil) == (r.Step == 0) || r.Times != nil && len(r.Times) != len(r.Values) {
			t.Fatalf("an inconsistent record %+v", r)
		}
		for i, v := range r.Values {
			if !(math.Abs(v) <= maxMagnitude) {
				t.Fatalf("value %v", v)
			}
			if r.Times != nil && i > 0 && !(r.Times[i] > r.Times[i-1]) {
				t.Fatalf("times %v", r.Times)
			}
		}
		checkPlayable(t, r)
	})
}

// checkPlayable resamples a record that was read and looks for values beyond
// those of the record, which linear interpolation never makes.
func checkPlayable(t *testing.T, r Record) {
	low, high := slices.Min(r.Values), slices.Max(r.Values)
	slack := 1e-9 * math.Max(math.Abs(low), math.Abs(high))
	clk := clock{step: (r.Last() - r.First()) / 50}
	var s Source
	if r.Times != nil {
		s = newUneven(clk, &r, r.First(), r.Last(), Target)
	} else {
		s = newEven(clk, &r, r.First(), r.Last(), Target)
	}
	for k, x := range filled(s, 60) {
		if !(x >= low-slack && x <= high+slack) {
			t.Fatalf("sample %d is %v, the record has %v to %v", k, x, low, high)
		}
	}
}
