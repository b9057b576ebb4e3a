package runlog

import (
	"fmt"
	"slices"
	"strconv"
	"strings"

	"antelag/scenarios/quantity"
)

// Map says which column of a foreign table is what: for "time", "target",
// "command", "measured" and "force", and those with a channel in front,
// "damper.force", the column's heading or its number from 1. The zero value maps
// nothing. It is a flag.Value.
type Map struct {
	text    string
	entries []mapped
}

type mapped struct{ what, column string }

// ParseMap reads "time=1,target=x_ref,measured=3".
func ParseMap(text string) (Map, error) {
	m := Map{text: text}
	for _, part := range strings.Split(text, ",") {
		what, column, ok := strings.Cut(part, "=")
		what, column = strings.TrimSpace(what), strings.TrimSpace(column)
		if !ok || column == "" {
			return Map{}, fmt.Errorf("%q must be like target=2 or target=HEADING", strings.TrimSpace(part))
		}
		if _, err := roleDim(what); err != nil {
			return Map{}, err
		}
		if slices.ContainsFunc(m.entries, func(e mapped) bool { return e.what == what }) {
			return Map{}, fmt.Errorf("%s is given twice", what)
		}
		m.entries = append(m.entries, mapped{what, column})
	}
	return m, nil
}

// Set, String and Type make Map a flag.
func (m *Map) Set(text string) (err error) { *m, err = ParseMap(text); return err }
func (m *Map) String() string              { return m.text }
func (m *Map) Type() string                { return "map" }

// Unnamed is the name of the one channel of a table that names none.
const Unnamed = "channel"

// Channel is one channel of a log and which of its columns there are.
type Channel struct {
	Name string
	Has  [roles]bool // by Role
}

// column is one column that is read.
type column struct {
	at      int // in the table, from 0
	channel int // −1: not of a channel
	role    Role
	what    string // "damper.force", "time"
	scale   quantity.Unit
	plain   bool // already in SI
	loose   bool // may be without a value: a hole in it is not bridged
}

// chosen are the columns that are read.
type chosen struct {
	channels []Channel
	columns  []column
	time     int // which of columns is the time, −1: none
	margin   int // which is the energy margin, −1: none
	notes    []string
}

// choose finds out which columns are what: by the map where it says so, else by
// their headings.
func (l *layout) choose(o *Options) (*chosen, error) {
	c := &chosen{time: -1, margin: -1}
	if _, mapped := o.Map.find("time"); mapped && o.Rate != 0 {
		return nil, fmt.Errorf("--map time=… and --rate both say when rows were; give one of them")
	}
	if o.Rate == 0 {
		if err := c.chooseTime(l, o); err != nil {
			return nil, err
		}
	}
	if err := c.chooseChannels(l, o); err != nil {
		return nil, err
	}
	if o.Channel != "" {
		if err := c.keep(o.Channel); err != nil {
			return nil, err
		}
	}
	if err := c.need(l, o); err != nil {
		return nil, err
	}
	if o.Lean {
		c.strip(o.Need)
	}
	return c, nil
}

func (c *chosen) chooseTime(l *layout, o *Options) error {
	at := -1
	if e, ok := o.Map.find("time"); ok {
		var err error
		if at, err = l.lookUp(e); err != nil {
			return err
		}
	} else {
		for i, heading := range l.names {
			name, _, _ := namedUnit(heading, quantity.Time)
			if n := strings.ToLower(name); n != "time" && n != "t" {
				continue
			}
			if at >= 0 {
				return fmt.Errorf("%d: columns %d and %d are both headed time; say which by --map time=%d, or give --rate", l.first, at+1, i+1, at+1)
			}
			at = i
		}
	}
	if at < 0 {
		how := "which one it is by --map time=…"
		if len(o.Map.entries) == 0 {
			how = "which column is which by --map time=…,target=…,measured=…"
		}
		return fmt.Errorf("%d: no column is headed time; say %s, or give --rate; %s", l.first, how, l.list())
	}
	c.time = len(c.columns)
	return c.add(l, o, column{at: at, channel: -1, what: "time"}, quantity.Time)
}

