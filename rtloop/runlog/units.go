package runlog

import (
	"fmt"
	"slices"
	"strings"

	"antelag/scenarios/quantity"
)

// Role is what a column holds of a channel.
type Role int

const (
	Target   Role = iota // m
	Command              // m
	Measured             // m
	Force                // N
	roles
)

// roleNames are the words that headings and --map use.
var roleNames = [roles]string{"target", "command", "measured", "force"}

func (r Role) String() string { return roleNames[r] }

// dim is the dimension of a role's column.
func (r Role) dim() quantity.Dim {
	if r == Force {
		return quantity.Force
	}
	return quantity.Length
}

// unit is a unit with the text that named it.
type unit struct {
	quantity.Unit
	text string
}

// Units are the units of columns that their headings do not name, or name
// wrongly. The zero value names none. It is a flag.Value.
type Units struct {
	text   string
	byDim  map[quantity.Dim]unit
	byRole map[string]unit // "force", "damper.force", "time"
}

// ParseUnits reads "mm,kN", which gives lengths and forces their unit, or
// "target=in,force=kip", or a mixture.
func ParseUnits(text string) (Units, error) {
	u := Units{text: text, byDim: map[quantity.Dim]unit{}, byRole: map[string]unit{}}
	for _, part := range strings.Split(text, ",") {
		part = strings.TrimSpace(part)
		role, name, named := strings.Cut(part, "=")
		if !named {
			role, name = "", part
		}
		if err := u.add(strings.TrimSpace(role), strings.TrimSpace(name), named); err != nil {
			return Units{}, err
		}
	}
	return u, nil
}

func (u *Units) add(role, name string, named bool) error {
	q, err := quantity.ParseUnit(name)
	if err != nil {
		return err
	}
	got := unit{q, name}
	if !named {
		switch q.Dim {
		case quantity.Time, quantity.Length, quantity.Force:
		default:
			return fmt.Errorf("%q is no unit of time, length or force; give units like mm,kN", name)
		}
		if old, twice := u.byDim[q.Dim]; twice {
			return fmt.Errorf("%s and %s are both %s; say which column has which, like target=%s", old.text, name, q.Dim, old.text)
		}
		u.byDim[q.Dim] = got
		return nil
	}
	want, err := roleDim(role)
	if err != nil {
		return err
	}
	if q.Dim != want {
		return fmt.Errorf("%s=%s: it must be the unit of %s", role, name, want)
	}
	u.byRole[role] = got
	return nil
}

// roleDim returns the dimension of what "time", "force" or "damper.force" names.
func roleDim(name string) (quantity.Dim, error) {
	if name == "time" {
		return quantity.Time, nil
	}
	_, r, ok := cutRole(name)
	if !ok {
		return quantity.None, fmt.Errorf("%q is none of time, %s, alone or with a channel in front like damper.force", name, strings.Join(roleNames[:], ", "))
	}
	return r.dim(), nil
}

// cutRole takes "damper.force" apart; the channel may be missing.
func cutRole(name string) (channel string, r Role, ok bool) {
	word := name
	if i := strings.LastIndexByte(name, '.'); i >= 0 {
		channel, word = name[:i], name[i+1:]
	}
	i := slices.Index(roleNames[:], word)
	return channel, Role(i), i >= 0
}

// of finds the unit given for a column.
func (u *Units) of(channel, role string, dim quantity.Dim) (unit, bool) {
	if got, ok := u.byRole[channel+"."+role]; ok {
		return got, true
	}
	if got, ok := u.byRole[role]; ok {
		return got, true
	}
	got, ok := u.byDim[dim]
	return got, ok
}

// Set, String and Type make Units a flag.
func (u *Units) Set(text string) (err error) { *u, err = ParseUnits(text); return err }
func (u *Units) String() string              { return u.text }
func (u *Units) Type() string                { return "units" }

// spelt are units as headings spell them out.
var spelt = map[string]string{"sec": "s", "secs": "s", "second": "s", "seconds": "s", "msec": "ms"}

// namedUnit takes the unit off a heading: "Force [kN]", "Force (kN)", "Force / kN",
// "force_kN". ok is false where there is none of that dimension; u then still has
// the text of what stands in brackets.
func namedUnit(heading string, dim quantity.Dim) (name string, u unit, ok bool) {
	heading = strings.TrimSpace(heading)
	try := func(text string) bool {
		text = strings.TrimSpace(text)
		if s, spelt := spelt[strings.ToLower(text)]; spelt {
			text = s
		}
		q, err := quantity.ParseUnit(text)
		ok = err == nil && text != "" && q.Dim == dim
		u = unit{q, text}
		return ok
	}
	for _, pair := range []string{"[]", "()"} {
		if i := strings.LastIndexByte(heading, pair[0]); i >= 0 && strings.HasSuffix(heading, pair[1:]) {
			name = strings.TrimSpace(heading[:i])
			try(heading[i+1 : len(heading)-1])
			return name, u, ok
		}
	}
	for _, sep := range []string{" / ", "_", " in "} {
		if i := strings.LastIndex(heading, sep); i > 0 && try(heading[i+len(sep):]) {
			return strings.TrimSpace(heading[:i]), u, true
		}
	}
	return heading, unit{}, false
}

// allUnits reports whether a line below the names holds nothing but units.
func allUnits(cells []string) bool {
	any := false
	for _, c := range cells {
		if c == "" || c == "-" {
			continue
		}
		if _, err := quantity.ParseUnit(bare(c)); err != nil {
			return false
		}
		any = true
	}
	return any
}

// bare takes the brackets off a unit.
func bare(text string) string { return strings.Trim(text, "[]() ") }
