package plant

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"antelag/scenarios/kind"
)

// corners calls try with every combination of the smallest and the largest
// value of every setting, and of every word; an optional setting is left out,
// too.
func corners(k *kind.Kind, try func(kind.Values)) {
	choices := make([][]*kind.Value, len(k.Settings))
	for i, s := range k.Settings {
		if s.Type == kind.WordType {
			for _, w := range s.Words {
				v := kind.Text(w)
				choices[i] = append(choices[i], &v)
			}
			continue
		}
		lo, hi := kind.Num(s.Min), kind.Num(s.Max)
		choices[i] = append(choices[i], &lo, &hi)
		if s.IsOptional() {
			choices[i] = append(choices[i], nil)
		}
	}
	values := kind.Values{}
	var choose func(i int)
	choose = func(i int) {
		if i == len(choices) {
			try(values)
			return
		}
		for _, v := range choices[i] {
			if v == nil {
				delete(values, k.Settings[i].Name)
			} else {
				values[k.Settings[i].Name] = *v
			}
			choose(i + 1)
		}
	}
	choose(0)
}

// blamed fails unless the error of a corner names one of the settings.
func blamed(t *testing.T, k *kind.Kind, v kind.Values, err error) {
	t.Helper()
	if name, _, _ := strings.Cut(err.Error(), ": "); !k.Has(name) {
		t.Errorf("%s %v: %v", k.Name, v, err)
	}
}

func finite(x ...float64) bool {
	for _, x := range x {
		if math.IsNaN(x) || math.IsInf(x, 0) {
			return false
		}
	}
	return true
}

// roughly is a motion with jumps, stops, crawling and tiny moves, m.
func roughly(ticks int) []float64 {
	r := rand.New(rand.NewPCG(9, 10))
	y := make([]float64, ticks)
	for k := 1; k < ticks; k++ {
		switch k % 6 {
		case 0:
			y[k] = 0.2 * r.NormFloat64()
		case 1:
			y[k] = y[k-1]
		case 2:
			y[k] = y[k-1] + 1e-12*r.NormFloat64()
		default:
			y[k] = y[k-1] + 1e-3*r.NormFloat64()
		}
	}
	return y
}

func TestEveryElementAtEveryCornerOfItsRange(t *testing.T) {
	path := roughly(40)
	for _, e := range Elements.Entries {
		built := 0
		corners(&e.Kind, func(v kind.Values) {
			el, err := e.New(v)
			if err != nil {
				blamed(t, &e.Kind, v, err)
				return
			}
			built++
			for _, dt := range []float64{1e-5, 1.0 / 2048, 0.1} {
				el.Start(path[3])
				for k := 1; k < len(path); k++ {
					vel := (path[k] - path[k-1]) / dt
					f := el.Advance(path[k], vel, dt)
					stored, gone := el.Energy()
					if !finite(f, stored, gone) || stored < 0 && e.Name != "cubic" {
						t.Errorf("%s %v at %d: force %v, energies %v, %v", e.Name, v, k, f, stored, gone)
						return
					}
				}
			}
		})
		if built == 0 {
			t.Errorf("%s: no corner can be built", e.Name)
		}
	}
}

func TestEveryActuatorAtEveryCornerOfItsRange(t *testing.T) {
	t.Parallel()
	path := roughly(8)[6:] // a jump and a stop
	for _, e := range Actuators.Entries {
		built := 0
		corners(&e.Kind, func(v kind.Values) {
			built++
			timing := Timing{1.0 / 2048, Hold(built % 2)}
			a, err := e.New(timing, v)
			if err != nil {
				blamed(t, &e.Kind, v, err)
				return
			}
			s := NewSpecimen(&spring{k: 1e7}, &viscous{c: 1e5, alpha: 0.5, law: root}, &mass{m: 50})
			if built%3 == 0 {
				s = NewSpecimen()
			}
			a.Start(0.01, s)
			for k, u := range path {
				y, vel := a.Advance(u, s)
				ok := finite(y, vel, s.Force())
				if p, servo := a.(*ServoHydraulic); servo {
					ok = ok && math.Abs(p.Opening()) <= 1 && math.Abs(p.Pressure()) <= p.supply
				}
				if !ok {
					t.Errorf("%s %v at %d: %v m, %v m/s, %v N", e.Name, v, k, y, vel, s.Force())
					return
				}
			}
		})
		if built == 0 {
			t.Errorf("%s: no corner can be built", e.Name)
		}
	}
}
