package kind

import (
	"math"
	"testing"

	"antelag/scenarios/quantity"
)

// What is driven bounds the ends that a setting leaves open, and no others.
func TestDrivenBoundsOpenEnds(t *testing.T) {
	for _, c := range []struct {
		name            string
		setting         Setting
		driven          quantity.Dim
		smallest, large float64
	}{
		{"both open", Driven("x", ""), quantity.Length, -10, 10},
		{"the upper open", Driven("x", "").Range(0, math.Inf(1)), quantity.Acceleration, 0, 1000},
		{"the lower open", Driven("x", "").Range(math.Inf(-1), 5), quantity.Force, -1e9, 5},
		{"none open", Driven("x", "").Range(-1, 1), quantity.Length, -1, 1},
	} {
		if s := c.setting.In(c.driven); s.Min != c.smallest || s.Max != c.large || s.Dim != c.driven {
			t.Errorf("%s: %g to %g in %s", c.name, s.Min, s.Max, s.Dim)
		}
	}
}
