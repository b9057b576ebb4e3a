package runlog

import (
	"bytes"
	"compress/gzip"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf16"
)

// whole is a log read whole: samples by channel and role, and what was said.
type whole struct {
	reader   *Reader
	channels []Samples
	n        int64
	notes    string
}

func readWhole(path string, o Options) (*whole, error) {
	r, err := Open(path, o)
	if err != nil {
		return nil, err
	}
	defer r.Close()
	w := &whole{reader: r, channels: make([]Samples, len(r.Channels()))}
	for r.Next() {
		b := r.Block()
		if b.First != w.n {
			return nil, fmt.Errorf("a block begins at sample %d, after %d", b.First, w.n)
		}
		w.n += int64(b.N)
		for j, c := range b.Channels {
			for role, v := range c {
				if v != nil && len(v) != b.N {
					return nil, fmt.Errorf("%d samples in a block of %d", len(v), b.N)
				}
				w.channels[j][role] = append(w.channels[j][role], v...)
			}
		}
	}
	w.notes = strings.Join(r.Notes(), "\n")
	if r.Samples() != w.n {
		return nil, fmt.Errorf("%d samples told, %d given", r.Samples(), w.n)
	}
	return w, r.Err()
}

func lab(t testing.TB, text string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), "lab.csv")
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// table is a heading and n rows at 1 kHz: time in s, target and measured in mm,
// force in kN; target is k mm at row k.
func table(heading, format string, n int) string {
	var b strings.Builder
	b.WriteString(heading)
	for k := range n {
		fmt.Fprintf(&b, format, float64(k)/1000, float64(k), float64(k)-0.5, float64(2*k))
	}
	return b.String()
}

const (
	headed = "time [s],target [mm],measured [mm],force [kN]\n"
	format = "%.3f,%g,%g,%g\n"
)

