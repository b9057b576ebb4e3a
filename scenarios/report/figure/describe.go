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
			if p.Map.Below != "" {
				fmt.Fprintf(&b, " Below %s: %s, in %s of the cells.", valued(p.Map.Edge, p.Map.Unit), p.Map.Below, share100(all, p.Map.Edge))
			}
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

// share100 is how many of the defined values are below an edge, in percent.
func share100(values []float64, edge float64) string {
	below, defined := 0, 0
	for _, v := range values {
		if !math.IsNaN(v) {
			defined++
		}
		if v < edge {
			below++
		}
	}
	return fmt.Sprintf("%.0f %%", 100*float64(below)/float64(max(1, defined)))
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
