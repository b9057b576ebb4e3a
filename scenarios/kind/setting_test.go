package kind

import (
	"math"
	"reflect"
	"strings"
	"testing"

	"antelag/scenarios/quantity"
)

var (
	delay     = Number("delay", quantity.Time, "a delay").Range(0, 0.5)
	ratio     = Number("ratio", quantity.None, "a ratio").Range(-1, 1)
	order     = Integer("order", "an order").Range(0, 4)
	seed      = Integer("seed", "a seed").Range(0, 1<<53)
	hold      = Word("hold", "a hold", "ramp", "step")
	file      = FreeText("file", "a file")
	lengths   = Numbers("lengths", quantity.Length, "lengths").Range(0, 10)
	masses    = Matrix("masses", quantity.Mass, "masses").Range(-1e9, 1e9)
	amplitude = Driven("amplitude", "an amplitude").Range(0, 1e6)
)

func row(items ...any) []any { return items }

// What a TOML file can hold comes out in SI.
func TestRead(t *testing.T) {
	for _, c := range []struct {
		setting Setting
		raw     any
		want    Value
	}{
		{delay, "12 ms", Num(0.012)},
		{delay, " 0.5 s ", Num(0.5)},
		{delay, "0 min", Num(0)},
		{delay, int64(0), Num(0)}, // nothing is nothing in every unit
		{delay, 0.0, Num(0)},
		{ratio, 0.25, Num(0.25)},
		{ratio, int64(-1), Num(-1)},
		{ratio, 1, Num(1)},
		{ratio, "0.25", Num(0.25)},
		{ratio, "25 %", Num(0.25)},
		{order, int64(3), Num(3)},
		{order, 3.0, Num(3)},
		{order, "3", Num(3)},
		{seed, int64(1 << 53), Num(1 << 53)},
		{hold, "step", Text("step")},
		{file, "a b.txt", Text("a b.txt")},
		{lengths, row("1 mm", "2 in", int64(0)), List(0.001, 0.0508, 0)},
		{lengths, "2 m", List(2)}, // a single value is a list of one
		{masses, row(row("1 t", "2 kg"), row("-3 t", int64(0))), Value{List: []float64{1000, 2, -3000, 0}, Rows: 2}},
		{masses, row("1 t", "2 t"), Value{List: []float64{1000, 2000}, Rows: 2}},
		{amplitude.In(quantity.Acceleration), "0.5 g", Num(0.5 * 9.80665)},
		{amplitude.In(quantity.Force), "5 kN", Num(5000)},
		{amplitude.In(quantity.Length), "5 mm", Num(0.005)},
	} {
		got, err := c.setting.Read(c.raw)
		if err != nil || !reflect.DeepEqual(got, c.want) {
			t.Errorf("%s = %#v: %+v, %v; want %+v", c.setting.Name, c.raw, got, err, c.want)
		}
	}
}

