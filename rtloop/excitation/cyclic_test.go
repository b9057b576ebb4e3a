package excitation

import (
	"math"
	"testing"

	"antelag/scenarios/kind"
)

// cycles measures a motion sampled n times a cycle: the value a quarter and
// three quarters through each.
func cycles(x []float64, n int) (up, down []float64) {
	for k := 0; k+n <= len(x); k += n {
		up, down = append(up, x[k+n/4]), append(down, x[k+3*n/4])
	}
	return up, down
}

func TestCyclicGoesThroughItsList(t *testing.T) {
	list := kind.List(0.01, -0.02, 0, 0.005)
	for _, tt := range []struct {
		label string
		given kind.Values
		want  []float64 // of each cycle
	}{
		{"one each", kind.Values{"amplitudes": list}, []float64{0.01, -0.02, 0, 0.005, 0, 0, 0}},
		{"two each", kind.Values{"amplitudes": list, "repeats": kind.List(2)}, []float64{0.01, 0.01, -0.02, -0.02, 0, 0, 0.005, 0.005, 0, 0}},
		{"as told", kind.Values{"amplitudes": list, "repeats": kind.List(3, 1, 1, 2)}, []float64{0.01, 0.01, 0.01, -0.02, 0, 0.005, 0.005, 0, 0}},
		{"one alone", kind.Values{"amplitudes": kind.List(2), "repeats": kind.List(1)}, []float64{2, 0}},
	} {
		const n = 64
		tt.given["period"] = kind.Num(2)
		for _, d := range []Drives{Ground, Force, Target} {
			x := filled(build(t, "cyclic", context(2./n, 1000, d), tt.given), n*len(tt.want))
			up, down := cycles(x, n)
			for i, a := range tt.want {
				if up[i] != a || down[i] != -a {
					t.Errorf("%s: cycle %d runs from %v to %v, want ±%v", tt.label, i, up[i], down[i], a)
				}
			}
			for k := range x {
				// All instants are exact in binary: one sine's rounding.
				if want := tt.want[k/n] * math.Sin(2*math.Pi*float64(k%n)/n); math.Abs(x[k]-want) > 1e-16*math.Abs(tt.want[k/n]) {
					t.Fatalf("%s: sample %d is %v, want %v", tt.label, k, x[k], want)
				}
				if tt.want[k/n] == 0 && x[k] != 0 {
					t.Fatalf("%s: sample %d is %v in a pause", tt.label, k, x[k])
				}
			}
		}
	}
}

func TestCyclicFollowsAISC341(t *testing.T) {
	// ANSI/AISC 341, chapter K, from memory, cycle by cycle.
	var want []float64
	for _, s := range []struct {
		n     int
		theta float64
	}{
		{6, 0.00375}, {6, 0.005}, {6, 0.0075}, {4, 0.01}, {2, 0.015}, {2, 0.02}, {2, 0.03}, {2, 0.04},
		{2, 0.05}, {2, 0.06}, {2, 0.07}, {2, 0.08}, {2, 0.09}, {2, 0.10},
	} {
		for range s.n {
			want = append(want, s.theta)
		}
	}
	if len(want) != 42 {
		t.Fatalf("%d cycles", len(want))
	}
	const n, length = 32, 3.2 // 3.2 m from the beam's load to the column's centre
	for _, sign := range []float64{1, -1} {
		s := build(t, "cyclic", context(8./n, 8*42, Target), kind.Values{
			"protocol": kind.Text("aisc-341"), "unit_amplitude": kind.Num(sign * length), "period": kind.Num(8)})
		up, down := cycles(filled(s, n*len(want)), n)
		for i, theta := range want {
			// A product and a sum or two of rounding.
			if d := sign * length * theta; math.Abs(up[i]-d) > 1e-15 || math.Abs(down[i]+d) > 1e-15 {
				t.Errorf("cycle %d runs from %v to %v, want ±%v", i, up[i], down[i], d)
			}
		}
	}
}

