package handoff

import (
	"fmt"
	"strconv"
	"strings"

	"antelag/compensator"
	"antelag/scenarios/kind"
)

// method is how one kind of compensator is written as C.
type method struct {
	kind  string
	write func(tuned) code
}

// methods is the table: one entry, in a file of its own, for every kind of
// compensator.
var methods = []method{
	noneMethod, polynomialMethod, linearAccelerationMethod, taylorMethod, modelInverseMethod, inverseMethod,
	leastSquaresPolynomialMethod, delaySeekingMethod, adaptiveInverseMethod, adaptiveTimeSeriesMethod,
}

func find(name string) (*method, error) {
	var known []string
	for i := range methods {
		if methods[i].kind == name {
			return &methods[i], nil
		}
		known = append(known, methods[i].kind)
	}
	return nil, &kind.UnknownError{What: "compensator kind with C", Got: name, Known: known}
}

// tuned is a compensator as it was tuned.
type tuned struct {
	tick   float64
	values kind.Values
	comp   compensator.Compensator
}

// coefficient returns one of the compensator's figures. Asking for one that
// the kind does not have is a mistake in the program, so it panics.
func (t *tuned) coefficient(name string) float64 {
	for _, c := range t.comp.Coefficients(nil) {
		if c.Name == name {
			return c.Value
		}
	}
	panic(fmt.Sprintf("handoff: %T has no coefficient %s", t.comp, name))
}

// code is what a method contributes to a header and a source. In all C texts
// "@" stands for the channel's identifier with an underscore, "$" for the same
// in capitals; "real" is the type of the build, float or double, and R(c) a
// constant of it.
//
// What goes through the method from input to command is real. What is learned
// from tick to tick over thousands of them is double in either build, because
// sums of that many terms drift in 24 bits.
type code struct {
	types    string   // types of the header, for members
	members  []member // of the state
	consts   []constant
	tables   string   // constant tables
	parts    []string // functions that it calls
	start    string   // body of: x and y, real, have been for ever
	prime    string   // body of: in was there, and another method commanded u
	command  string   // body of: return the command for in
	cautions []string

	// The float build's command differs from the double one's by at most so
	// many roundings, each of 2^-24 of the sum of so much of target, velocity,
	// acceleration and command; and why. A term of a sum is rounded as a
	// constant, as a product and in every sum that it goes through, each time by
	// no more than 2^-24 of the terms' magnitudes.
	roundings int
	terms     peaks
	reason    string
}

// learns cautions of methods that adapt.
var learns = []string{"This method learns from what is measured, and the guard cannot tell a sensor that drifts from an actuator that is late:" +
	" keep the bounds as narrow as the test allows, and watch what it has learned, in the members called adapted."}

// member is one member of a state struct; count is 0 for a plain one.
type member struct {
	typ, name string
	count     int
	doc       string
}

// constant is a macro in the source.
type constant struct{ name, text, doc string }

// sizes are those of the double build, where a pointer has 8 bytes. Types that
// are not here are structs of doubles.
var sizes = map[string]int{"real": 8, "double": 8, "unsigned long": 8, "unsigned": 4, "@row": 4 * 8, "@sums": 10 * 8, "@lowpass": 4 * 8}

// bytes is how much the members take.
func (c *code) bytes() int {
	sum := 0
	for _, m := range c.members {
		sum += sizes[m.typ] * max(1, m.count)
	}
	return sum
}

func (c *code) floatBound(p peaks) float64 {
	t := c.terms
	return float64(c.roundings) * unitRoundoff * (t.x*p.x + t.v*p.v + t.a*p.a + t.u*p.u)
}

// real adds a constant of the build's type.
func (c *code) real(name string, v float64, doc string) {
	c.consts = append(c.consts, constant{name, "R(" + literal(v) + ")", doc})
}

// double adds a constant that is double in either build.
func (c *code) double(name string, v float64, doc string) {
	c.consts = append(c.consts, constant{name, literal(v), doc})
}

// whole adds a whole number. C takes it for an int where it fits.
func (c *code) whole(name string, v int, doc string) {
	c.consts = append(c.consts, constant{name, strconv.Itoa(v), doc})
}

// ring adds the size of a ring that holds so many ticks: a power of two, so
// that an index beyond it comes back into it whatever it is.
func (c *code) ring(ticks int) int {
	size := 1
	for size < ticks {
		size *= 2
	}
	c.consts = append(c.consts,
		constant{"SIZE", strconv.Itoa(size), "ticks that the ring holds"},
		constant{"MASK", strconv.Itoa(size-1) + "ul", "its largest index"})
	return size
}

// literal writes a number as a C double that reads back the same.
func literal(v float64) string {
	s := strconv.FormatFloat(v, 'g', -1, 64)
	if !strings.ContainsAny(s, ".e") {
		s += ".0"
	}
	if strings.HasPrefix(s, "-") {
		s = "(" + s + ")"
	}
	return s
}

// table writes a constant table of reals.
func table(name, size string, values []float64, doc string) string {
	var b strings.Builder
	fmt.Fprintf(&b, "/* %s */\nstatic const real %s[%s] = {\n", doc, name, size)
	list(&b, "    ", values)
	b.WriteString("};\n")
	return b.String()
}

// grid writes a constant table of rows of reals.
func grid(name, rows, size string, values [][]float64, doc string) string {
	var b strings.Builder
	fmt.Fprintf(&b, "/* %s */\nstatic const real %s[%s][%s] = {\n", doc, name, rows, size)
	for _, row := range values {
		b.WriteString("    {\n")
		list(&b, "        ", row)
		b.WriteString("    },\n")
	}
	b.WriteString("};\n")
	return b.String()
}

func list(b *strings.Builder, indent string, values []float64) {
	for i, v := range values {
		if i%3 == 0 {
			b.WriteString(indent)
		}
		b.WriteString("R(" + literal(v) + "),")
		if i%3 == 2 || i == len(values)-1 {
			b.WriteByte('\n')
		} else {
			b.WriteByte(' ')
		}
	}
}

// doubles writes a constant table that is double in either build.
func doubles(name, size string, values []float64, doc string) string {
	return strings.NewReplacer("static const real", "static const double", "R(", "(").Replace(table(name, size, values, doc))
}

// literalWhole writes a whole number as a C unsigned long.
func literalWhole(n int) string { return strconv.Itoa(n) + "ul" }
