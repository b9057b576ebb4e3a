package excitation

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

// moved builds the target of a record given as values at a step.
func moved(t *testing.T, a []float64, recordStep, step float64, given kind.Values) *integrated {
	t.Helper()
	var text strings.Builder
	for _, x := range a {
		fmt.Fprintf(&text, "%.17g\n", x)
	}
	c := context(step, 1000, Target)
	c.Open = openText(text.String())
	v := kind.Values{"file": kind.Text("a"), "unit": kind.Text("m/s^2"), "step": kind.Num(recordStep)}
	for name, value := range given {
		v[name] = value
	}
	return build(t, "record", c, v).(*integrated)
}

func TestTargetOfAnAccelerationEqualsSciPy(t *testing.T) {
	// testdata/displacement.py wrote the record and the vectors: butter,
	// sosfiltfilt on the padded record, cumulative_trapezoid, and piecewise
	// polynomials integrated twice.
	var vectors struct {
		Cases []struct {
			Corner, Start, End, Factor, Step float64
			Acceleration, Want               []float64
		}
	}
	readVectors(t, "testdata/displacement.json", &vectors)
	if len(vectors.Cases) < 5 {
		t.Fatalf("only %d cases", len(vectors.Cases))
	}
	for i, v := range vectors.Cases {
		s := build(t, "record", context(v.Step, 100, Target), kind.Values{
			"file": kind.Text("shake.txt"), "step": kind.Num(0.02), "unit": kind.Text("m/s^2"),
			"start": kind.Num(v.Start), "end": kind.Num(v.End),
			"length_factor": kind.Num(v.Factor), "corner_frequency": kind.Num(v.Corner)}).(*integrated)
		a, x := 0.0, 0.0
		for k, want := range v.Acceleration {
			a = max(a, math.Abs(s.a[7*k]-want)/largest(v.Acceleration))
		}
		for k, got := range filled(s, len(v.Want)) {
			x = max(x, math.Abs(got-v.Want[k])/largest(v.Want))
		}
		t.Logf("case %d: acceleration within %.2g, displacement within %.2g of the peak", i, a, x)
		// SciPy's direct form loses (2π·corner·step)² of its digits, 1e-16 over
		// 1.6e-4 at 0.1 Hz, so 1e-12 of the peak acceleration; the displacement
		// sums that up over a hundred samples of a period.
		if a > 2e-12 || x > 2e-10 {
			t.Errorf("case %d: acceleration off by %.2g, displacement by %.2g of the peak", i, a, x)
		}
	}
}

// burst is a displacement in closed form, A·exp(−(t−tc)²/2s²)·cos(2πf(t−tc)),
// and its acceleration. Its spectrum is 1e-12 of its peak below 0.1 Hz.
const (
	burstA, burstS, burstF, burstC = 0.05, 0.8, 1.5, 8.
	burstStep, burstEnd            = 0.005, 16.
)

func burst(t float64) (x, a float64) {
	const w = 2 * math.Pi * burstF
	u := t - burstC
	g := burstA * math.Exp(-u*u/(2*burstS*burstS))
	// (g·cos)″ = g″·cos − 2·g′·w·sin − w²·g·cos
	r := u / (burstS * burstS)
	sin, cos := math.Sincos(w * u)
	return g * cos, g * ((r*r-1/(burstS*burstS)-w*w)*cos + 2*r*w*sin)
}

func burstRecord(offset, drift float64) []float64 {
	a := make([]float64, int(burstEnd/burstStep)+1)
	for k := range a {
		t := float64(k) * burstStep
		_, a[k] = burst(t)
		a[k] += offset + drift*t
	}
	return a
}

// burstBound bounds what the high-pass takes away, ∫|X|(1 − 1/(1 + (fc/f)⁸))df
// over all frequencies of both signs, and what is neglected below of the
// linear interpolation: (ωΔ)⁴/360 in the band (sinc² expanded), and the images
// at 1/Δ, (ωΔ)⁴/320, of all ω at once by the spectrum.
func burstBound(corner float64) (highpass, rest float64) {
	const h = 1e-3
	for f := h / 2; f < 4; f += h {
		spectrum := 0.0
		for _, sign := range []float64{1, -1} {
			d := 2 * math.Pi * burstS * (f + sign*burstF)
			spectrum += burstA * burstS * math.Sqrt(2*math.Pi) / 2 * math.Exp(-d*d/2)
		}
		r := math.Pow(corner/f, 8)
		highpass += 2 * spectrum * r / (1 + r) * h
		rest += 2 * spectrum * math.Pow(2*math.Pi*f*burstStep, 4) * (1./360 + 1./320) * h
	}
	return highpass, rest
}