func TestCyclicKeepsCountingForADay(t *testing.T) {
	// 0.5 s a cycle, asked once in the first quarter of each: the table's 30
	// cycles, then another 0.01 rad every other cycle.
	s := build(t, "cyclic", context(0.5, 86400, Target), kind.Values{
		"protocol": kind.Text("aisc-341"), "unit_amplitude": kind.Num(1), "period": kind.Num(0.5)})
	c := s.(*cyclic)
	for cycle := 30; cycle < 2*86400; cycle++ {
		if got, want := c.amplitude(float64(cycle)), 0.04+0.01*float64((cycle-30)/2+1); math.Abs(got/want-1) > 1e-13 {
			t.Fatalf("cycle %d: %v, want %v", cycle, got, want)
		}
	}
}

func TestCyclicJoinsAtZero(t *testing.T) {
	// Instants that are not exact in binary: x stays below the velocity times
	// the step from zero at every joint, and nothing is left behind the list.
	const step, period = 0.001, 0.7
	x := filled(build(t, "cyclic", context(step, 10, Target), kind.Values{
		"amplitudes": kind.List(0.1, 0.3), "repeats": kind.List(2), "period": kind.Num(period)}), 10000)
	for k := 1; k < len(x); k++ {
		if math.Abs(x[k]-x[k-1]) > 2*math.Pi*0.3/period*step {
			t.Fatalf("a jump from %v to %v at %g s", x[k-1], x[k], float64(k)*step)
		}
	}
	if largest(x[2700:2800]) == 0 || largest(x[2801:]) != 0 {
		t.Error("the motion does not end at 2.8 s")
	}
}

