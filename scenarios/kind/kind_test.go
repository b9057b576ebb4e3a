package kind

import (
	"errors"
	"reflect"
	"strings"
	"testing"

	"antelag/scenarios/quantity"
)

// wobbler is a kind with a setting of every presence.
var wobbler = Kind{
	Name: "wobbler", Doc: "wobbles", Source: "invented",
	Settings: []Setting{
		Number("stiffness", quantity.Stiffness, "how hard it is to move").Range(0, 1e9),
		Number("delay", quantity.Time, "how late it wobbles").Default(0.01).Range(0, 0.5),
		Integer("order", "how often").Default(2).Range(0, 4),
		Word("hold", "how it gets there", "ramp", "step"),
		Number("limit", quantity.Length, "how far it may go").Optional(),
	},
}

func TestNearest(t *testing.T) {
	known := []string{"none", "polynomial", "inverse", "adaptive-inverse", "delay", "decay", "µ"}
	for got, want := range map[string]string{
		"polinomial":   "polynomial",
		"polynomials":  "polynomial",
		"POLYNOMIAL":   "polynomial",
		"poly":         "polynomial", // its beginning
		"adaptive":     "adaptive-inverse",
		"nine":         "none",
		"dely":         "delay",
		"dekay":        "delay", // as far from decay; the first
		"invrese":      "inverse",
		"in":           "", // too short to be the beginning of anything
		"xy":           "",
		"x":            "",
		"":             "",
		"m":            "",
		"feed-forward": "",
		"élan":         "",
	} {
		if near := Nearest(got, known); near != want {
			t.Errorf("nearest to %q is %q, want %q", got, near, want)
		}
	}
	if near := Nearest("none", nil); near != "" {
		t.Errorf("nearest of nothing is %q", near)
	}
}

func TestUnknownError(t *testing.T) {
	for _, c := range []struct {
		err  UnknownError
		want string
	}{
		{UnknownError{"word", "rmap", []string{"ramp", "step"}}, `unknown word "rmap"; did you mean "ramp"? (known: ramp, step)`},
		{UnknownError{"word", "fling", []string{"ramp", "step"}}, `unknown word "fling" (known: ramp, step)`},
		{UnknownError{"lane", "fast", nil}, `unknown lane "fast" (none exists)`},
		{UnknownError{"word", "a\nb", []string{"ramp"}}, `unknown word "a\nb" (known: ramp)`},
	} {
		if got := c.err.Error(); got != c.want {
			t.Errorf("got  %s\nwant %s", got, c.want)
		}
	}
}

func TestResolve(t *testing.T) {
	stiff := Num(5e6)
	for _, c := range []struct {
		name  string
		given Values
		want  Values
	}{
		{"defaults", Values{"stiffness": stiff},
			Values{"stiffness": stiff, "delay": Num(0.01), "order": Num(2), "hold": Text("ramp")}},
		{"everything", Values{"stiffness": stiff, "delay": Num(0), "order": Num(4), "hold": Text("step"), "limit": Num(-1)},
			Values{"stiffness": stiff, "delay": Num(0), "order": Num(4), "hold": Text("step"), "limit": Num(-1)}},
	} {
		given := len(c.given)
		got, err := wobbler.Resolve(c.given)
		if err != nil || !reflect.DeepEqual(got, c.want) {
			t.Errorf("%s: %v, %v", c.name, got, err)
		}
		if len(c.given) != given {
			t.Errorf("%s: Resolve changed what it was given: %v", c.name, c.given)
		}
	}
	for _, c := range []struct {
		name  string
		given Values
		want  string
	}{
		{"missing", nil, "stiffness: is missing; wobbler needs it: how hard it is to move, a stiffness (N/m), 0 N/m to 1000 kN/mm"},
		{"unknown", Values{"stiffness": stiff, "dely": Num(1)}, `unknown setting of wobbler "dely"; did you mean "delay"? (known: stiffness, delay, order, hold, limit)`},
		{"above", Values{"stiffness": stiff, "delay": Num(2)}, "delay: 2 s is above 500 ms; allowed is a time (s), 0 s to 500 ms"},
		{"not whole", Values{"stiffness": stiff, "order": Num(1.5)}, "order: 1.5 is not a whole number; allowed is a whole number, 0 to 4"},
		{"no such word", Values{"stiffness": stiff, "hold": Text("rampe")}, `hold: unknown word "rampe"; did you mean "ramp"? (known: ramp, step)`},
	} {
		if got, err := wobbler.Resolve(c.given); err == nil || err.Error() != c.want {
			t.Errorf("%s: %v, %v\nwant %s", c.name, got, err, c.want)
		}
	}
}

func TestValues(t *testing.T) {
	v, err := wobbler.Resolve(Values{"stiffness": Num(3)})
	if err != nil {
		t.Fatal(err)
	}
	if v.Num("delay") != 0.01 || v.Int("order") != 2 || v.Text("hold") != "ramp" || v.Has("limit") || !v.Has("delay") {
		t.Errorf("%v", v)
	}
	if l := (Values{"l": List(1, 2)}).List("l"); !reflect.DeepEqual(l, []float64{1, 2}) {
		t.Errorf("%v", l)
	}
	defer func() {
		if r := recover(); r == nil || !strings.Contains(r.(string), "limit") {
			t.Errorf("asking for a setting that has no value: %v", r)
		}
	}()
	v.Num("limit")
}

func TestTable(t *testing.T) {
	table := Table[func() int]{What: "toy", Entries: []Entry[func() int]{
		{Kind: wobbler, New: func() int { return 1 }},
		{Kind: Kind{Name: "spinner"}, New: func() int { return 2 }},
	}}
	e, err := table.Find("spinner")
	if err != nil || e.New() != 2 {
		t.Fatalf("%v, %v", e, err)
	}
	if names := table.Names(); !reflect.DeepEqual(names, []string{"wobbler", "spinner"}) {
		t.Errorf("%v", names)
	}
	if kinds := table.Kinds(); len(kinds) != 2 || kinds[0] != &table.Entries[0].Kind {
		t.Errorf("%v", kinds)
	}
	_, err = table.Find("spiner")
	var unknown *UnknownError
	if !errors.As(err, &unknown) || err.Error() != `unknown toy kind "spiner"; did you mean "spinner"? (known: wobbler, spinner)` {
		t.Errorf("%v", err)
	}
	if !wobbler.Has("delay") || wobbler.Has("dely") {
		t.Error("Has does not know its settings")
	}
	s, err := wobbler.Setting("order")
	if err != nil || s != &wobbler.Settings[2] {
		t.Errorf("%v, %v", s, err)
	}
}