func TestTargetOfAnAccelerationIsTheKnownDisplacement(t *testing.T) {
	const step = 0.0017
	n := int(math.Floor(burstEnd / step))
	for _, corner := range []float64{0.05, 0.1, 0.3} {
		highpass, rest := burstBound(corner)
		worst := 0.0
		for k, got := range filled(moved(t, burstRecord(0, 0), burstStep, step, kind.Values{"corner_frequency": kind.Num(corner)}), n) {
			// An acceleration taken linear between samples is that of the
			// displacement x + Δ²/12·x″, and higher powers.
			x, a := burst(float64(k) * step)
			worst = max(worst, math.Abs(got-x-burstStep*burstStep/12*a))
		}
		t.Logf("corner %g Hz: within %.2g m of a peak of %g m; bounds %.2g for the high-pass, %.2g for the samples", corner, worst, burstA, highpass, rest)
		// The digital filter bends frequencies by (πf·Δ)²/3, 0.02 %, and its
		// power by eight times that; rounding adds 1e-13.
		if bound := 1.01*highpass + rest + 1e-13; worst > bound {
			t.Errorf("corner %g Hz: off by %.3g m, bound %.3g m", corner, worst, bound)
		}
	}
}

func TestOffsetAndDriftAreTakenOff(t *testing.T) {
	plain := filled(moved(t, burstRecord(0, 0), burstStep, 0.0017, nil), 10000)
	for _, b := range []struct{ offset, drift float64 }{{0.3, 0}, {0, 0.02}, {-2, 0.5}} {
		got := filled(moved(t, burstRecord(b.offset, b.drift), burstStep, 0.0017, nil), 10000)
		for k := range got {
			// Rounding of the sums of numbers up to 6 m/s², twice integrated:
			// unfiltered the offset alone would make 38 m.
			if math.Abs(got[k]-plain[k]) > 1e-11 {
				t.Fatalf("offset %g, drift %g: sample %d is %v, without them %v", b.offset, b.drift, k, got[k], plain[k])
			}
		}
	}
}

// shake reads testdata/shake.txt as a target.
func shake(t *testing.T, step float64, more kind.Values) *integrated {
	t.Helper()
	v := kind.Values{"file": kind.Text("shake.txt"), "step": kind.Num(0.02), "unit": kind.Text("m/s^2")}
	for name, value := range more {
		v[name] = value
	}
	return build(t, "record", context(step, 100, Target), v).(*integrated)
}

func TestAccelerationOfTheTargetIsTheCorrectedRecord(t *testing.T) {
	const h = 1. / 2048
	s := shake(t, h, nil)
	x := filled(s, 30000)
	peak := largest(s.a)
	inner, across := 0.0, 0.0
	for k := 1; k < len(x)-1; k++ {
		at := float64(k) * h / 0.02
		j := int(at)
		if j >= len(s.a)-2 {
			break
		}
		want := s.a[j] + (at-float64(j))*(s.a[j+1]-s.a[j])
		d := math.Abs((x[k-1]-2*x[k]+x[k+1])/(h*h)-want) / peak
		if lo, hi := at-h/0.02, at+h/0.02; lo >= float64(j) && hi <= float64(j+1) {
			inner = max(inner, d)
		} else {
			across = max(across, d)
		}
	}
	t.Logf("between samples within %.2g of the peak acceleration, across them within %.2g", inner, across)
	// Between samples a second difference of a cubic is its second derivative;
	// rounding of x, 1e-17 m, over h² is 1e-10. Across a sample it is the mean
	// under a triangle of half width h, whose worst, on the sample, is off by
	// h/6 times the change of slope: h/(6Δ) of twice the largest difference of
	// neighbours, itself at most twice the peak.
	if inner > 1e-8 || across > h/(6*0.02)*4 {
		t.Errorf("between samples off by %.2g of the peak acceleration, across them by %.2g", inner, across)
	}
}

