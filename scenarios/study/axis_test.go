package study

import (
	"math"
	"testing"
)

func TestParseAxis(t *testing.T) {
	s := scene(t, short)
	for _, c := range []struct {
		text      string
		low, high float64
		n         int
		err       string
	}{
		{"spring.actuator.delay=6 ms:10 ms:5", 0.006, 0.01, 5, ""},
		{`spring.actuator.delay="6 ms:10 ms:5"`, 0.006, 0.01, 5, ""},
		{`spring.actuator.delay="6 ms":"10 ms":5:log`, 0.006, 0.01, 5, ""},
		{"spring.actuator.gain=0.9:1.1:3", 0.9, 1.1, 3, ""},
		{"spring.compensator.order=1:4:4", 1, 4, 4, ""},
		{"spring.actuator.delay=8 ms:8 ms:1", 0.008, 0.008, 1, ""},
		{"loop.seed=1:100:100", 1, 100, 100, ""},
		{"spring.actuator.delay", 0, 0, 0, "a grid is given as SETTING=a:b:n"},
		{"spring.actuator.delay=6 ms:10 ms", 0, 0, 0, "a grid is given as SETTING=a:b:n"},
		{"spring.actuator.delay=6 ms:10 ms:5:lin", 0, 0, 0, "a grid is given as SETTING=a:b:n"},
		{"spring.actuator.delay=10 ms:6 ms:5", 0, 0, 0, "10 ms is above 6 ms; the smaller end comes first"},
		{"spring.actuator.delay=6:10:5", 0, 0, 0, "6 has no unit; allowed is a time (s)"},
		{"spring.actuator.delay=6 mm:10 mm:5", 0, 0, 0, "a time"},
		{"spring.actuator.delay=-1 ms:10 ms:5", 0, 0, 0, "is below 0 s"},
		{"spring.actuator.delay=0 ms:10 ms:5:log", 0, 0, 0, "a logarithmic range begins above zero"},
		{"spring.actuator.delay=6 ms:10 ms:0", 0, 0, 0, `"0" is no number of values`},
		{"spring.actuator.delay=6 ms:10 ms:many", 0, 0, 0, `"many" is no number of values`},
		{"spring.actuator.delay=6 ms:10 ms:1", 0, 0, 0, "one value cannot be both"},
		{"spring.actuator.delay=6 ms:6 ms:2", 0, 0, 0, "there is nothing between"},
		{"spring.actuator.dealy=6 ms:10 ms:2", 0, 0, 0, `did you mean "delay"?`},
		{"sprang.actuator.delay=6 ms:10 ms:2", 0, 0, 0, `did you mean "spring"?`},
		{"spring.compensator.order=1:4:3", 0, 0, 0, "takes whole numbers"},
		{"spring.compensator.order=1:4:4:log", 0, 0, 0, "takes whole numbers"},
		{"loop.hold=1:4:4", 0, 0, 0, "loop.hold is not a single number; it takes one of ramp, step"},
		{"spring.actuator.gain=NaN:1:3", 0, 0, 0, "NaN"},
		{"spring.actuator.gain=0.1:Inf:3", 0, 0, 0, "Inf"},
	} {
		a, err := ParseAxis(s, c.text)
		says(t, err, c.err)
		if err == nil && (a.Low != c.low || a.High != c.high || a.N != c.n) {
			t.Errorf("%s: %v", c.text, a)
		}
	}
}

func TestParseRange(t *testing.T) {
	s := scene(t, short)
	for text, want := range map[string]string{
		"spring.actuator.delay=6 ms:10 ms":     "",
		"spring.actuator.delay=6 ms:10 ms:log": "",
		"spring.actuator.delay=6 ms:10 ms:5":   "a range is given as SETTING=a:b",
		"spring.actuator.delay=6 ms:6 ms":      "there is nothing between",
		"spring.actuator.delay=6 ms":           "a range is given as SETTING=a:b",
		"spring.compensator.order=1:3":         "",
	} {
		_, err := ParseRange(s, text)
		says(t, err, want)
	}
}

// An axis has both its ends exactly and even steps between, in the logarithm if
// so asked, and is written so that it reads back the same.
func TestAxisValues(t *testing.T) {
	s := scene(t, short)
	for text, ratio := range map[string]bool{"spring.actuator.delay=3 ms:48 ms:5": false, "spring.actuator.delay=3 ms:48 ms:5:log": true} {
		a, err := ParseAxis(s, text)
		if err != nil {
			t.Fatal(err)
		}
		if a.At(0) != 0.003 || a.At(4) != 0.048 {
			t.Errorf("%s: ends %v and %v", text, a.At(0), a.At(4))
		}
		for i := range 4 {
			step, want := a.At(i+1)-a.At(i), 0.045/4
			if ratio {
				step, want = a.At(i+1)/a.At(i), 2
			}
			if math.Abs(step/want-1) > 1e-14 {
				t.Errorf("%s: step %d is %v", text, i, step)
			}
			if f := a.Part(a.At(i)); math.Abs(f-float64(i)/4) > 1e-15 {
				t.Errorf("%s: value %d is at %v", text, i, f)
			}
		}
		if back, err := ParseAxis(s, a.String()); err != nil || back.String() != a.String() || back.At(1) != a.At(1) {
			t.Errorf("%s reads back as %v, %v", a.String(), back, err)
		}
	}
}

func FuzzParseAxis(f *testing.F) {
	for _, text := range []string{"spring.actuator.delay=6 ms:10 ms:5:log", "spring.compensator.order=1:4:4", "a=b", "loop.seed=1:9007199254740992:2", "spring.actuator.gain=0.1:3:7"} {
		f.Add(text)
	}
	s := scene(f, short)
	f.Fuzz(func(t *testing.T, text string) {
		a, err := ParseAxis(s, text)
		if err != nil {
			return
		}
		back, err := ParseAxis(s, a.String())
		if err != nil || back.String() != a.String() {
			t.Errorf("%q: %s reads back as %v, %v", text, a.String(), back, err)
		}
		for _, i := range []int{0, a.N / 2, a.N - 1} {
			if v := a.At(i); !(v >= a.Low && v <= a.High) {
				t.Errorf("%q: value %d is %v", text, i, v)
			}
		}
	})
}
