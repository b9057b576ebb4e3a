package runlog

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"testing"
)

func fmtRow(b *bytes.Buffer, separator string, cells ...string) {
	b.WriteString(strings.Join(cells, separator))
	b.WriteByte('\n')
}

// row writes row k of a test at 2048 Hz.
func row(b *bytes.Buffer, separator string, k int) {
	f := func(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
	t := float64(k) / 2048
	fmtRow(b, separator, f(t), f(math.Sin(31*t)), f(0.0123*math.Sin(7*t)), f(0.0124*math.Sin(7*t+0.1)), f(0.0122*math.Sin(7*t-0.01)), f(1e5*math.Cos(7*t)), f(0.97+0.01*math.Sin(t)))
}

// A log of our own form comes back bit for bit, however many blocks it fills, as
// another CSV reader has it.
func TestOwnLogBitForBit(t *testing.T) {
	text := written(",", 2e6)
	records, err := csv.NewReader(bytes.NewReader(text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	w, err := readWhole(lab(t, string(text)), Options{Need: []Role{Target, Command, Measured, Force}})
	if err != nil || w.notes != "" {
		t.Fatal(err, w.notes)
	}
	if int(w.n) != len(records)-1 || w.reader.Step() != 1.0/2048 || w.reader.Start() != 0 || w.reader.Channels()[0].Name != "damper" {
		t.Fatalf("%d samples of %d, step %v from %v, channels %v", w.n, len(records)-1, w.reader.Step(), w.reader.Start(), w.reader.Channels())
	}
	for k, rec := range records[1:] {
		for role := range roles {
			want, _ := strconv.ParseFloat(rec[2+role], 64) //nolint:errcheck // FormatFloat wrote it
			if got := w.channels[0][role][k]; math.Float64bits(got) != math.Float64bits(want) {
				t.Fatalf("row %d, %s: %v, want %v", k, role, got, want)
			}
		}
	}
}

// The margin is undefined where its cell is empty; it is not bridged, and holds
// nothing up.
func TestMarginMayBeUndefined(t *testing.T) {
	r, err := Open(lab(t, "time_s,a.target_m,a.measured_m,energy_margin\n0,0,0,\n0.1,1,1,\n0.2,2,2,0.5\n0.3,3,3,\n"), Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if !r.HasMargin() || !r.Next() {
		t.Fatal(r.HasMargin(), r.Err())
	}
	if got := fmt.Sprint(r.Block().Margin); got != "[NaN NaN 0.5 NaN]" {
		t.Error(got)
	}
}

func TestChannelsByHeadingAndMap(t *testing.T) {
	text := "time_s,low.target_m,low.measured_m,high.target_m,high.measured_m,high.force_N\n0,0,1,2,3,4\n1,1,2,3,4,5\n2,2,3,4,5,6\n"
	for _, c := range []struct {
		name string
		o    Options
		want string
	}{
		{"by heading", Options{}, "[{low [true false true false]} {high [true false true true]}]"},
		{"one of them", Options{Channel: "high"}, "[{high [true false true true]}]"},
		{"by map", Options{Map: mapOf(t, "b.measured=high.measured,a.target=2")}, "[{b [false false true false]} {a [true false false false]}]"},
	} {
		w, err := readWhole(lab(t, text), c.o)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		if got := fmt.Sprint(w.reader.Channels()); got != c.want || w.n != 3 {
			t.Errorf("%s: %s, want %s; %d samples", c.name, got, c.want, w.n)
		}
		if c.name == "one of them" && fmt.Sprint(w.channels[0]) != "[[2 3 4] [] [3 4 5] [4 5 6]]" {
			t.Errorf("%s: %v", c.name, w.channels[0])
		}
	}
}

func TestMapsAndUnitsThatAreRefused(t *testing.T) {
	for text, want := range map[string]string{
		"target":             `"target" must be like target=2`,
		"target=":            "must be like",
		"soll=2":             `"soll" is none of time, target, command, measured, force`,
		"target=2,target=3":  "target is given twice",
		"a.b=2":              `"a.b" is none of`,
		"target=1,measured,": "must be like",
	} {
		if _, err := ParseMap(text); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("--map %s: %v, want %s", text, err, want)
		}
	}
	for text, want := range map[string]string{
		"mm,furlong": `unknown unit "furlong"`,
		"kg":         "no unit of time, length or force",
		"mm,in":      "mm and in are both a length",
		"force=mm":   "it must be the unit of a force",
		"soll=mm":    "is none of time",
	} {
		if _, err := ParseUnits(text); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("--units %s: %v, want %s", text, err, want)
		}
	}
}

// A column of row numbers is no time in seconds; that may be so, but it is said.
func TestRowNumbersForTimes(t *testing.T) {
	w, err := readWhole(lab(t, "time,target [m]\n1,0\n2,1\n3,2\n"), Options{})
	if err != nil || !strings.Contains(w.notes, "rows come every 1 s; if the time column counts rows") {
		t.Errorf("%v, %q", err, w.notes)
	}
}

// Where rows are spaced evenly and only their stamps are rounded, samples are the
// rows themselves at the true rate. Stamps of a millisecond at 2048 Hz, rounded or
// cut off, and twenty rows to a stamp of a hundredth of a second.
func TestRoundedStampsAreEven(t *testing.T) {
	for _, c := range []struct {
		name   string
		rate   float64
		rounds func(float64) float64
		format string
	}{
		{"rounded to 1 ms", 2048, func(t float64) float64 { return math.Round(t*1e3) / 1e3 }, "%.3f"},
		{"cut to 1 ms", 2048, func(t float64) float64 { return math.Floor(t*1e3) / 1e3 }, "%.3f"},
		{"rounded to 0.1 ms", 1024, func(t float64) float64 { return math.Round(t*1e4) / 1e4 }, "%.4f"},
		{"cut to 10 ms", 2000, func(t float64) float64 { return math.Floor(t*1e2) / 1e2 }, "%.2f"},
	} {
		t.Run(c.name, func(t *testing.T) {
			var b strings.Builder
			b.WriteString("time [s],target [m]\n")
			const n = 20000
			for k := range n {
				fmt.Fprintf(&b, c.format+",%d\n", c.rounds(float64(k)/c.rate), k)
			}
			w, err := readWhole(lab(t, b.String()), Options{})
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(w.reader.Step()*c.rate-1) > 1e-12 || w.n != n || !strings.HasPrefix(w.notes, "time stamps are rounded to") || strings.Contains(w.notes, "\n") {
				t.Fatalf("%d samples at %v Hz: %s", w.n, 1/w.reader.Step(), w.notes)
			}
			for k, v := range w.channels[0][Target] {
				if v != float64(k) {
					t.Fatalf("sample %d is row %v", k, v)
				}
			}
		})
	}
}

// A sine at uneven instants comes out at even ones, within the error of straight
// lines between them: h²ω²/8 of the amplitude, h the largest step between rows,
// and a thousandth of a step in time, within which rows are taken as they are.
func TestUnevenRowsAreResampled(t *testing.T) {
	const n, omega = 30000, 2 * math.Pi * 3
	var b strings.Builder
	b.WriteString("time [s];target [mm]\n")
	at := 0.0
	most := 0.0
	seed := uint64(1)
	for k := range n {
		fmt.Fprintf(&b, "%.9f;%.12g\n", at, 10*math.Sin(omega*at))
		seed = seed*6364136223846793005 + 1442695040888963407
		step := (float64(k+1) + 0.3*(float64(seed>>40)/(1<<23)-1)) / 1000
		most = max(most, step-at)
		at = step
	}
	w, err := readWhole(lab(t, b.String()), Options{})
	if err != nil {
		t.Fatal(err)
	}
	step := w.reader.Step()
	if step != 1e-3 || w.n < n-1 || !strings.Contains(w.notes, "uneven") {
		t.Fatalf("%d samples of %v s: %s", w.n, step, w.notes)
	}
	bound := 0.010 * (most*most*omega*omega/8 + 1.1e-3*step*omega)
	for k, v := range w.channels[0][Target] {
		if want := 0.010 * math.Sin(omega*float64(k)*step); !(math.Abs(v-want) <= bound) {
			t.Fatalf("sample %d is %v, want %v within %.1g", k, v, want, bound)
		}
	}
}

// From where the rate changes, rows are bridged, and it is said.
func TestARateThatChanges(t *testing.T) {
	var b strings.Builder
	b.WriteString("time [s],target [m]\n")
	for k := 0; k < 6000; k++ {
		if k < 3000 || k%4 == 0 {
			fmt.Fprintf(&b, "%.3f,%d\n", float64(k)/1000, k)
		}
	}
	w, err := readWhole(lab(t, b.String()), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if w.n != 5997 || !strings.Contains(w.notes, "from line 3003 on rows come every 4 ms instead of every 1 ms") {
		t.Fatalf("%d samples: %s", w.n, w.notes)
	}
	for k, v := range w.channels[0][Target] {
		if math.Abs(v-float64(k)) > 1e-9 {
			t.Fatalf("sample %d is %v", k, v)
		}
	}
}

// Holes of numbers are bridged across blocks, also while another column has none.
func TestHolesAreBridgedAcrossBlocks(t *testing.T) {
	var b strings.Builder
	b.WriteString("time [s],target [m],measured [m]\n")
	const n = 3 * blockSize
	for k := range n {
		target, measured := strconv.Itoa(k), strconv.Itoa(2*k)
		if k > blockSize-300 && k < blockSize+300 {
			target = ""
		}
		if k > blockSize && k < blockSize+900 {
			measured = "nan"
		}
		fmt.Fprintf(&b, "%.3f,%s,%s\n", float64(k)/1000, target, measured)
	}
	w, err := readWhole(lab(t, b.String()), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if w.n != n || !strings.Contains(w.notes, "599 numbers are missing in target") || !strings.Contains(w.notes, "899 numbers are missing in measured") {
		t.Fatalf("%d samples: %s", w.n, w.notes)
	}
	for k := range n {
		if x, y := w.channels[0][Target][k], w.channels[0][Measured][k]; math.Abs(x-float64(k)) > 1e-9 || math.Abs(y-2*float64(k)) > 1e-9 {
			t.Fatalf("sample %d: %v, %v", k, x, y)
		}
	}
}

// A log behind whose middle a column has no number any more ends there.
func TestAColumnThatEnds(t *testing.T) {
	var b strings.Builder
	b.WriteString(table(headed, format, 15000))
	for k := 15000; k < 20000; k++ {
		fmt.Fprintf(&b, "%.3f,%d,,%d\n", float64(k)/1000, k, 2*k)
	}
	w, err := readWhole(lab(t, b.String()), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if w.n != 15000 || !strings.Contains(w.notes, "the last 5000 samples were left out: measured has no number there") {
		t.Fatalf("%d samples: %s", w.n, w.notes)
	}
}

// A compressed log that is cut off reads to its last whole row.
func TestGzipCutOff(t *testing.T) {
	text := zipped(table(headed, format, 20000))
	w, err := readWhole(lab(t, text[:len(text)*2/3]), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if w.n < 10000 || w.n >= 20000 || !strings.Contains(w.notes, "the compressed file is cut off") {
		t.Fatalf("%d samples: %s", w.n, w.notes)
	}
	for k, v := range w.channels[0][Target] {
		if math.Abs(v-float64(k)/1e3) > 1e-12 {
			t.Fatalf("sample %d is %v", k, v)
		}
	}
}

// However long a log is, reading it takes the same memory.
func TestReadingAllocatesNothingPerRow(t *testing.T) {
	path := filepath.Join(t.TempDir(), "log.csv")
	allocated := func(size int) uint64 {
		if err := os.WriteFile(path, written(",", size), 0o644); err != nil {
			t.Fatal(err)
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		if w, err := Open(path, Options{}); err != nil {
			t.Fatal(err)
		} else {
			for w.Next() {
			}
			if w.Err() != nil {
				t.Fatal(w.Err())
			}
			w.Close()
		}
		runtime.ReadMemStats(&after)
		return after.TotalAlloc - before.TotalAlloc
	}
	short, long := allocated(1e6), allocated(8e6)
	if long > short+1<<16 {
		t.Errorf("%d bytes allocated for 1 MB, %d for 8 MB", short, long)
	}
}

// Whatever is read, reading ends without a panic, and gives either an error of one
// line or samples that are numbers.
func FuzzRead(f *testing.F) {
	good := table(headed, format, 12)
	for _, s := range []string{good, strings.ReplaceAll(good, ",", "\t"), strings.ReplaceAll(good, ",", ";"), strings.ReplaceAll(good, ",", " "),
		zipped(good), wide(good), jittered(12), strings.ReplaceAll(good, "0.005", ""), "\"time\",\"target [m]\"\n\"0\",\"1\"\n\"1\",\"2\"\n", good + "x\n", "1e308,2\n1e308,3\n"} {
		f.Add([]byte(s), false)
		f.Add([]byte(s), true)
	}
	f.Fuzz(func(t *testing.T, text []byte, counted bool) {
		o := Options{Units: unitsOf(t, "mm,kN")}
		if counted {
			o.Rate, o.Map = 100, mapOf(t, "target=1,measured=2")
		}
		w, err := readWhole(lab(t, string(text)), o)
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Errorf("more than one line: %v", err)
			}
			return
		}
		if !(w.reader.Step() > 0) {
			t.Errorf("step %v", w.reader.Step())
		}
		for _, c := range w.channels {
			for _, column := range c {
				for k, v := range column {
					if math.IsNaN(v) || math.IsInf(v, 0) {
						t.Fatalf("sample %d is %v", k, v)
					}
				}
			}
		}
	})
}

func FuzzMapAndUnits(f *testing.F) {
	for _, s := range []string{"time=1,target=x", "mm,kN", "force=kip,a.target=in", "=", ",", "a=b=c"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		ParseMap(text)   //nolint:errcheck // that it ends is all
		ParseUnits(text) //nolint:errcheck // that it ends is all
	})
}

// Of a log that is read lean, what is not needed is passed over, holes and slips
// in it too; what is left is as if the rest were not there.
func TestLeanReading(t *testing.T) {
	text := "time_s,a.target_m,a.command_m,a.measured_m,a.force_N,energy_margin\n" +
		"0,,0,0.5,,\n0.001,1,1,1.5,broken,\n0.002,2,2,2.5,,0.5\n0.003,3,3,3.5,1e99,\n"
	need := []Role{Command, Measured}
	if _, err := readWhole(lab(t, text), Options{Need: need}); err == nil {
		t.Error("whole, it was read")
	}
	w, err := readWhole(lab(t, text), Options{Need: need, Lean: true})
	if err != nil || w.notes != "" || w.n != 4 || w.reader.HasMargin() {
		t.Fatalf("%d samples, margin %v, notes %q, error %v", w.n, w.reader.HasMargin(), w.notes, err)
	}
	c := w.reader.Channels()[0]
	if c.Name != "a" || c.Has != [roles]bool{Command: true, Measured: true} {
		t.Errorf("channel %+v", c)
	}
	for k := range 4 {
		if got := w.channels[0]; got[Command][k] != float64(k) || got[Measured][k] != float64(k)+0.5 || got[Target] != nil || got[Force] != nil {
			t.Errorf("sample %d of %v", k, got)
		}
	}
	// A row of another width is none, whatever is read of it.
	if _, err := readWhole(lab(t, text+"0.004,4,4,4.5\n0.005,5,5,5.5,,\n"), Options{Need: need, Lean: true}); err == nil || !strings.Contains(err.Error(), ":6: 4 columns found") {
		t.Errorf("a short row: %v", err)
	}
}
