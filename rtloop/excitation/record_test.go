package excitation

import (
	"encoding/json"
	"errors"
	"io"
	"io/fs"
	"math"
	"os"
	"testing"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

func TestResamplingEqualsNumPy(t *testing.T) {
	// numpy.interp on the same samples; testdata/vectors.py wrote the vectors.
	var vectors struct {
		Cases []struct {
			File       string
			RecordStep float64 `json:"record_step"`
			Step       float64
			Start, End *float64
			Hold       bool
			Want       []float64
		}
	}
	text, err := os.ReadFile("testdata/interp.json")
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, &vectors); err != nil {
		t.Fatal(err)
	}
	if len(vectors.Cases) < 7 {
		t.Fatalf("only %d cases", len(vectors.Cases))
	}
	for i, v := range vectors.Cases {
		given := kind.Values{"file": kind.Text(v.File), "unit": kind.Text("m/s^2")}
		if v.RecordStep > 0 {
			given["step"] = kind.Num(v.RecordStep)
		}
		if v.Start != nil {
			given["start"] = kind.Num(*v.Start)
		}
		if v.End != nil {
			given["end"] = kind.Num(*v.End)
		}
		drives := Ground
		if v.Hold {
			drives, given["unit"] = Target, kind.Text("m")
		}
		s := build(t, "record", context(v.Step, 10, drives), given)
		for k, got := range filled(s, len(v.Want)) {
			// Rounding of t, 1e-16 s, on the steepest line, 8e5 per s, and
			// else a few units of the last place of the values.
			if math.Abs(got-v.Want[k]) > 1e-9 || math.Abs(got-v.Want[k]) > 1e-14 && v.File != "uneven.txt" {
				t.Errorf("case %d, %s: sample %d is %v, numpy has %v", i, v.File, k, got, v.Want[k])
			}
		}
	}
}

func TestRecordMeetsItsOwnSamples(t *testing.T) {
	for _, file := range []string{"new.at2", "blanks.txt"} {
		s := build(t, "record", context(0.02, 1, Ground), kind.Values{"file": kind.Text(file), "unit": kind.Text("g"), "scale": kind.Num(-2)})
		for k, got := range filled(s, 30) {
			want := 0.0
			if k < len(motion) { // the last sample too: the motion ends behind it
				want = motion[k] * quantity.StandardGravity * -2
			}
			// 0.02·k/0.02 may be off k by one unit in the last place.
			if math.Abs(got-want) > 1e-13 || k >= len(motion) && got != 0 {
				t.Errorf("%s: sample %d is %v, want %v", file, k, got, want)
			}
		}
	}
}

func TestRecordTurnsUnitsIntoThoseDriven(t *testing.T) {
	for _, tt := range []struct {
		drives Drives
		unit   string
		factor float64
	}{
		{Ground, "g", 9.80665}, {Ground, "cm/s^2", 0.01}, {Ground, "gal", 0.01}, {Ground, "m/s²", 1},
		{Force, "kN", 1000}, {Target, "mm", 0.001}, {Target, "in", 0.0254},
	} {
		s := build(t, "record", context(0.02, 1, tt.drives), kind.Values{"file": kind.Text("columns8.txt"),
			"step": kind.Num(0.02), "unit": kind.Text(tt.unit)})
		if got, want := filled(s, 12)[11], 0.3188*tt.factor; math.Abs(got/want-1) > 1e-13 { // as above
			t.Errorf("%s: %v, want %v", tt.unit, got, want)
		}
	}
}

func TestRecordAfterItsEnd(t *testing.T) {
	for _, tt := range []struct {
		drives Drives
		unit   string
		end    float64
		want   float64
	}{
		{Ground, "m/s^2", 0.5, 0},
		{Force, "N", 0.5, 0},
		{Target, "m", 0.5, -0.0105},
		{Target, "m", 0.43, 0.0093}, // half-way from 0.0291 to −0.0105
		{Target, "m", 0.02, 0.0063},
	} {
		for _, file := range []string{"column1.txt", "blanks.txt"} {
			given := kind.Values{"file": kind.Text(file), "unit": kind.Text(tt.unit), "end": kind.Num(tt.end)}
			if file == "column1.txt" {
				given["step"] = kind.Num(0.02)
			}
			x := filled(build(t, "record", context(0.005, 2, tt.drives), given), 400)
			for _, got := range x[90:] {
				if math.Abs(got-tt.want) > 1e-16 {
					t.Errorf("%s, %s to %g s: %v after the end, want %v", file, Words[tt.drives], tt.end, got, tt.want)
					break
				}
			}
		}
	}
}

