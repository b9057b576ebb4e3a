package handoff

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

// cautions stand in every file that goes to the laboratory.
var cautions = []string{
	"CAUTION. Hydraulic actuators crush. These settings come from a simulation; this code is no interlock.",
	"Keep the hardware limits, the emergency stop and the lab's procedure. Local codes and the responsible licensed engineer decide.",
}

// about says what the file is and where it comes from.
func (u *unit) about() []string {
	t := u.test
	return []string{
		fmt.Sprintf("Delay compensator of channel %s, written by antelag %s.", quoted(u.Name), plain(t.Version)),
		"", cautions[0], cautions[1], "",
		"  scenario " + quoted(t.Scenario) + ", " + quoted(t.Title),
		"  lane " + quoted(t.Lane),
		"  digest of the resolved scenario, SHA-256 of scenario.toml: " + u.digest,
	}
}

// settings lists the settings with their units.
func (u *unit) settings() []string {
	k := u.entry
	out := []string{
		"",
		"Method " + k.Name + ": " + plain(ascii(k.Doc)),
		"  " + plain(ascii(k.Equation)),
		"  source: " + plain(ascii(k.Source)), "",
		fmt.Sprintf("Settings, at %s ticks a second (dt = %s s):", number(u.test.Rate), number(u.tick)),
	}
	if len(k.Settings) == 0 {
		out = append(out, "  none")
	}
	for i := range k.Settings {
		s := &k.Settings[i]
		if v, ok := u.Values[s.Name]; ok {
			out = append(out, fmt.Sprintf("  %s = %s: %s", s.Name, plain(ascii(exactly(s, v))), plain(ascii(s.Doc))))
		}
	}
	return out
}

func exactly(s *kind.Setting, v kind.Value) string {
	if s.Type == kind.WordType {
		return v.Text
	}
	return shown(v.Num, s.Dim)
}

// shown writes a value for people, and in all its digits in SI where that is not
// the same.
func shown(v float64, dim quantity.Dim) string {
	short, exact := quantity.Short(v, dim), quantity.Exact(v, dim)
	if dim == quantity.None || short == exact {
		return exact
	}
	return short + " (" + exact + ")"
}

// ascii writes the symbols of equations and units in ASCII.
func ascii(text string) string { return letters.Replace(text) }

func number(v float64) string { return fmt.Sprintf("%.17g", v) }

// use says how to call it.
func (u *unit) use() []string {
	t := u.test
	clock := "The test runs at real speed."
	if t.Slowdown != 1 {
		clock = fmt.Sprintf("The test runs %s times slower than real time: velocities are the structure's divided by %s, accelerations divided by its square.", number(t.Slowdown), number(t.Slowdown))
	}
	how := "goes to the actuator as a ramp over the tick"
	if t.Hold == "step" {
		how = "goes to the actuator as a step at the beginning of the tick"
	}
	return []string{
		"", u.text("Use. Everything is SI and in physical time. " + clock +
			" @init once; then, in each tick from t_k to t_k+1, @step with the target at t_k+1 and what was measured at t_k." +
			" What it returns is the command for t_k+1, which " + how + "." +
			" Each call does a bounded amount of work, allocates nothing, and has no variables but the struct; several structs may be in use at once."),
		"", u.text("Guard. An input or a command beyond the limits below, or no number, raises a bit of the member flags." +
			" From then on @step returns the last good command, until @reset:" +
			" people should look before an actuator that has stopped moves again. The controller must watch flags and stop the test."),
	}
}

func (u *unit) limits() []string {
	l := u.Limits
	out := []string{"Limits of the guard:"}
	for _, m := range []struct {
		name  string
		value float64
		dim   quantity.Dim
		what  string
	}{
		{"stroke", l.stroke(), quantity.Length, "of target, measured and command"},
		{"velocity", l.Velocity, quantity.Velocity, "of the target, and of target and command over a tick"},
		{"force", l.Force, quantity.Force, "measured"},
		{"error", l.Error, quantity.Length, "between target and measured at t_k"},
	} {
		if math.IsInf(m.value, 1) {
			out = append(out, fmt.Sprintf("  %s: NOT GUARDED, the scenario gives no limit", m.name))
			continue
		}
		out = append(out, fmt.Sprintf("  %s: %s, %s", m.name, ascii(shown(m.value, m.dim)), m.what))
	}
	return out
}

// builds says what the two builds do.
func (u *unit) builds() []string {
	c := &u.code
	float := "The float build, given the same numbers, commands just the same."
	if c.roundings > 0 {
		float = fmt.Sprintf("The float build, given the same numbers, comes within %d * 2^-24 * (%s) of it, |.| being peaks: %s.", c.roundings, c.terms.text(), c.reason)
	}
	out := []string{
		"", fmt.Sprintf("Builds. real is double, or float where ANTELAG_FLOAT is defined. The double build does the operations of the program that it was tuned with, in their order,"+
			" and comes within %g of the peak command of it. %s The self-test holds both to that.", doublePart, float),
		"Do not compile with -ffast-math: the guard needs NaN to be NaN.",
		fmt.Sprintf("The state takes about %d bytes in the double build.", u.report.StateBytes),
	}
	return append(out, c.cautions...)
}