func TestNewKindsCheckTheirSettings(t *testing.T) {
	text, num, list := kind.Text, kind.Num, kind.List
	for _, tt := range []struct {
		kind   string
		drives Drives
		given  kind.Values
		want   string
	}{
		{"cyclic", Target, kind.Values{"amplitudes": list(1)}, "period: is missing; cyclic needs it: period T of every cycle, a time (s), 5 ms to 86400 s"},
		{"cyclic", Target, kind.Values{"period": num(1)}, "amplitudes: is missing; cyclic needs a list of amplitudes, or a protocol"},
		{"cyclic", Target, kind.Values{"period": num(0), "amplitudes": list(1)}, "period: 0 s is below 5 ms; allowed is a time (s), 5 ms to 86400 s"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list()}, "amplitudes: is empty; it must be a list, each an amplitude of what is driven"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list(1, math.NaN())}, "amplitudes: NaN is no finite number; allowed is a list, each an amplitude of what is driven"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list(1, 2, 3), "repeats": list(1, 2)}, "repeats: 2 numbers for 3 amplitudes; give one for all, or one for each"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list(1, 2), "repeats": list(1, 2.5)}, "repeats: 2.5 is not a whole number of cycles"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list(1, 2), "repeats": list(0)}, "repeats: 0 is below 1; allowed is a list, each a plain number, 1 to 1e+06"},
		{"cyclic", Target, kind.Values{"period": num(1), "amplitudes": list(1), "unit_amplitude": num(3)}, `unit_amplitude: means something with protocol = "aisc-341" only; leave it out`},
		{"cyclic", Target, kind.Values{"period": num(1), "protocol": text("aisc-341")}, `unit_amplitude: is missing; protocol "aisc-341" needs it: the displacement for a storey drift angle of 1 rad`},
		{"cyclic", Target, kind.Values{"period": num(1), "protocol": text("aisc-341"), "unit_amplitude": num(3), "amplitudes": list(1)},
			`amplitudes: protocol "aisc-341" has its own; leave amplitudes out, or set protocol = "list"`},
		{"cyclic", Target, kind.Values{"period": num(1), "protocol": text("aisc-341"), "unit_amplitude": num(3), "repeats": list(1)},
			`repeats: protocol "aisc-341" has its own; leave repeats out, or set protocol = "list"`},
		{"cyclic", Ground, kind.Values{"period": num(1), "protocol": text("aisc-341"), "unit_amplitude": num(3)},
			`protocol: aisc-341 prescribes displacements, so it goes with drives = "target" only, not "ground"`},
		{"cyclic", Target, kind.Values{"period": num(1), "protocol": text("aisc-314")}, `protocol: unknown word "aisc-314"; did you mean "aisc-341"? (known: list, aisc-341)`},
		{"band-noise", Ground, kind.Values{"low": num(1), "high": num(2)}, "rms: is missing; band-noise needs it: root mean square σ of the noise, after the fade-in of 1 s, an amplitude of what is driven, at least 0"},
		{"band-noise", Ground, kind.Values{"rms": num(1), "high": num(2)}, "low: is missing; band-noise needs it: frequency f1 at the lower edge, where half the power is left, a frequency (Hz), 0.001 Hz to 200 Hz"},
		{"band-noise", Ground, kind.Values{"rms": num(-1), "low": num(1), "high": num(2)}, "rms: -1 is below 0; allowed is an amplitude of what is driven, at least 0"},
		{"band-noise", Ground, band(1, 2, 2), "high: 2 Hz makes no band above low, 2 Hz; it must be at least 1.01 times that"},
		{"band-noise", Ground, band(1, 2, 1), "high: 1 Hz makes no band above low, 2 Hz; it must be at least 1.01 times that"},
		{"band-noise", Ground, band(1, 2, 201), "high: 201 Hz is above 200 Hz; allowed is a frequency (Hz), 0.001 Hz to 200 Hz"},
		{"filtered-noise", Ground, kind.Values{"peak": num(1), "envelope": text("saragoni")}, `envelope: unknown word "saragoni"; did you mean "saragoni-hart"? (known: trapezoid, saragoni-hart)`},
		{"filtered-noise", Ground, kind.Values{"peak": num(1), "epsilon": num(1)}, "epsilon: 1 is above 0.7; allowed is a plain number, 0.05 to 0.7"},
		{"filtered-noise", Ground, kind.Values{"peak": num(1), "eta": num(0)}, "eta: 0 is below 0.001; allowed is a plain number, 0.001 to 0.5"},
		{"filtered-noise", Ground, kind.Values{"peak": num(1), "envelope": text("saragoni-hart"), "rise": num(0), "strong": num(0), "decay": num(0)},
			"strong: rise, strong and decay are all zero, so nothing would move"},
	} {
		if _, err := try(tt.kind, context(0.001, 2, tt.drives), tt.given); errText(err) != tt.want {
			t.Errorf("%s: got  %v\nwant %s", tt.kind, err, tt.want)
		}
	}
}

func TestEveryNumberOfAListMayHaveTheUnitOfWhatIsDriven(t *testing.T) {
	e, err := Kinds.Find("cyclic")
	if err != nil {
		t.Fatal(err)
	}
	amplitudes, err := e.Setting("amplitudes")
	if err != nil {
		t.Fatal(err)
	}
	for d, raw := range map[Drives][]any{
		Ground: {"0.1 m/s^2", "20 cm/s^2"}, Force: {"0.1 N", "0.0002 kN"}, Target: {"100 mm", "20 cm"},
	} {
		in := amplitudes.In(d.Dim())
		v, err := in.Read(raw)
		if err != nil || len(v.List) != 2 || math.Abs(v.List[0]-0.1) > 1e-16 || math.Abs(v.List[1]-0.2) > 1e-16 {
			t.Errorf("%s: %v, %v", Words[d], v.List, err)
		}
		if _, err := in.Read([]any{"1 s"}); err == nil {
			t.Errorf("%s: a time is taken", Words[d])
		}
	}
}