// What cannot be read says what was found and what is allowed.
func TestReadErrors(t *testing.T) {
	const aTime, whole, mass = "allowed is a time (s), 0 s to 500 ms", "allowed is a whole number, 0 to 4", "rows of values, each a mass (kg)"
	for _, c := range []struct {
		setting Setting
		raw     any
		want    string
	}{
		{delay, "12 mm", `"12 mm" is a length (m); it must be a time (s); ` + aTime},
		{delay, "12", `"12" has no unit; it must be a time (s); ` + aTime},
		{delay, int64(12), `12 has no unit; ` + aTime + ", in quotes with its unit"},
		{delay, 0.012, `0.012 has no unit; ` + aTime},
		{delay, math.NaN(), `NaN has no unit; ` + aTime},
		{delay, "", "no value given; " + aTime},
		{delay, "nan s", `"nan s" does not begin with a finite number; ` + aTime},
		{delay, "1e999 s", `"1e999 s" does not begin with a finite number; ` + aTime},
		{delay, "12 mz", `"12 mz": unknown unit "mz"`},
		{delay, true, "true is not a number; " + aTime},
		{delay, row("1 ms"), "[1 ms] is not a number; " + aTime},
		{delay, map[string]any{"a": 1}, "map[a:1] is not a number; " + aTime},
		{delay, "-1 ms", "-1 ms is below 0 s; " + aTime},
		{delay, "0.6 s", "600 ms is above 500 ms; " + aTime},
		{delay, "500.0000001 ms", "0.5000000001 s is above 0.5 s; " + aTime}, // in six digits the two are alike
		{ratio, math.NaN(), "NaN is no finite number; allowed is a plain number, -1 to 1"},
		{ratio, math.Inf(1), "+Inf is no finite number; allowed is a plain number, -1 to 1"},
		{ratio, "1 mm", `"1 mm" is a length (m); it must be a plain number; allowed is a plain number, -1 to 1`},
		{ratio, 1.5, "1.5 is above 1; allowed is a plain number, -1 to 1"},
		{order, 2.5, "2.5 is not a whole number; " + whole},
		{order, int64(5), "5 is above 4; " + whole},
		{order, int64(-1), "-1 is below 0; " + whole},
		{order, math.Inf(-1), "-Inf is no finite number; " + whole},
		{order, "3 mm", `"3 mm" is a length (m); it must be a plain number; ` + whole},
		{seed, 1e16, "10000000000000000 is above 9007199254740992; allowed is a whole number, 0 to 9007199254740992"},
		{hold, "rmap", `unknown word "rmap"; did you mean "ramp"? (known: ramp, step)`},
		{hold, int64(1), "1 is not a text; allowed is one of ramp, step"},
		{file, "", "is empty; it must be a text"},
		{file, 1.5, "1.5 is not a text; allowed is a text"},
		{lengths, row(), "is empty; it must be a list, each a length (m), 0 m to 10 m"},
		{lengths, row("1 mm", "1 s"), `"1 s" is a time (s); it must be a length (m)`},
		{lengths, row("1 mm", "-1 mm"), "-1 mm is below 0 m"},
		{lengths, row(row("1 m")), "[1 m] is not a number"},
		{masses, "1 t", "1 t is not a list of rows; allowed is " + mass},
		{masses, row(), "is empty; it must be " + mass},
		{masses, row(row()), "is empty; it must be " + mass},
		{masses, row(row("1 t"), row("1 t", "2 t")), "row 2 has 2 values, the first has 1"},
		{masses, row(row("1 t"), row("1 s")), `row 2: "1 s" is a time (s); it must be a mass (kg)`},
		{amplitude.In(quantity.Force), "5 mm", `"5 mm" is a length (m); it must be a force (N)`},
	} {
		got, err := c.setting.Read(c.raw)
		if err == nil || !strings.HasPrefix(err.Error(), c.want) {
			t.Errorf("%s = %#v: %+v\ngot  %v\nwant %s", c.setting.Name, c.raw, got, err, c.want)
		}
	}
}

func TestCheck(t *testing.T) {
	for _, c := range []struct {
		setting Setting
		value   Value
		want    string // "" is allowed
	}{
		{delay, Num(0), ""},
		{delay, Num(0.5), ""},
		{delay, Num(math.Nextafter(0.5, 1)), "0.5000000000000001 s is above 0.5 s"},
		{delay, Num(math.NaN()), "NaN is no finite number"},
		{Number("x", quantity.Length, "free"), Num(-1e300), ""},
		{Number("x", quantity.Length, "free"), Num(math.Inf(1)), "+Inf is no finite number; allowed is a length (m)"},
		{order, Num(4), ""},
		{order, Num(3.999), "3.999 is not a whole number"},
		{hold, Text("step"), ""},
		{hold, Text(""), `unknown word ""`},
		{file, Text("x"), ""},
		{lengths, List(0, 10), ""},
		{lengths, List(0, 11), "11 m is above 10 m"},
		{lengths, Value{}, "is empty"},
		{masses, Value{List: []float64{1}, Rows: 1}, ""},
		{masses, Value{List: []float64{math.NaN()}, Rows: 1}, "NaN is no finite number"},
	} {
		err := c.setting.Check(c.value)
		switch {
		case c.want == "" && err != nil:
			t.Errorf("%s = %+v: %v", c.setting.Name, c.value, err)
		case c.want != "" && (err == nil || !strings.HasPrefix(err.Error(), c.want)):
			t.Errorf("%s = %+v: got %v, want %s", c.setting.Name, c.value, err, c.want)
		}
	}
}

