package baseline

import (
	"math"
	"slices"

	"antelag/scenarios"
)

// Comparison is a run held against a baseline.
type Comparison struct {
	Settings []SettingChange `json:"settings_changed"`
	Compared int             `json:"compared"`
	Moved    []Move          `json:"moved"`  // figures that left their tolerance, or are gone
	Added    []string        `json:"added"`  // figures that the baseline does not have
	Widest   float64         `json:"widest"` // largest move of a figure that held, over its tolerance
}

// Same reports whether nothing moved.
func (c *Comparison) Same() bool { return len(c.Moved) == 0 }

// Whole reports whether the baseline describes the run entirely: nothing moved
// and it has the very same settings and figures.
func (c *Comparison) Whole() bool {
	return c.Same() && len(c.Settings) == 0 && len(c.Added) == 0
}

// SettingChange is a setting that is not what it was; "" where there was or is
// none.
type SettingChange struct {
	Path string `json:"path"`
	Was  string `json:"was"`
	Is   string `json:"is"`
}

// Move is a figure that left its tolerance. The texts are for people; of
// numbers JSON has SI values.
type Move struct {
	Lane    string `json:"lane"`
	Channel string `json:"channel,omitempty"`
	Figure  string `json:"figure"`
	Label   string `json:"-"`
	Was     any    `json:"was"`
	Is      any    `json:"is"`
	Allowed any    `json:"allowed"` // how far it may be from was

	WasText, IsText, AllowedText string `json:"-"`
}

// Compare holds the figures of a run, as From takes them, against a baseline.
func (b *Baseline) Compare(run *Baseline) *Comparison {
	c := &Comparison{Settings: settingChanges(b.Settings, run.Settings), Moved: []Move{}, Added: []string{}}
	was := b.index()
	for i := range run.Entries {
		is := &run.Entries[i]
		old, ok := was[is.key()]
		if !ok {
			c.Added = append(c.Added, is.place())
			continue
		}
		delete(was, is.key())
		c.Compared++
		if !old.holds(is) {
			c.Moved = append(c.Moved, move(old, is))
		} else if d := math.Abs(is.Was - old.Was); d > 0 && old.Within > 0 {
			c.Widest = max(c.Widest, d/old.Within)
		}
	}
	for i := range b.Entries { // what is left is gone
		if e := &b.Entries[i]; was[e.key()] == e {
			c.Compared++
			c.Moved = append(c.Moved, move(e, nil))
		}
	}
	return c
}

func (b *Baseline) index() map[[3]string]*Entry {
	m := make(map[[3]string]*Entry, len(b.Entries))
	for i := range b.Entries {
		m[b.Entries[i].key()] = &b.Entries[i]
	}
	return m
}

// place names a figure, "configured: damper: delay".
func (e *Entry) place() string {
	_, label, _ := described(e.Figure)
	if e.Channel != "" {
		label = e.Channel + ": " + label
	}
	return e.Lane + ": " + label
}

// move describes what became of a figure; is is nil where it is gone.
func move(was, is *Entry) Move {
	dim, label, _ := described(was.Figure)
	m := Move{Lane: was.Lane, Channel: was.Channel, Figure: was.Figure, Label: label, IsText: "gone"}
	if was.word() {
		m.Was, m.WasText, m.AllowedText = was.Word, was.Word, "the same"
		if is != nil {
			m.Is, m.IsText = is.Word, is.Word
		}
		return m
	}
	m.Was, m.Allowed = number(was.Was), number(was.Within)
	m.WasText, m.AllowedText = value(was.Was, dim, 4), "± "+value(was.Within, dim, 2)
	if is != nil {
		m.Is = number(is.Was)
		m.WasText, m.IsText = apart(was.Was, is.Was, dim)
	}
	return m
}

// settingChanges lists what differs, in the order of the run.
func settingChanges(was, is []scenarios.Resolved) []SettingChange {
	out := []SettingChange{}
	old := map[string]string{}
	for _, s := range was {
		old[s.Path] = s.Text
	}
	for _, s := range is {
		if text, ok := old[s.Path]; !ok || text != s.Text {
			out = append(out, SettingChange{s.Path, text, s.Text})
		}
		delete(old, s.Path)
	}
	for _, s := range was {
		if text, ok := old[s.Path]; ok {
			out = append(out, SettingChange{s.Path, text, ""})
		}
	}
	return out
}

// Renew is the baseline to be kept after a run: figures that hold stay as they
// were recorded, so that the file shows what changed and nothing creeps; a
// tolerance that somebody set by hand stays too.
func (b *Baseline) Renew(run *Baseline) *Baseline {
	out := &Baseline{Version: run.Version, Settings: run.Settings, Entries: slices.Clone(run.Entries)}
	was := b.index()
	for i := range out.Entries {
		e := &out.Entries[i]
		old, ok := was[e.key()]
		switch {
		case !ok:
		case old.holds(e):
			*e = *old
		case b.byHand(old):
			e.Within = old.Within
		}
	}
	return out
}

// byHand reports whether somebody gave an entry another tolerance than it was
// recorded with. Values in the file are rounded, so that the last digit of a
// tolerance may come out differently.
func (b *Baseline) byHand(e *Entry) bool {
	if e.word() || e.Figure == "trip_time" {
		return false
	}
	const slip = 1.2 // more than one in the second digit
	usual := b.usual(e)
	return e.Within > slip*usual || e.Within*slip < usual
}

// Text writes what a figure was, for people; "" where the baseline does not
// have it.
func (b *Baseline) Text(lane, channel, figure string) string {
	for i := range b.Entries {
		if e := &b.Entries[i]; e.key() == [3]string{lane, channel, figure} {
			if e.word() {
				return e.Word
			}
			dim, _, _ := described(figure)
			return value(e.Was, dim, 4)
		}
	}
	return ""
}