func TestTargetStartsAndEndsAtRest(t *testing.T) {
	for _, given := range []kind.Values{
		nil,
		{"start": kind.Num(3), "end": kind.Num(9)}, // cut out of the strong motion
		{"corner_frequency": kind.Num(0.01)},       // a corner period of seven records
		{"corner_frequency": kind.Num(1)},
		{"length_factor": kind.Num(0.3)},
		{"start": kind.Num(2), "end": kind.Num(2.3)}, // the fewest samples
	} {
		const parts = 16 // of a record step
		s := shake(t, 0.02*math.Sqrt(orOne(given, "length_factor"))/parts, given)
		n := (len(s.a) - 1) * parts
		x := filled(s, n+1000)
		peak, h := largest(x), s.step
		// At rest displacement grows as a·t²/2: from zero, and back into it.
		grown := 1.01*largest(s.a)*h*h/2 + 1e-14
		for _, k := range []int{1, n - 1} {
			if x[0] != 0 || math.Abs(x[k]) > grown {
				t.Errorf("%v: sample %d of %d is %v, at rest it was at most %v", given, k, n, x[k], grown)
			}
		}
		if largest(x[n:]) > 1e-13*peak || largest(x[n+1:]) != 0 {
			t.Errorf("%v: %v after the end", given, largest(x[n:]))
		}
	}
}

func orOne(v kind.Values, name string) float64 {
	if v.Has(name) {
		return v.Num(name)
	}
	return 1
}

func TestSimilitudeOfATarget(t *testing.T) {
	// A quarter of the length: half the time, a quarter of the displacement,
	// and the same acceleration. Powers of two, so bit for bit.
	const h = 1. / 1024
	whole := shake(t, h, nil)
	model := shake(t, h/2, kind.Values{"length_factor": kind.Num(0.25)})
	if !slices.Equal(whole.a, model.a) {
		t.Error("the accelerations differ")
	}
	x, y := filled(whole, 15000), filled(model, 15000)
	peakX, peakY := 0.0, 0.0
	for k := range x {
		if y[k] != x[k]/4 {
			t.Fatalf("sample %d: %v is not a quarter of %v", k, y[k], x[k])
		}
		if k > 1 {
			peakX = max(peakX, math.Abs(x[k-2]-2*x[k-1]+x[k])/(h*h))
			peakY = max(peakY, math.Abs(y[k-2]-2*y[k-1]+y[k])/(h*h/4))
		}
	}
	// 1e-17 m over h² on either side, and the peak between samples of the loop.
	if math.Abs(peakX-peakY) > 1e-9 || math.Abs(peakX/largest(whole.a)-1) > 0.02 {
		t.Errorf("peak accelerations %v and %v, record %v", peakX, peakY, largest(whole.a))
	}
}

func TestSimilitudeOfOtherRecords(t *testing.T) {
	for _, tt := range []struct {
		drives Drives
		unit   string
		values float64 // factor on the values
	}{{Ground, "m/s^2", 1}, {Target, "m", 0.25}} {
		for _, file := range []string{"column1.txt", "blanks.txt", "uneven.txt"} {
			given := kind.Values{"file": kind.Text(file), "unit": kind.Text(tt.unit)}
			if file == "column1.txt" {
				given["step"] = kind.Num(0.02)
			}
			if file == "uneven.txt" {
				given["start"] = kind.Num(0.52)
			}
			x := filled(build(t, "record", context(1./512, 10, tt.drives), given), 1000)
			given["length_factor"] = kind.Num(0.25)
			y := filled(build(t, "record", context(1./1024, 10, tt.drives), given), 1000)
			for k := range x {
				if y[k] != tt.values*x[k] {
					t.Errorf("%s, %s: sample %d is %v, of the whole %v", Words[tt.drives], file, k, y[k], x[k])
					break
				}
			}
		}
	}
	// The last sample is met at a factor whose root is no round number.
	x := filled(build(t, "record", context(0.02*math.Sqrt(0.3), 10, Ground), kind.Values{"file": kind.Text("column1.txt"),
		"unit": kind.Text("m/s^2"), "step": kind.Num(0.02), "length_factor": kind.Num(0.3)}), 30)
	for k, got := range x {
		want := 0.0
		if k < len(motion) {
			want = motion[k]
		}
		if math.Abs(got-want) > 1e-13 {
			t.Errorf("sample %d is %v, want %v", k, got, want)
		}
	}
}

