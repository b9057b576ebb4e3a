package figure

import (
	"fmt"
	"math"
	"strings"
)

// name is the figure in a few words.
func (f Figure) name() string {
	if f.Title != "" {
		return clean(f.Title)
	}
	for _, p := range f.Panels {
		if p.Title != "" {
			return clean(p.Title)
		}
	}
	return clean(f.Panels[0].about())
}

// Describe says in sentences what the figure shows, for those who cannot see
// it: per panel what is drawn against what, from where to where, each line with
// its range, limits, marks.
func (f Figure) Describe() string {
	var parts []string
	for _, p := range f.Panels {
		parts = append(parts, p.describe())
	}
	return clean(strings.Join(parts, " "))
}

func (p Panel) about() string {
	if p.Map != nil {
		return fmt.Sprintf("%s over %s and %s", p.Map.Label, p.X.Label, p.Y.Label)
	}
	return fmt.Sprintf("%s against %s", p.Y.Label, p.X.Label)
}

func (p Panel) describe() string {
	var b strings.Builder
	if p.Title != "" {
		b.WriteString(p.Title + ": ")
	}
	b.WriteString(p.about())
	d := newDrawing(p)
	if !d.empty() {
		fmt.Fprintf(&b, ", %s from %s", p.X.Label, fromTo(d.x.low, d.x.high, p.X.Unit))
		if p.Map != nil {
			fmt.Fprintf(&b, ", %s from %s", p.Y.Label, fromTo(d.y.low, d.y.high, p.Y.Unit))
		}
	}
	b.WriteString(".")
	for i, l := range p.Lines {
		name := l.Name
		if name == "" {
			name = fmt.Sprintf("line %d", i+1)
		}
		low, high := ends(l.Y)
		if low > high {
			fmt.Fprintf(&b, " %s: no values.", name)
			continue
		}
		fmt.Fprintf(&b, " %s: from %s.", name, fromTo(low, high, p.Y.Unit))
	}
	if p.Map != nil {
		var all []float64
		for _, row := range p.Map.Z {
			all = append(all, row...)
		}
		if low, high := ends(all); low <= high {
			fmt.Fprintf(&b, " Values from %s.", fromTo(low, high, p.Map.Unit))
		}
	}
	for _, l := range p.Levels {
		unit := p.Y.Unit
		if l.Vertical {
			unit = p.X.Unit
		}
		what := "Limit"
		if l.Reference {
			what = "Reference"
		}
		if l.Name != "" { // the other end of a limit that has been said
			fmt.Fprintf(&b, " %s: %s, at %s.", what, l.Name, valued(round(l.Value, 4), unit))
		}
	}
	for _, m := range p.Marks {
		fmt.Fprintf(&b, " %s at %s, %s.", m.Name, valued(round(m.X, 4), p.X.Unit), valued(round(m.Y, 4), p.Y.Unit))
	}
	return b.String()
}

func ends(values []float64) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, v := range values {
		if finite(v) {
			low, high = math.Min(low, v), math.Max(high, v)
		}
	}
	return low, high
}

func fromTo(low, high float64, unit string) string {
	return number(round(low, 4)) + " to " + valued(round(high, 4), unit)
}

func valued(v float64, unit string) string { return strings.TrimSpace(number(v) + " " + unit) }