func (c *chosen) chooseChannels(l *layout, o *Options) error {
	mapped := false
	for _, e := range o.Map.entries {
		channel, r, ok := cutRole(e.what)
		if !ok {
			continue // time
		}
		mapped = true
		at, err := l.lookUp(e)
		if err != nil {
			return err
		}
		if err := c.addRole(l, o, channel, r, at); err != nil {
			return err
		}
	}
	if mapped {
		return nil
	}
	for at, heading := range l.names {
		if heading == "energy_margin" {
			c.margin = len(c.columns)
			c.columns = append(c.columns, column{at: at, channel: -1, what: heading, plain: true, loose: true})
			continue
		}
		for r := range roles {
			name, _, _ := namedUnit(heading, r.dim())
			if i := strings.LastIndexByte(name, '.'); !strings.EqualFold(name[i+1:], r.String()) {
				continue
			} else if err := c.addRole(l, o, name[:max(i, 0)], r, at); err != nil {
				return err
			}
		}
	}
	return nil
}

func (c *chosen) addRole(l *layout, o *Options, channel string, r Role, at int) error {
	if channel == "" {
		channel = Unnamed
	}
	j := slices.IndexFunc(c.channels, func(have Channel) bool { return have.Name == channel })
	if j < 0 {
		j = len(c.channels)
		c.channels = append(c.channels, Channel{Name: channel})
	}
	if c.channels[j].Has[r] {
		return fmt.Errorf("%d: two columns are headed %s; say which by --map %s=%d", l.first, r, r, at+1)
	}
	c.channels[j].Has[r] = true
	what := r.String()
	if channel != Unnamed {
		what = channel + "." + what
	}
	return c.add(l, o, column{at: at, channel: j, role: r, what: what}, r.dim())
}

// add adds a column with its unit: the one given, else the one that the heading
// names. Time is in seconds where nobody says otherwise; for lengths and forces
// there is no such custom, and a wrong guess would be off by a thousand.
func (c *chosen) add(l *layout, o *Options, col column, dim quantity.Dim) error {
	channel, role := "", col.what
	if i := strings.LastIndexByte(col.what, '.'); i >= 0 {
		channel, role = col.what[:i], col.what[i+1:]
	}
	heading, has := l.unitOf(col.at, dim)
	given, asked := o.Units.of(channel, role, dim)
	u := heading
	switch {
	case asked:
		u = given
		if has && (heading.SI(1) != given.SI(1)) {
			c.notes = append(c.notes, fmt.Sprintf("%s is headed %s but was read in %s, as --units says", col.what, heading.text, given.text))
		}
	case has:
	case heading.text != "":
		return fmt.Errorf("%d: column %d%s: %q is not known as the unit of %s; say it, like --units %s=%s",
			l.first, col.at+1, l.called(col.at), heading.text, dim, col.what, likely(dim))
	case dim == quantity.Time:
		u.Unit, _ = quantity.ParseUnit("s") //nolint:errcheck // a constant
	default:
		return fmt.Errorf("%d: no unit is known of %s, column %d%s; say it, like --units %s=%s", l.first, col.what, col.at+1, l.called(col.at), col.what, likely(dim))
	}
	col.scale, col.plain = u.Unit, u.SI(1) == 1
	c.columns = append(c.columns, col)
	return nil
}

func likely(dim quantity.Dim) string {
	switch dim {
	case quantity.Force:
		return "kN"
	case quantity.Time:
		return "s"
	}
	return "mm"
}

// unitOf finds the unit that the heading, or the line of units, gives a column.
func (l *layout) unitOf(at int, dim quantity.Dim) (u unit, ok bool) {
	if l.names != nil {
		if _, u, ok = namedUnit(l.names[at], dim); ok || u.text != "" {
			return u, ok
		}
	}
	if l.units == nil || bare(l.units[at]) == "" || l.units[at] == "-" {
		return unit{}, false
	}
	_, u, ok = namedUnit("["+bare(l.units[at])+"]", dim)
	return u, ok
}

