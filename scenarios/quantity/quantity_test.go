package quantity

import (
	"math"
	"strings"
	"testing"
)

func TestParse(t *testing.T) {
	for _, c := range []struct {
		text string
		want float64
		dim  Dim
	}{
		{"8 ms", 0.008, Time},
		{"14ms", 0.014, Time},
		{"24 kN/mm", 24e6, Stiffness},
		{"60 t", 60e3, Mass},
		{"0.3 g", 0.3 * StandardGravity, Acceleration},
		{"12 kN*s/m", 12e3, Damping},
		{"12 kN·s/m", 12e3, Damping},
		{"12 kN s/m", 12e3, Damping},
		{"0.4 mm^-2", 4e5, PerArea},
		{"0.4 mm⁻²", 4e5, PerArea},
		{"3 m²", 3, Area},
		{"3 m2", 3, Area},
		{"9.81 m/s^2", 9.81, Acceleration},
		{"9.81 m/s/s", 9.81, Acceleration},
		{"-5 mm", -0.005, Length},
		{"+.5e1 m", 5, Length},
		{"1e3", 1000, None},
		{"12 %", 0.12, None},
		{"100 L/min", 0.1 / 60, Flow},
		{"3 rad", 3, Angle},
		{"0.175 1/mm", 175, PerLength},
		{"0.175 /mm", 175, PerLength},
		{"2 1/s", 2, Frequency},
		{"66 gpm", 66 * 3.785411784e-3 / 60, Flow},
		{"5 N*mm/mm", 5, Force},
		// National Institute of Standards and Technology, Special Publication
		// 811, appendix B: 1 in = 0.0254 m, 1 lbf = 4.448222 N, 1 psi = 6894.757 Pa.
		{"1 in", 0.0254, Length},
		{"1 kip", 4448.222, Force},
		{"1 ksi", 6894757, Pressure},
		{"0.2533 kip*s^2/in", 0.2533 * 4448.222 / 0.0254, Mass},
	} {
		got, dim, err := Parse(c.text)
		if err != nil {
			t.Errorf("%q: %v", c.text, err)
			continue
		}
		// The published factors have seven digits; all else is exact to rounding.
		if math.Abs(got-c.want) > 2e-7*math.Abs(c.want) || dim != c.dim {
			t.Errorf("%q = %v %v, want %v %v", c.text, got, dim, c.want, c.dim)
		}
	}
}

// Decimal values that people write must become the float64 nearest to them,
// not one beside it, or settings would not compare equal to those in code.
func TestParseNearest(t *testing.T) {
	for text, want := range map[string]float64{
		"8 ms": 0.008, "14 ms": 0.014, "0.02 mm": 0.02 / 1000, "0.3 mm": 0.3 / 1000, "7 um": 7e-6, "33 cm": 0.33,
	} {
		if got, _, err := Parse(text); err != nil || got != want {
			t.Errorf("%q = %.17g, %v, want %.17g", text, got, err, want)
		}
	}
}

func TestParseErrors(t *testing.T) {
	for text, want := range map[string]string{
		"":             "no value given",
		"fast":         `"fast" does not begin with a finite number`,
		"NaN s":        `"NaN s" does not begin with a finite number`,
		"inf m":        `"inf m" does not begin with a finite number`,
		"1e999 m":      `"1e999 m" does not begin with a finite number`,
		"1e300 km^9":   `"1e300 km^9" is beyond the largest number`,
		"5 kn":         `"5 kn": unknown unit "kn"; did you mean "kN"?`,
		"5 furlong":    `"5 furlong": unknown unit "furlong"; known are`,
		"5 m^":         `"5 m^": a power is missing behind "m^"`,
		"5 m//s":       `"5 m//s": a unit is missing at "/s"`,
		"5 m/":         `"5 m/": a unit is missing at ""`,
		"5 m^99":       `"5 m^99": unit "m^99": power out of range`,
		"5 m^5*m^5":    `"5 m^5*m^5": unit "m^5*m^5": power out of range`,
		"5 5":          `"5 5": a unit is missing at "5"`,
		"1 m^99999999": "power out of range",
		"- m":          `"- m" does not begin with a finite number`,
	} {
		_, _, err := Parse(text)
		if err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: got error %v, want %q", text, err, want)
		}
	}
}

func TestParseAsNamesBothDimensions(t *testing.T) {
	for _, c := range []struct {
		text string
		dim  Dim
		want string
	}{
		{"8 mm", Time, `"8 mm" is a length (m); it must be a time (s)`},
		{"8", Time, `"8" has no unit; it must be a time (s)`},
		{"3 rad/s", Frequency, `"3 rad/s" is a value in s^-1*rad; it must be a frequency (Hz)`},
		{"3 kg", None, `"3 kg" is a mass (kg); it must be a plain number`},
	} {
		_, err := ParseAs(c.text, c.dim)
		if err == nil || err.Error() != c.want {
			t.Errorf("%q: got %v, want %s", c.text, err, c.want)
		}
	}
}

func TestFormat(t *testing.T) {
	for _, c := range []struct {
		si          float64
		dim         Dim
		long, short string
	}{
		{0.008, Time, "8.000 ms", "8 ms"},
		{24e6, Stiffness, "24.00 kN/mm", "24 kN/mm"},
		{0.00002, Length, "0.02000 mm", "0.02 mm"},
		{3e-6, Length, "3.000 µm", "3 µm"},
		{-0.0123456, Length, "-12.35 mm", "-12.3456 mm"},
		{1.5, Length, "1.500 m", "1.5 m"},
		{60e3, Mass, "60.00 t", "60 t"},
		{0, Force, "0 N", "0 N"},
		{0.0312, None, "0.03120", "0.0312"},
		{30, Time, "30.00 s", "30 s"},
		{2048, Frequency, "2048 Hz", "2048 Hz"},
		{1e12, Stiffness, "1e+06 kN/mm", "1e+06 kN/mm"},
		{math.NaN(), Time, "–", "–"},
	} {
		if got := Format(c.si, c.dim); got != c.long {
			t.Errorf("Format(%v) = %q, want %q", c.si, got, c.long)
		}
		if got := Short(c.si, c.dim); got != c.short {
			t.Errorf("Short(%v) = %q, want %q", c.si, got, c.short)
		}
	}
}

// Every dimension that has a name is readable in its own SI unit and in every
// unit that it is shown in.
func TestNamedDimensionsReadBack(t *testing.T) {
	for dim, n := range names {
		for _, unit := range append(n.read, n.si) {
			u, err := ParseUnit(unit)
			if err != nil || u.Dim != dim {
				t.Errorf("%s: unit %q reads as %v, %v", dim, unit, u.Dim, err)
			}
		}
	}
}

func FuzzParse(f *testing.F) {
	for _, s := range []string{"8 ms", "24 kN/mm", "0.4 mm⁻²", "12 kN·s/m", "-1e-3", "5 m//s", "3 %", "1e308 km", "٣ m", "1 µm²"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		si, dim, err := Parse(text)
		if err != nil {
			return
		}
		if math.IsNaN(si) || math.IsInf(si, 0) {
			t.Fatalf("%q gave %v", text, si)
		}
		// What is written exactly must read back as the very same value.
		back, backDim, err := Parse(Exact(si, dim))
		if err != nil || back != si || backDim != dim {
			t.Fatalf("%q: %q reads back as %v %v, %v", text, Exact(si, dim), back, backDim, err)
		}
		if Plain(si, dim) == "" || Format(si, dim) == "" {
			t.Fatalf("%q: nothing shown", text)
		}
	})
}
