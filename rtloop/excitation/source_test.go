package excitation

import (
	"fmt"
	"io"
	"maps"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

func openTestdata(name string) (io.ReadCloser, error) {
	return os.Open(filepath.Join("testdata", name))
}

// openText opens any name as a file of the given content.
func openText(text string) func(string) (io.ReadCloser, error) {
	return func(string) (io.ReadCloser, error) { return io.NopCloser(strings.NewReader(text)), nil }
}

func context(step, duration float64, d Drives) Context {
	return Context{Step: step, Duration: duration, Seed: 7, Drives: d, Open: openTestdata}
}

// try builds a source as a scenario would, through the table.
func try(name string, c Context, given kind.Values) (Source, error) {
	e, err := Kinds.Find(name)
	if err != nil {
		return nil, err
	}
	v, err := e.Resolve(given)
	if err != nil {
		return nil, err
	}
	return e.New(c, v)
}

func build(t testing.TB, name string, c Context, given kind.Values) Source {
	t.Helper()
	s, err := try(name, c, given)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func filled(s Source, n int) []float64 {
	x := make([]float64, n)
	s.Fill(x)
	return x
}

// every is one setting of each kind of source, and of both sorts of record.
var every = []struct {
	label, kind string
	given       kind.Values
	drives      Drives
}{
	{"even record", "record", kind.Values{"file": kind.Text("column1.txt"), "step": kind.Num(0.02), "unit": kind.Text("g")}, Ground},
	{"uneven record", "record", kind.Values{"file": kind.Text("uneven.txt"), "unit": kind.Text("mm"), "start": kind.Num(0.52)}, Target},
	{"target of an acceleration", "record", kind.Values{"file": kind.Text("column1.txt"), "step": kind.Num(0.02), "unit": kind.Text("g"), "corner_frequency": kind.Num(0.5), "length_factor": kind.Num(5)}, Target},
	{"Saragoni-Hart noise", "filtered-noise", kind.Values{"peak": kind.Num(3), "rise": kind.Num(0.3), "strong": kind.Num(1), "decay": kind.Num(0.4), "envelope": kind.Text("saragoni-hart")}, Ground},
	{"band noise", "band-noise", kind.Values{"rms": kind.Num(3), "low": kind.Num(0.5), "high": kind.Num(8)}, Target},
	{"cyclic list", "cyclic", kind.Values{"amplitudes": kind.List(1, -2), "repeats": kind.List(3, 2), "period": kind.Num(0.3)}, Force},
	{"cyclic protocol", "cyclic", kind.Values{"protocol": kind.Text("aisc-341"), "unit_amplitude": kind.Num(3), "period": kind.Num(0.04)}, Target},
	{"filtered noise", "filtered-noise", kind.Values{"peak": kind.Num(3), "rise": kind.Num(0.3), "strong": kind.Num(1), "decay": kind.Num(0.4)}, Ground},
	{"sine", "sine", kind.Values{"amplitude": kind.Num(2), "frequency": kind.Num(1.7)}, Force},
	{"linear sweep", "sweep", kind.Values{"amplitude": kind.Num(2), "from": kind.Num(0.5), "to": kind.Num(9)}, Target},
	{"log sweep", "sweep", kind.Values{"amplitude": kind.Num(2), "from": kind.Num(9), "to": kind.Num(0.5), "law": kind.Text("log")}, Target},
	{"pulse", "pulse", kind.Values{"amplitude": kind.Num(-2), "width": kind.Num(0.7)}, Force},
	{"release", "release", kind.Values{"amplitude": kind.Num(0.05)}, Ground},
}

func TestMotionDoesNotHangOnTheStep(t *testing.T) {
	for _, k := range every {
		at := func(step float64, n int) []float64 {
			return filled(build(t, k.kind, context(step, 2, k.drives), k.given), n)
		}
		coarse := at(1./1024, 2049)
		// Twice the rate is a power of two: the instants are the same numbers
		// and so must be the samples, bit for bit.
		fine := at(1./2048, 4097)
		for i, x := range coarse {
			if fine[2*i] != x {
				t.Fatalf("%s: at %g s %v at 1024 Hz, %v at 2048 Hz", k.label, float64(i)/1024, x, fine[2*i])
			}
		}
		// With slowdown 3 every third sample is at the same instant but for
		// rounding, one part in 2⁵² of t; the steepest of these motions, the
		// uneven record's jump of 8 mm in 10 µs, turns that into less than
		// 1e-12 of its height.
		for _, j := range []int{700, 2048} {
			slow := at(1./1024/3, 3*j+1)
			if d := math.Abs(slow[3*j] - coarse[j]); d > 1e-11 {
				t.Errorf("%s: at slowdown 3 sample %d differs by %g", k.label, j, d)
			}
		}
		for i, x := range at(1./1024/3, 6145) {
			if i%3 == 0 && math.Abs(x-coarse[i/3]) > 1e-11 {
				t.Fatalf("%s: at slowdown 3 sample %d is %v, not %v", k.label, i, x, coarse[i/3])
			}
		}
	}
}

func TestFillInChunksEqualsOneFill(t *testing.T) {
	for _, k := range every {
		c := context(1./1024, 2, k.drives)
		whole := filled(build(t, k.kind, c, k.given), 2500) // beyond the end of the run too
		for _, size := range []int{1, 2, 7, 64, 1000} {
			s := build(t, k.kind, c, k.given)
			var parts []float64
			s.Fill(nil)
			for len(parts) < len(whole) {
				parts = append(parts, filled(s, min(size, len(whole)-len(parts)))...)
			}
			if !slices.Equal(parts, whole) {
				t.Errorf("%s: chunks of %d give another motion", k.label, size)
			}
		}
	}
}

func TestFillAllocatesNothing(t *testing.T) {
	for _, k := range every {
		s := build(t, k.kind, context(1./4096, 2, k.drives), k.given)
		buf := make([]float64, 64)
		if n := testing.AllocsPerRun(200, func() { s.Fill(buf) }); n != 0 {
			t.Errorf("%s: %v allocations in a Fill", k.label, n)
		}
	}
}

func TestSourcesRefuseARunWithoutStepDurationOrMeaning(t *testing.T) {
	for _, k := range every {
		for _, c := range []struct {
			Context
			want string
		}{
			{context(0, 2, k.drives), "step: 0 s between samples; it must be above zero"},
			{context(math.NaN(), 2, k.drives), "step: NaN s between samples; it must be above zero"},
			{context(0.001, math.Inf(1), k.drives), "duration: +Inf s; it must be above zero"},
			{context(0.001, 2, 3), "drives: value 3 has no meaning"},
		} {
			if _, err := try(k.kind, c.Context, k.given); err == nil || err.Error() != c.want {
				t.Errorf("%s: got %v, want %s", k.label, err, c.want)
			}
		}
	}
}

func TestEveryKindIsDescribed(t *testing.T) {
	for _, e := range Kinds.Entries {
		if e.Doc == "" || e.Equation == "" || e.Source == "" || e.New == nil {
			t.Errorf("%s: something of the description is missing", e.Name)
		}
		for _, s := range e.Settings {
			if s.Doc == "" {
				t.Errorf("%s: %s has no doc", e.Name, s.Name)
			}
			if s.HasDefault() && s.Check(s.Fallback) != nil {
				t.Errorf("%s: the default of %s is outside its range", e.Name, s.Name)
			}
		}
	}
}

func BenchmarkFill(b *testing.B) {
	for _, k := range every {
		b.Run(k.label, func(b *testing.B) {
			c := context(1./2048, 100, k.drives)
			given := maps.Clone(k.given)
			switch k.kind {
			case "filtered-noise": // strong for as long as it is asked
				given["strong"] = kind.Num(longest)
			case "record":
				c.Open = openText(longRecord(k.label == "uneven record"))
				delete(given, "start")
				given["step"] = kind.Num(0.005)
				if k.label == "uneven record" {
					delete(given, "step")
				}
			}
			s := build(b, k.kind, c, given)
			again := func() {}
			switch s := s.(type) {
			case *even:
				again = func() { s.k = 0 }
			case *integrated:
				again = func() { s.k, s.j, s.m = 0, 0, motionState{}; s.polynomial() }
			case *uneven:
				again = func() { s.k, s.j = 0, 0 }
			}
			buf := make([]float64, 256)
			b.ReportAllocs()
			for n := 0; b.Loop(); n++ {
				if n%30000 == 0 { // the records are near their end
					again()
				}
				s.Fill(buf)
			}
			b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/float64(len(buf)), "ns/sample")
		})
	}
}

// longRecord is a record of 4000 s at 200 Hz, as values or as time and value.
func longRecord(times bool) string {
	var s strings.Builder
	for k := range 800000 {
		if times {
			fmt.Fprintf(&s, "%.3f ", float64(k)*0.005)
		}
		fmt.Fprintf(&s, "%d\n", k*7919%1000-500)
	}
	return s.String()
}
