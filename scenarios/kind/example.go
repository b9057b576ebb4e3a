package kind

import (
	"strconv"
	"strings"

	"antelag/scenarios/quantity"
)

// typical values of each dimension, for examples of required settings.
var typical = map[quantity.Dim]string{
	quantity.None:         "0.5",
	quantity.Length:       `"20 mm"`,
	quantity.Mass:         `"60 t"`,
	quantity.Time:         `"10 ms"`,
	quantity.Frequency:    `"2 Hz"`,
	quantity.Velocity:     `"0.2 m/s"`,
	quantity.Acceleration: `"0.2 g"`,
	quantity.Force:        `"100 kN"`,
	quantity.Stiffness:    `"10 kN/mm"`,
	quantity.Damping:      `"50 kN*s/m"`,
	quantity.Pressure:     `"20 MPa"`,
}

// ExampleValue returns a value for the setting as a scenario would write it:
// the sample if it has one, else the default, else, where the setting is
// required, something typical. ok is false when an example leaves it out.
func (s *Setting) ExampleValue() (text string, ok bool) {
	if s.sample != "" {
		return s.sample, true
	}
	if s.HasDefault() {
		switch s.Type {
		case WordType, TextType:
			return strconv.Quote(s.Fallback.Text), true
		}
		text = quantity.Plain(s.Fallback.Num, s.Dim)
		if s.Dim != quantity.None {
			text = strconv.Quote(text)
		}
		return text, true
	}
	if s.IsOptional() {
		return "", false
	}
	if s.Type == TextType {
		return `"motion.txt"`, true
	}
	if s.Driven {
		return typical[quantity.Acceleration], true
	}
	text, ok = typical[s.Dim]
	return s.within(text), ok
}

// within is the typical value, or the end of the sensible range that it is
// beyond.
func (s *Setting) within(text string) string {
	v, err := quantity.ParseAs(strings.Trim(text, `"`), s.Dim)
	near := min(max(v, s.Min), s.Max)
	if err != nil || near == v {
		return text
	}
	if text = quantity.Plain(near, s.Dim); s.Dim != quantity.None {
		text = strconv.Quote(text)
	}
	return text
}

// Sample gives the setting the value that examples show, as TOML; an optional
// setting with a sample is part of the example.
func (s Setting) Sample(text string) Setting {
	s.sample = text
	return s
}