func TestAllowed(t *testing.T) {
	for _, c := range []struct {
		setting         Setting
		allowed, range_ string
	}{
		{delay, "a time (s), 0 s to 500 ms", "0 s to 500 ms"},
		{ratio, "a plain number, -1 to 1", "-1 to 1"},
		{order, "a whole number, 0 to 4", "0 to 4"},
		{seed, "a whole number, 0 to 9007199254740992", "0 to 9007199254740992"},
		{hold, "one of ramp, step", ""},
		{file, "a text", ""},
		{lengths, "a list, each a length (m), 0 m to 10 m", "0 m to 10 m"},
		{Matrix("k", quantity.Stiffness, ""), "rows of values, each a stiffness (N/m)", ""},
		{amplitude, "an amplitude of what is driven, 0 to 1e+06", "0 to 1e+06"},
		{amplitude.In(quantity.Force), "a force (N), 0 N to 1 MN", "0 N to 1 MN"},
		{Number("x", quantity.Length, "").Range(0.001, math.Inf(1)), "a length (m), at least 1 mm", "at least 1 mm"},
		{Number("x", quantity.Length, "").Range(math.Inf(-1), 2), "a length (m), at most 2 m", "at most 2 m"},
		{Number("x", quantity.Length, ""), "a length (m)", ""},
	} {
		if got := c.setting.Allowed(); got != c.allowed {
			t.Errorf("%s: allowed is %q, want %q", c.setting.Name, got, c.allowed)
		}
		if !strings.HasPrefix(c.allowed, "one of") && c.allowed != "a text" {
			if got := c.setting.RangeText(); got != c.range_ {
				t.Errorf("%s: range is %q, want %q", c.setting.Name, got, c.range_)
			}
		}
	}
}

func TestFormatValue(t *testing.T) {
	for _, c := range []struct {
		setting Setting
		value   Value
		want    string
	}{
		{delay, Num(0.012), "12 ms"}, {ratio, Num(0.25), "0.25"}, {order, Num(3), "3"}, {seed, Num(1234567), "1234567"},
		{hold, Text("step"), "step"}, {file, Text("a.txt"), "a.txt"}, {lengths, List(0.001, 2), "1 mm, 2 m"},
		{masses, Value{List: []float64{1000, 20}, Rows: 1}, "1 t, 20 kg"},
	} {
		if got := c.setting.FormatValue(c.value); got != c.want {
			t.Errorf("%s: got %q, want %q", c.setting.Name, got, c.want)
		}
	}
}

// What an example shows can be read back; optional settings are left out.
func TestExampleValue(t *testing.T) {
	for _, c := range []struct {
		setting Setting
		want    string // "" is left out
	}{
		{delay, `"10 ms"`},
		{delay.Default(0.012), `"12 ms"`},
		{delay.Optional(), ""},
		{delay.Optional().Sample(`"3 ms"`), `"3 ms"`},
		{delay.Default(0.012).Sample(`"3 ms"`), `"3 ms"`},
		{ratio, "0.5"},
		{Number("rate", quantity.Frequency, "").Range(10, 1e5), `"10 Hz"`}, // the typical 2 Hz is too low
		{Number("rate", quantity.Frequency, "").Range(0.1, 1), `"1 Hz"`},
		{ratio.Default(-0.25), "-0.25"},
		{order.Default(3), "3"},
		{hold, `"ramp"`},
		{file, `"motion.txt"`},
		{file.DefaultText("CR"), `"CR"`},
		{file.Optional(), ""},
		{amplitude, `"0.2 g"`},
		{Number("a", quantity.Acceleration, "").Default(2), `"2 m/s^2"`}, // as it is typed, not as it is printed
		{Number("d", quantity.Damping, "").Default(5000), `"5 kN*s/m"`},
	} {
		text, ok := c.setting.ExampleValue()
		if ok != (c.want != "") || text != c.want {
			t.Errorf("%s: %q, %v; want %q", c.setting.Name, text, ok, c.want)
		}
	}
}

func TestPresence(t *testing.T) {
	for _, c := range []struct {
		setting                       Setting
		required, defaulted, optional bool
	}{
		{delay, true, false, false},
		{delay.Default(1), false, true, false},
		{delay.Optional(), false, false, true},
		{hold, false, true, false},
		{file, true, false, false},
		{file.DefaultText("x"), false, true, false},
	} {
		s := &c.setting
		if s.IsRequired() != c.required || s.HasDefault() != c.defaulted || s.IsOptional() != c.optional {
			t.Errorf("%+v", s)
		}
	}
	if hold.Fallback.Text != "ramp" {
		t.Errorf("the first word is not the default: %+v", hold.Fallback)
	}
	if err := delay.Missing("wobbler"); err.Error() != "is missing; wobbler needs it: a delay, a time (s), 0 s to 500 ms" {
		t.Errorf("%v", err)
	}
	if in := amplitude.In(quantity.Force); !amplitude.Driven || in.Driven || in.Dim != quantity.Force {
		t.Errorf("%+v", in)
	}
	if in := delay.In(quantity.Force); in.Dim != quantity.Time {
		t.Errorf("%+v", in)
	}
}