// text writes the sum of parts of peaks.
func (p peaks) text() string {
	var parts []string
	for _, t := range []struct {
		name string
		part float64
	}{{"|x|", p.x}, {"s |v|", p.v}, {"s^2 |a|", p.a}, {"|u|", p.u}} {
		switch t.part {
		case 0:
		case 1:
			parts = append(parts, t.name)
		default:
			parts = append(parts, fmt.Sprintf("%.4g %s", t.part, t.name))
		}
	}
	return strings.Join(parts, " + ")
}

// text puts the channel's names into a C text.
func (u *unit) text(c string) string {
	return strings.NewReplacer("@", u.ident+"_", "$", strings.ToUpper(u.ident)+"_").Replace(c)
}

// header writes the .h file.
func (u *unit) header() []byte {
	about := slices.Concat(u.about(), u.settings(), u.use(), u.limits(), u.builds())
	var b strings.Builder
	b.WriteString(headerTop)
	for i, f := range guardFlags {
		fmt.Fprintf(&b, "#define $%s %du /* %s */\n", f.name, 1<<i, f.doc)
	}
	b.WriteString(u.code.types)
	b.WriteString("\ntypedef struct {\n")
	for _, m := range u.code.members {
		typ, size := strings.Replace(m.typ, "real", "@real", 1), ""
		if m.count > 0 {
			size = fmt.Sprintf("[%d]", m.count)
		}
		fmt.Fprintf(&b, "    %s %s%s; /* %s */\n", typ, m.name, size, m.doc)
	}
	b.WriteString(headerBottom)
	return []byte(comment(about...) + u.text(b.String()))
}

const headerTop = `#ifndef $H
#define $H

#ifdef __cplusplus
extern "C" {
#endif

#ifdef ANTELAG_FLOAT
typedef float @real;
#else
typedef double @real;
#endif

/* What is known in the tick from t_k to t_k+1. What the method does not use may
 * be 0, but the guard looks at all of it. */
typedef struct {
    @real x; /* target displacement at t_k+1, m */
    @real v; /* target velocity at t_k+1, m/s */
    @real a; /* latest known target acceleration (at t_k), m/s^2 */
    @real y; /* measured displacement at t_k, m */
    @real r; /* measured force at t_k, N */
} @input;

/* Bits of the member flags. */
`

const headerBottom = `    /* of the guard */
    @real target;  /* the last good one, m */
    @real command; /* the last good one, m; what is held */
    unsigned flags;  /* 0: good */
} @state;

/* Comes before everything else: at rest at 0. */
void @init(@state *s);

/* Forgets the past: target and measured have been x and y, m, for ever. The
 * member command is then what keeps the actuator there. Takes back the flags; if
 * x or y is no good, it raises one instead and changes nothing else. */
void @reset(@state *s, @real x, @real y);

/* Takes in one tick in which another method commanded u, m, so that this one can
 * take over with its history filled. Follows a reset and comes before the first
 * step. The guard looks at numbers only; what u jumps by is the other's. */
void @prime(@state *s, const @input *in, @real u);

/* The command for t_k+1, m. */
@real @step(@state *s, const @input *in);

#ifdef __cplusplus
}
#endif

#endif
`

// source writes the .c file.
func (u *unit) source() []byte {
	about := append(u.about(), "", "What it does and how it is used is told in the header.")
	var b strings.Builder
	fmt.Fprintf(&b, "#include %q\n", u.ident+".h")
	b.WriteString(sourceTop)
	b.WriteString("\n/* Limits of the guard. */\n")
	defines(&b, u.guardConstants())
	if len(u.code.consts) > 0 {
		b.WriteString("\n/* What follows from the settings. */\n")
		defines(&b, u.code.consts)
	}
	if u.code.tables != "" {
		b.WriteString("\n" + u.code.tables)
	}
	b.WriteString(guardWithin)
	for _, p := range u.code.parts {
		b.WriteString(p)
	}
	for _, f := range []struct{ doc, head, body string }{
		{"Target and measured have been x and y for ever.", "static void method_start(@state *s, real x, real y)", u.code.start},
		{"The input was there, and another method commanded u.", "static void method_prime(@state *s, const @input *in, real u)", u.code.prime},
		{"The command for an input.", "static real method_command(@state *s, const @input *in)", u.code.command},
	} {
		fmt.Fprintf(&b, "\n/* %s */\n%s\n{\n%s}\n", f.doc, f.head, f.body)
	}
	b.WriteString(u.guardSource())
	return []byte(comment(about...) + u.text(b.String()))
}

const sourceTop = `
#include <float.h>

#ifdef __FAST_MATH__
#error "compile without -ffast-math: the guard needs NaN to be NaN"
#endif

typedef @real real;
#define R(c) ((real)(c))

#ifdef ANTELAG_FLOAT
#define LARGEST FLT_MAX
#else
#define LARGEST DBL_MAX
#endif
`

func defines(b *strings.Builder, consts []constant) {
	wide := 0
	for _, c := range consts {
		wide = max(wide, len(c.name)+1+len(c.text))
	}
	for _, c := range consts {
		line := fmt.Sprintf("#define %s %s", c.name, c.text)
		if c.doc != "" {
			line += strings.Repeat(" ", wide-len(c.name)-1-len(c.text)) + " /* " + c.doc + " */"
		}
		b.WriteString(line + "\n")
	}
}
