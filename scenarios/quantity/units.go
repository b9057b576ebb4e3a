package quantity

import (
	"fmt"
	"slices"
	"strings"
)

// StandardGravity is the conventional acceleration of free fall, m/s²
// (3rd General Conference on Weights and Measures, 1901). The unit "g" is
// this acceleration, never the gram.
const StandardGravity = 9.80665

// Exact definitions of the US customary units (international yard and pound
// agreement, 1959): inch 0.0254 m, pound 0.45359237 kg.
const (
	inch     = 0.0254
	pound    = 0.45359237
	poundF   = pound * StandardGravity
	kilo     = 1e3
	mega     = 1e6
	giga     = 1e9
	millePer = 1e3
	microPer = 1e6
)

var units = map[string]Unit{
	"m": {1, 1, Length}, "km": {kilo, 1, Length}, "cm": {1, 100, Length},
	"mm": {1, millePer, Length}, "um": {1, microPer, Length}, "µm": {1, microPer, Length}, "μm": {1, microPer, Length},
	"in": {inch, 1, Length}, "ft": {12 * inch, 1, Length},

	"kg": {1, 1, Mass}, "t": {kilo, 1, Mass}, "lb": {pound, 1, Mass},

	"s": {1, 1, Time}, "ms": {1, millePer, Time}, "us": {1, microPer, Time}, "µs": {1, microPer, Time}, "μs": {1, microPer, Time},
	"min": {60, 1, Time}, "h": {3600, 1, Time}, "d": {86400, 1, Time},

	"Hz": {1, 1, Frequency}, "kHz": {kilo, 1, Frequency},
	"rad": {1, 1, Angle},

	"g": {StandardGravity, 1, Acceleration}, "gal": {1, 100, Acceleration}, "Gal": {1, 100, Acceleration},

	"N": {1, 1, Force}, "kN": {kilo, 1, Force}, "MN": {mega, 1, Force},
	"lbf": {poundF, 1, Force}, "kip": {kilo * poundF, 1, Force},

	"Pa": {1, 1, Pressure}, "kPa": {kilo, 1, Pressure}, "MPa": {mega, 1, Pressure}, "GPa": {giga, 1, Pressure},
	"bar": {1e5, 1, Pressure}, "psi": {poundF / (inch * inch), 1, Pressure}, "ksi": {kilo * poundF / (inch * inch), 1, Pressure},

	"J": {1, 1, Energy}, "kJ": {kilo, 1, Energy}, "MJ": {mega, 1, Energy},
	"gpm": {231 * inch * inch * inch, 60, Flow}, // US gallons, of 231 cubic inches, a minute: valve catalogues
	"L":   {1, millePer, Volume}, "l": {1, millePer, Volume}, "cc": {1, microPer, Volume},

	"%": {1, 100, None}, "1": {1, 1, None},
}

func unknownUnit(name string) error {
	var close []string
	for u := range units {
		if strings.EqualFold(u, name) {
			close = append(close, u)
		}
	}
	if len(close) > 0 {
		slices.Sort(close)
		return fmt.Errorf("unknown unit %q; did you mean %q?", name, close[0])
	}
	known := make([]string, 0, len(units))
	for u := range units {
		if !strings.ContainsAny(u, "μµ1") {
			known = append(known, u)
		}
	}
	slices.SortFunc(known, func(a, b string) int { return strings.Compare(strings.ToLower(a), strings.ToLower(b)) })
	return fmt.Errorf("unknown unit %q; known are %s", name, strings.Join(known, " "))
}