func mapOf(t testing.TB, text string) Map {
	t.Helper()
	m, err := ParseMap(text)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func unitsOf(t testing.TB, text string) Units {
	t.Helper()
	u, err := ParseUnits(text)
	if err != nil {
		t.Fatal(err)
	}
	return u
}

func zipped(text string) string {
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	z.Write([]byte(text)) //nolint:errcheck // into memory
	z.Close()
	return b.String()
}

func wide(text string) string {
	out := []byte{0xff, 0xfe}
	for _, u := range utf16.Encode([]rune(text)) {
		out = append(out, byte(u), byte(u>>8))
	}
	return string(out)
}

// All these files hold the same twenty rows, and read as the same: target k mm
// at k ms, measured half a millimetre less, force 2k kN.
func TestUglyFilesThatReadTheSame(t *testing.T) {
	good := table(headed, format, 20)
	comma := strings.ReplaceAll
	german := comma(comma(table("Zeit;Sollweg;Istweg;Kraft\n", "%.3f;%g;%g;%g\n", 20), ".", ","), "Zeit", "\xef\xbb\xbfZeit")
	germanMap := Options{Map: mapOf(t, "time=Zeit,target=Sollweg,measured=Istweg,force=Kraft"), Units: unitsOf(t, "mm,kN")}
	numbered := Options{Map: mapOf(t, "time=1,target=2,measured=3,force=4"), Units: unitsOf(t, "mm,kN")}
	for _, c := range []struct {
		name, text string
		o          Options
		note       string
	}{
		{"plain", good, Options{}, ""},
		{"CR LF", comma(good, "\n", "\r\n"), Options{}, ""},
		{"CR alone", comma(good, "\n", "\r"), Options{}, ""},
		{"byte order mark", "\xef\xbb\xbf" + good, Options{}, ""},
		{"UTF-16", wide(good), Options{}, ""},
		{"gzip", zipped(good), Options{}, ""},
		{"gzip in two members", zipped(good[:100]) + zipped(good[100:]), Options{}, ""},
		{"tabs", comma(good, ",", "\t"), Options{}, ""},
		{"semicolons", comma(good, ",", ";"), Options{}, ""},
		{"blanks, aligned", comma(good, ",", "   "), Options{}, ""},
		{"blanks after commas", comma(good, ",", ", "), Options{}, ""},
		{"decimal commas and semicolons", comma(comma(good, ",", ";"), ".", ","), Options{}, ""},
		{"decimal commas and tabs", comma(comma(good, ",", "\t"), ".", ","), Options{}, ""},
		{"decimal commas in quotes", table(headed, "\"%.3f\",\"%g\",\"%g\",\"%g\"\n", 20), Options{}, ""},
		{"quoted headings", table("\"time [s]\",\"target [mm]\",\"measured [mm]\",\"force [kN]\"\n", format, 20), Options{}, ""},
		{"a separator at the end of rows", table(headed, "%.3f,%g,%g,%g,\n", 20), Options{}, ""},
		{"headings in another language", german, germanMap, ""},
		{"headings in Windows-1252", table("t;Weg gew\xfcnscht [mm];Weg [mm];Kraft [kN]\n", "%.3f;%g;%g;%g\n", 20),
			Options{Map: mapOf(t, "time=1,target=weg gewünscht,measured=3,force=4")}, ""},
		{"no headings", table("", format, 20), numbered, ""},
		{"junk above the headings", "Test 12; operator B\n\nRate (Hz),1000\n1000\nno comment\n" + good, Options{}, "4 lines before line 7 are no part of the table"},
		{"comments", "# made up\n% so\n// so\n" + comma(good, "0.005,", "# a word between\n\n0.005,"), Options{}, ""},
		{"headings in a comment", table("# time target measured force\n", "%.3f %g %g %g\n", 20), Options{Units: unitsOf(t, "mm,kN")}, ""},
		{"a line of units", table("time,target,measured,force\ns,mm,mm,kN\n", format, 20), Options{}, ""},
		{"a line of units in brackets", table("time;target;measured;force\n[s];[mm];[mm];[kN]\n", "%.3f;%g;%g;%g\n", 20), Options{}, ""},
		{"mixed units", table("time_ms,target_m,measured [mm],force (N)\n", "%.3f,%g,%g,%g\n", 0) + mixed(20), Options{}, ""},
		{"units that the flag corrects", table("time [s],target [m],measured [m],force [kN]\n", format, 20), Options{Units: unitsOf(t, "mm")}, "headed m but was read in mm"},
		{"Fortran exponents", table(headed, "%.3f,%gD0,%gD0,%gD0\n", 20), Options{}, ""},
		{"other columns", table("valve,time [s],note,target [mm],measured [mm],force [kN],end\n", "0.5,%.3f,ok,%g,%g,%g,x\n", 20), Options{}, ""},
		{"a rate and no time", strings.Join(cut(good), "\n") + "\n", Options{Rate: 1000}, ""},
		{"a rate over bad times", comma(good, "0.01", "0.02"), Options{Rate: 1000}, "were not read"},
		{"the last line cut off", good + "0.020,2", Options{}, "the last line, 22, is cut off and was left out"},
		{"the last number cut off", good + "0.020,20,19.5,4", Options{}, "the last line, 22, is cut off"},
		{"words at the end", good + "end of record\nsigned\n", Options{}, "the last 2 lines, from line 22 on, are no rows"},
		{"a time twice", comma(good, "0.007,7,6.5,14\n", "0.007,7,6.5,14\n0.007,7,6.5,14\n"), Options{}, "1 row has the time of the row before (first at line 10)"},
		{"a row missing", comma(good, "0.007,7,6.5,14\n", ""), Options{}, "1 row missing, in gaps of up to 2 ms (line 9;"},
		{"numbers missing", comma(comma(good, "0.007,7,6.5,14\n", "0.007,7,NaN,14\n"), "0.011,11,10.5,22", "0.011,11,,"), Options{}, "2 numbers are missing in measured (first at line 9)"},
		{"spreadsheet errors", comma(good, "0.007,7,6.5,14\n", "0.007,7,#N/A,1.#INF\n"), Options{}, "1 number is missing in force (first at line 9)"},
		{"a time missing", comma(good, "0.007,7", ",7"), Options{}, "1 row has no time (first at line 9)"},
		{"no numbers at first", headed + "-0.002,,,\n-0.001,NaN,NaN,NaN\n" + good[len(headed):], Options{}, "2 rows at the beginning"},
		{"no numbers at last", good + "0.020,20,19.5,\n0.021,21,20.5,\n", Options{}, "the last 2 samples were left out: force has no number there"},
		{"jittered stamps", jittered(20), Options{}, "time stamps are uneven"},
		{"two rates", comma(comma(good, "0.011,11,10.5,22\n", ""), "0.013,13,12.5,26\n", ""), Options{}, "2 rows missing"},
	} {
		t.Run(c.name, func(t *testing.T) {
			w, err := readWhole(lab(t, c.text), c.o)
			if err != nil {
				t.Fatal(err)
			}
			if w.n != 20 {
				t.Fatalf("%d samples, want 20; %s", w.n, w.notes)
			}
			if got := w.reader.Step(); math.Abs(got-1e-3) > 1e-12 {
				t.Errorf("step %v", got)
			}
			for k := range 20 {
				for role, want := range map[Role]float64{Target: float64(k) / 1e3, Measured: (float64(k) - 0.5) / 1e3, Force: 2e3 * float64(k)} {
					// Lines between rows of a straight line are exact but for rounding.
					if got := w.channels[0][role][k]; !(math.Abs(got-want) <= 1e-12*2e4) {
						t.Fatalf("%s of sample %d is %v, want %v", role, k, got, want)
					}
				}
			}
			if !strings.Contains(w.notes, c.note) || c.note == "" && w.notes != "" {
				t.Errorf("notes: %q, want %q", w.notes, c.note)
			}
		})
	}
}

// cut is the table without its first column.
func cut(text string) []string {
	lines := strings.Split(strings.TrimSpace(text), "\n")
	for i, l := range lines {
		_, lines[i], _ = strings.Cut(l, ",")
	}
	return lines
}

func mixed(n int) string {
	var b strings.Builder
	for k := range n {
		fmt.Fprintf(&b, "%d,%g,%g,%d\n", k, float64(k)/1000, float64(k)-0.5, 2000*k)
	}
	return b.String()
}

// jittered has every stamp, but the first and last, off by up to a fifth of a step.
func jittered(n int) string {
	var b strings.Builder
	b.WriteString(headed)
	for k := range n {
		at := float64(k) + 0.2*math.Sin(float64(3*k))
		if k == 0 || k == n-1 {
			at = float64(k)
		}
		fmt.Fprintf(&b, "%.17f,%.17g,%.17g,%.17g\n", at/1000, at, at-0.5, 2*at)
	}
	return b.String()
}

// What is no log is refused, with file, line and reason, and with what to do.
func TestUglyFilesThatAreRefused(t *testing.T) {
	good := table(headed, format, 20)
	for _, c := range []struct {
		name, text string
		o          Options
		want       []string
	}{
		{"empty", "", Options{}, []string{"lab.csv: is empty"}},
		{"blank lines only", "\n\n \n", Options{}, []string{"lab.csv: no row of numbers"}},
		{"words only", "to whom it may concern\nnothing was measured\n", Options{}, []string{"lab.csv:1: no row of numbers", "to whom"}},
		{"a heading only", headed, Options{}, []string{"lab.csv:1: no row of numbers"}},
		{"one row", headed + "0.000,0,0,0\n", Options{}, []string{"lab.csv:2: 1 row"}},
		{"one row and a rate", headed + "0.000,0,0,0\n", Options{Rate: 100}, []string{"lab.csv:2: 1 row"}},
		{"binary", "\x7fELF\x02\x01\x01\x00\x00\x00", Options{}, []string{"lab.csv: is a binary file"}},
		{"MAT file", "MATLAB 5.0 MAT-file, Platform: GLNXA64\x00\x01\x02", Options{}, []string{"MAT file", "CSV"}},
		{"workbook", "PK\x03\x04\x14\x00", Options{}, []string{"spreadsheet", "CSV"}},
		{"gzip of a binary", zipped("\x00\x01\x02"), Options{}, []string{"binary"}},
		{"gzip that is damaged", damaged(zipped(good)), Options{}, []string{"lab.csv: ", "damaged"}},
		{"no target", strings.Replace(good, "target", "valve", 1), Options{Need: []Role{Target}}, []string{"lab.csv:2: no column is headed target; say which one it is by --map target=…", `2 "valve [mm]"`}},
		{"no time", strings.Replace(good, "time", "tick", 1), Options{}, []string{"lab.csv:2: no column is headed time", "--map time=…,target=…,measured=…, or give --rate", `1 "tick [s]"`}},
		{"no headings", table("", format, 20), Options{}, []string{"lab.csv:1: no column is headed time", "4 columns and no headings"}},
		{"headings in another language", table("Zeit;Soll;Ist;Kraft\n", "%.3f;%g;%g;%g\n", 20), Options{}, []string{"lab.csv:2: no column is headed time", `2 "Soll"`}},
		{"no unit", strings.Replace(good, " [mm]", "", 1), Options{}, []string{`lab.csv:2: no unit is known of target, column 2 "target"`, "--units target=mm"}},
		{"unit of another kind", strings.Replace(good, "[kN]", "[V]", 1), Options{}, []string{`"V" is not known as the unit of a force`}},
		{"two times", strings.Replace(good, "force [kN]", "time", 1), Options{}, []string{"columns 1 and 4 are both headed time"}},
		{"two targets", strings.Replace(good, "measured", "target", 1), Options{}, []string{"two columns are headed target"}},
		{"map by a heading that is not there", good, Options{Map: mapOf(t, "target=soll")}, []string{"--map target=soll: no column is headed so", `2 "target [mm]"`}},
		{"map by a number that is not there", good, Options{Map: mapOf(t, "target=7")}, []string{"--map target=7: there are columns 1 to 4"}},
		{"a rate and a time", good, Options{Rate: 1000, Map: mapOf(t, "time=1,target=2")}, []string{"--map time=… and --rate both"}},
		{"no such channel", good, Options{Channel: "damper"}, []string{`no channel is named "damper"; there are: channel`}},
		{"a word in a row", strings.Replace(good, "0.007,7,", "0.007,open,", 1), Options{}, []string{`lab.csv:9: column 2 (target): "open" is not a number`}},
		{"a row too short", strings.Replace(good, "0.007,7,", "0.007,", 1), Options{}, []string{"lab.csv:9: 3 columns found, where the rows above have 4"}},
		{"a row too long", strings.Replace(good, "0.007,7,", "0.007,7,7,", 1), Options{}, []string{"lab.csv:9: 5 columns found"}},
		{"another table below", good + "\n" + good, Options{}, []string{"lab.csv:23: ", `"time [s]" is not a number`}},
		{"a separator changes", strings.Replace(good, "0.007,7,6.5,14", "0.007;7;6.5;14", 1), Options{}, []string{"lab.csv:9: 1 column found"}},
		{"commas for decimals and separators", "time [s],target [mm]\n0,000,1,5\n0,001,2,5\n0,002,3,5\n", Options{}, []string{"lab.csv:2: 4 cells in the first row under the 2 names of line 1"}},
		{"time goes back", good + good[len(headed):], Options{}, []string{"lab.csv:22: time goes back from 0.019 s to 0 s"}},
		{"time leaps", good + "5.000,0,0,0\n", Options{}, []string{"lab.csv:22: time leaps from 0.019 s to 5 s"}},
		{"time stands still", table(headed, "0.0%[3]*.[2]*[1]f,1,1,1\n", 0) + strings.Repeat("1,2,3,4\n", 9), Options{}, []string{"lab.csv:2: time does not advance", "--rate"}},
		{"times of day", table(headed, "12:00:%06.3f,%g,%g,%g\n", 20), Options{}, []string{`lab.csv:2: `, `"12:00:00.000" is not a number`}},
		{"a number beyond reason", strings.Replace(good, ",6.5,", ",6.5e200,", 1), Options{}, []string{"lab.csv:9: column 3 (measured): 6.5e200 is too large"}},
		{"a hole of a minute", good + holed(60000), Options{}, []string{"lab.csv:", "measured has no number"}},
		{"a column without numbers", table(headed, "%.3f,%g,,%[4]g\n", 20), Options{}, []string{"no row has a number in every column"}},
		{"a line of two megabytes", good + strings.Repeat("1,", 1<<20) + "\n", Options{}, []string{"lab.csv:22: "}},
	} {
		t.Run(c.name, func(t *testing.T) {
			w, err := readWhole(lab(t, c.text), c.o)
			if err == nil {
				t.Fatalf("read as %d samples: %s", w.n, w.notes)
			}
			for _, want := range c.want {
				if !strings.Contains(err.Error(), want) {
					t.Errorf("the error does not say %q:\n%v", want, err)
				}
			}
			if strings.ContainsAny(err.Error(), "\n") {
				t.Errorf("more than one line: %v", err)
			}
		})
	}
	if _, err := readWhole(filepath.Join(t.TempDir(), "none.csv"), Options{}); err == nil || !strings.Contains(err.Error(), "no such file") {
		t.Errorf("a file that is not there: %v", err)
	}
	if _, err := readWhole(t.TempDir(), Options{}); err == nil || !strings.Contains(err.Error(), "is a directory") {
		t.Errorf("a directory: %v", err)
	}
}

func damaged(text string) string {
	b := []byte(text)
	b[len(b)-6] ^= 0xff // of the checksum
	return string(b)
}

// holed is n rows without measured, and then one with.
func holed(n int) string {
	var b strings.Builder
	for k := range n {
		fmt.Fprintf(&b, "%.3f,1,,1\n", 0.020+float64(k)/1000)
	}
	fmt.Fprintf(&b, "%.3f,1,1,1\n", 0.020+float64(n)/1000)
	return b.String()
}