func TestRecordErrorsNameTheSetting(t *testing.T) {
	text := func(name, text string) func(kind.Values) {
		return func(v kind.Values) { v[name] = kind.Text(text) }
	}
	num := func(name string, x float64) func(kind.Values) {
		return func(v kind.Values) { v[name] = kind.Num(x) }
	}
	without := func(name string) func(kind.Values) { return func(v kind.Values) { delete(v, name) } }
	for _, tt := range []struct {
		change func(kind.Values)
		drives Drives
		want   string
	}{
		{without("file"), Ground, "file: is missing; record needs it: file of the record, relative to the scenario; a name that begins with embedded: ships with the program, a text"},
		{without("unit"), Ground, "unit: blanks.txt does not say the unit of its values; give one, it must be an acceleration (m/s^2)"},
		{text("unit", "kN"), Ground, `unit: "kN" is a force (N); with drives = "ground" it must be an acceleration (m/s^2)`},
		{text("unit", "m/s"), Ground, `unit: "m/s" is a velocity (m/s); with drives = "ground" it must be an acceleration (m/s^2)`},
		{text("unit", "mm"), Force, `unit: "mm" is a length (m); with drives = "force" it must be a force (N)`},
		{text("unit", "g"), Target, ""},
		{without("unit"), Target, "unit: blanks.txt does not say the unit of its values; give one, it must be a length (m) or an acceleration (m/s^2)"},
		{text("unit", "1"), Ground, `unit: a unit is missing at "1"`},
		{num("step", 0.01), Ground, ""},
		{num("step", 0.02), Ground, "blanks.txt: the first of its two columns counts up by the step, 0.02 s, so it holds times; leave step out"},
		{num("step", 0), Ground, "step: 0 s is below 1 µs; allowed is a time (s), 1 µs to 3600 s"},
		{num("start", -0.1), Ground, "start: -0.1 s is outside the record, which runs from 0 s to 0.44 s"},
		{num("start", 0.44), Ground, "start: 0.44 s is outside the record, which runs from 0 s to 0.44 s"},
		{num("start", 7), Ground, "start: 7 s is outside the record, which runs from 0 s to 0.44 s"},
		{num("end", 0), Ground, "end: 0 s is not after the start of the motion at 0 s"},
		{func(v kind.Values) { v["start"], v["end"] = kind.Num(0.2), kind.Num(0.1) }, Ground, "end: 0.1 s is not after the start of the motion at 0.2 s"},
		{text("file", "absent.txt"), Ground, "file: open testdata/absent.txt: no such file or directory"},
		{func(v kind.Values) { v["file"] = kind.Text("new.at2"); delete(v, "unit") }, Target, ""},
		{func(v kind.Values) { v["file"] = kind.Text("new.at2"); delete(v, "unit") }, Ground, ""},
		{text("unit", "G"), Ground, `unit: unknown unit "G"; did you mean "g"?`},
		{text("file", "columns8.txt"), Ground, "columns8.txt:2: 8 columns found where time and value must stand; if every number is a value, give step"},
	} {
		v := kind.Values{"file": kind.Text("blanks.txt"), "unit": kind.Text("g")}
		if tt.drives != Ground {
			v["unit"] = kind.Text(tt.drives.Dim().SI())
		}
		tt.change(v)
		_, err := try("record", context(0.001, 2, tt.drives), v)
		if got := errText(err); got != tt.want {
			t.Errorf("got  %s\nwant %s", got, tt.want)
		}
	}
	c := context(0.001, 2, Ground)
	c.Open = nil
	if _, err := try("record", c, kind.Values{"file": kind.Text("a")}); errText(err) != "file: no files can be opened here" {
		t.Error(err)
	}
	if _, err := try("record", context(0.001, 2, Ground), kind.Values{"file": kind.Text("absent")}); !errors.Is(err, fs.ErrNotExist) {
		t.Errorf("%v does not wrap the cause", err)
	}
}

func errText(err error) string {
	if err == nil {
		return ""
	}
	return err.Error()
}

// closing counts how often it is closed.
type closing struct {
	io.Reader
	closed *int
}

func (c closing) Close() error { *c.closed++; return nil }

func TestRecordClosesItsFile(t *testing.T) {
	closed := 0
	c := context(0.001, 2, Ground)
	c.Open = func(name string) (io.ReadCloser, error) {
		f, err := openText("0 1\n1 2\n")(name)
		return closing{f, &closed}, err
	}
	build(t, "record", c, kind.Values{"file": kind.Text("x"), "unit": kind.Text("g")})
	if closed != 1 {
		t.Errorf("closed %d times", closed)
	}
}