// keep drops all channels but one.
func (c *chosen) keep(channel string) error {
	j := slices.IndexFunc(c.channels, func(have Channel) bool { return have.Name == channel })
	if j < 0 {
		var known []string
		for _, have := range c.channels {
			known = append(known, have.Name)
		}
		return fmt.Errorf("no channel is named %q; there are: %s", channel, strings.Join(known, ", "))
	}
	c.channels = []Channel{c.channels[j]}
	c.only(func(col *column) bool {
		if col.channel >= 0 && col.channel != j {
			return false
		}
		col.channel = min(col.channel, 0)
		return true
	})
	return nil
}

// strip drops what is not needed.
func (c *chosen) strip(need []Role) {
	c.only(func(col *column) bool {
		if col.channel < 0 {
			return !col.loose
		}
		wanted := slices.Contains(need, col.role)
		c.channels[col.channel].Has[col.role] = wanted
		return wanted
	})
}

// only drops the columns that are not wanted.
func (c *chosen) only(wanted func(*column) bool) {
	time, margin := -1, -1
	var kept []column
	for i, col := range c.columns {
		if !wanted(&col) {
			continue
		}
		switch i {
		case c.time:
			time = len(kept)
		case c.margin:
			margin = len(kept)
		}
		kept = append(kept, col)
	}
	c.columns, c.time, c.margin = kept, time, margin
}

// need checks that every channel has what was asked for.
func (c *chosen) need(l *layout, o *Options) error {
	if len(c.channels) == 0 {
		c.channels = append(c.channels, Channel{Name: Unnamed})
	}
	for _, ch := range c.channels {
		for _, r := range o.Need {
			if ch.Has[r] {
				continue
			}
			what := r.String()
			if ch.Name != Unnamed {
				what = ch.Name + "." + what
			}
			return fmt.Errorf("%d: no column is headed %s; say which one it is by --map %s=…; %s", l.first, what, what, l.list())
		}
	}
	if len(c.columns) == 0 || len(c.columns) == 1 && c.time >= 0 {
		return fmt.Errorf("%d: no column is headed target, command, measured or force; say which is which by --map; %s", l.first, l.list())
	}
	return nil
}

// list says which columns the table has.
func (l *layout) list() string {
	if l.names == nil {
		return fmt.Sprintf("the table has %d columns and no headings", l.columns)
	}
	const most = 12
	var out []string
	for i, n := range l.names {
		if i == most {
			out = append(out, "…")
			break
		}
		out = append(out, fmt.Sprintf("%d %q", i+1, n))
	}
	return "the columns are " + strings.Join(out, ", ")
}

func (l *layout) called(at int) string {
	if l.names == nil || l.names[at] == "" {
		return ""
	}
	return fmt.Sprintf(" %q", l.names[at])
}

func (m *Map) find(what string) (mapped, bool) {
	for _, e := range m.entries {
		if e.what == what {
			return e, true
		}
	}
	return mapped{}, false
}

// lookUp finds the column that a map entry means: a heading, whole or without its
// unit, in any case of letters, or else a number.
func (l *layout) lookUp(e mapped) (int, error) {
	found := -1
	for _, whole := range []bool{true, false} {
		for i, heading := range l.names {
			name := heading
			if !whole {
				dim, _ := roleDim(e.what) //nolint:errcheck // it was parsed
				name, _, _ = namedUnit(heading, dim)
			}
			if !strings.EqualFold(name, e.column) {
				continue
			}
			if found >= 0 {
				return 0, fmt.Errorf("%d: --map %s=%s: columns %d and %d are both headed so; give the number", l.first, e.what, e.column, found+1, i+1)
			}
			found = i
		}
		if found >= 0 {
			return found, nil
		}
	}
	n, err := strconv.Atoi(e.column)
	switch {
	case err != nil:
		return 0, fmt.Errorf("%d: --map %s=%s: no column is headed so; %s", l.first, e.what, e.column, l.list())
	case n < 1 || n > l.columns:
		return 0, fmt.Errorf("%d: --map %s=%s: there are columns 1 to %d", l.first, e.what, e.column, l.columns)
	}
	return n - 1, nil
}
