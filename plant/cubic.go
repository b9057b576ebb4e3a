package plant

import (
	"antelag/scenarios/kind"
	"antelag/scenarios/quantity"
)

var cubicKind = kind.Entry[NewElement]{
	Kind: kind.Kind{
		Name:     "cubic",
		Doc:      "elastic spring that stiffens, or softens, with the cube of the displacement",
		Equation: "f = k·y + k₃·y³",
		Source:   "Duffing 1918",
		Settings: []kind.Setting{
			kind.Number("stiffness", quantity.Stiffness, "stiffness k at zero").Range(0, 1e12),
			kind.Number("cubic", quantity.Cubic, "cubic stiffness k₃; negative softens").Range(-1e15, 1e15).Sample(`"2e9 N/m^3"`),
		},
	},
	New: func(v kind.Values) (Element, error) {
		return &cubic{k: v.Num("stiffness"), k3: v.Num("cubic")}, nil
	},
}

// cubic is an elastic spring,
//
//	f = k·y + k₃·y³,
//
// f the force, N; y the displacement, m; k the stiffness at zero, N/m; k₃ the
// cubic stiffness, N/m³. It stores ½ky² + ¼k₃y⁴, J, and dissipates nothing.
// With k₃ < 0 it softens and beyond √(k/3|k₃|) pushes back less the further it
// goes; nothing stops it.
type cubic struct{ k, k3, y float64 }

var _ Element = (*cubic)(nil)
var _ Previewer = (*cubic)(nil)

func (c *cubic) Start(y float64) { c.y = y }

func (c *cubic) Advance(y, _, _ float64) float64 {
	c.y = y
	return c.force(y)
}

// Preview returns the force at displacement y, N.
func (c *cubic) Preview(y, _, _ float64) float64 { return c.force(y) }

func (c *cubic) Energy() (stored, dissipated float64) {
	y2 := c.y * c.y
	return (0.5*c.k + 0.25*c.k3*y2) * y2, 0
}

// Stiffness returns that at zero, N/m.
func (c *cubic) Stiffness() float64 { return c.k }

func (c *cubic) force(y float64) float64 { return (c.k + c.k3*y*y) * y }