func TestTimesOfAFileBecomeEvenSteps(t *testing.T) {
	digits := Record{Values: []float64{1, 2, 3, 4}, Times: []float64{0.33, 0.67, 1, 1.33}}
	a, step, err := evenly(&digits)
	if err != nil || math.Abs(step-1./3) > 1e-15 || !slices.Equal(a, digits.Values) {
		t.Errorf("thirds in two digits: %v at %v, %v", a, step, err)
	}
	bent := Record{Values: []float64{0, 4, 2, 8}, Times: []float64{1, 2, 2.5, 4}}
	a, step, err = evenly(&bent)
	if err != nil || step != 0.5 || !slices.Equal(a, []float64{0, 2, 4, 2, 4, 6, 8}) {
		t.Errorf("filled up: %v at %v, %v", a, step, err)
	}
	fast := Record{Values: []float64{0, 4, 2}, Times: []float64{0, 1e-6, 100}}
	if _, _, err := evenly(&fast); errText(err) != "file: intervals from 1e-06 s on in a record of 100 s; at even steps that is more than 1e+07 samples" {
		t.Error(err)
	}
	// The same record with and without its instants.
	even := filled(shake(t, 0.003, nil), 4000)
	var text strings.Builder
	for k, x := range readColumn(t) {
		fmt.Fprintf(&text, "%.2f %.5f\n", float64(k)*0.02+5, x)
	}
	c := context(0.003, 100, Target)
	c.Open = openText(text.String())
	timed := filled(build(t, "record", c, kind.Values{"file": kind.Text("x"), "unit": kind.Text("m/s^2")}), 4000)
	for k := range even {
		if math.Abs(even[k]-timed[k]) > 1e-13 { // the step is rounded otherwise
			t.Fatalf("sample %d: %v with instants, %v without", k, timed[k], even[k])
		}
	}
}

func readColumn(t *testing.T) []float64 {
	t.Helper()
	f, err := openTestdata("shake.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rec, err := ReadRecord(f, "shake.txt", 0.02)
	if err != nil {
		t.Fatal(err)
	}
	return rec.Values
}

func TestTargetErrorsNameTheSetting(t *testing.T) {
	for _, tt := range []struct {
		drives Drives
		given  kind.Values
		want   string
	}{
		{Target, kind.Values{"unit": kind.Text("m/s")}, `unit: "m/s" is a velocity (m/s); with drives = "target" it must be a length (m) or an acceleration (m/s^2)`},
		{Target, kind.Values{"start": kind.Num(1), "end": kind.Num(1.28)}, "file: 15 samples between start and end; an acceleration that is integrated needs at least 16"},
		{Target, kind.Values{"corner_frequency": kind.Num(2.6)}, "corner_frequency: 2.6 Hz leaves fewer than 20 samples of 0.02 s to its period"},
		{Target, kind.Values{"corner_frequency": kind.Num(0)}, "corner_frequency: 0 Hz is below 0.001 Hz; allowed is a frequency (Hz), 0.001 Hz to 200 Hz"},
		{Target, kind.Values{"corner_frequency": kind.Num(0.001), "step": kind.Num(1e-4)}, "corner_frequency: at 0.001 Hz the filter needs 6e+07 samples of 0.0001 s beside the record; at most 4e+06"},
		{Target, kind.Values{"length_factor": kind.Num(0)}, "length_factor: 0 is below 0.0001; allowed is a plain number, 0.0001 to 10000"},
		{Force, kind.Values{"length_factor": kind.Num(0.5), "unit": kind.Text("N")}, `length_factor: 0.5; with drives = "force" it must be 1, for how forces scale hangs on the material too`},
		{Force, kind.Values{"unit": kind.Text("N")}, ""},
	} {
		v := kind.Values{"file": kind.Text("shake.txt"), "step": kind.Num(0.02), "unit": kind.Text("g")}
		for name, value := range tt.given {
			v[name] = value
		}
		if _, err := try("record", context(0.001, 2, tt.drives), v); errText(err) != tt.want {
			t.Errorf("got  %v\nwant %s", err, tt.want)
		}
	}
}
